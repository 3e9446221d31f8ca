//! The numbers given for a transform, taken out by name.

use std::collections::BTreeMap;

use super::catalogue::Listed;
use super::{Direction, MagneticDirections, Regularisation};
use crate::error::{Error, Result};

/// The parameters that were given for one transform.
pub(super) struct Given<'a> {
    entry: &'static Listed,
    numbers: &'a BTreeMap<String, f64>,
}

impl<'a> Given<'a> {
    pub(super) fn new(entry: &'static Listed, numbers: &'a BTreeMap<String, f64>) -> Self {
        Self { entry, numbers }
    }

    /// A parameter that must be there.
    pub(super) fn needed(&self, name: &str) -> Result<f64> {
        self.optional(name).ok_or_else(|| {
            Error::input(format!("the transform {}", self.entry.name))
                .found(format!("no {name}"))
                .wanted(self.entry.wants())
                .mend(format!("give {name} a number"))
        })
    }

    /// A parameter that may be left out.
    pub(super) fn optional(&self, name: &str) -> Option<f64> {
        self.numbers.get(name).copied()
    }

    /// The height, 0 if it is left out.
    pub(super) fn height(&self) -> f64 {
        self.optional("height").unwrap_or(0.0)
    }

    /// A whole number.
    pub(super) fn degree(&self) -> Result<usize> {
        let degree = self.needed("degree")?;
        if (0.0..=99.0).contains(&degree) && degree.fract() == 0.0 {
            return Ok(degree as usize);
        }
        Err(Error::input("the degree of a regional")
            .found(degree)
            .wanted("a whole number, 1 to 3")
            .mend("choose the lowest degree that takes the regional away"))
    }

    /// The direction of the field.
    pub(super) fn field(&self) -> Result<Direction> {
        Direction::new(self.needed("inclination")?, self.needed("declination")?)
    }

    /// The field and the magnetisation, along the field unless a direction of its own is given.
    pub(super) fn directions(&self) -> Result<MagneticDirections> {
        let field = self.field()?;
        let own = [self.optional("magnetisation-inclination"), self.optional("magnetisation-declination")];
        match own {
            [None, None] => Ok(MagneticDirections::induced(field)),
            _ => Ok(MagneticDirections::with_remanence(field, self.magnetisation()?)),
        }
    }

    /// The direction of the magnetisation.
    pub(super) fn magnetisation(&self) -> Result<Direction> {
        Direction::new(self.needed("magnetisation-inclination")?, self.needed("magnetisation-declination")?)
    }

    /// One of two ways to hold the noise down.
    pub(super) fn regularisation(&self) -> Result<Regularisation> {
        match (self.optional("gain"), self.optional("noise")) {
            (Some(gain), None) => Ok(Regularisation::LargestGain(gain)),
            (None, Some(noise)) => Ok(Regularisation::Noise(noise)),
            (gain, _) => Err(Error::input("the regularisation of a downward continuation")
                .found(if gain.is_some() {
                    "both a gain and a noise level"
                } else {
                    "neither a gain nor a noise level"
                })
                .wanted("one of them, because downward continuation magnifies noise without bound")
                .mend("give gain (how many times a wave may be magnified) or noise (its standard deviation)")),
        }
    }
}
