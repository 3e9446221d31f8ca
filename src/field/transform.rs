//! One product of one layer, chosen by name: what a command line needs to offer every transform.

use std::collections::BTreeMap;

use super::catalogue::{Listed, listed};
use super::check::checked_layer;
use super::given::Given;
use super::regional::regional;
use super::{Direction, Fabric, Gradient, MagneticDirections, PreparedField, Regularisation, fill_gaps};
use crate::error::Result;
use crate::grid::Grid;

/// The direction of a derivative.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Toward {
    /// Grid east.
    East,
    /// Grid north.
    North,
    /// Downward.
    Down,
}

/// A transform with its parameters. Lengths in metres, angles in degrees; a `height` is how far the field is first continued
/// upward, 0 for not at all.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Transform {
    /// [`PreparedField::upward`].
    Upward {
        /// Metres.
        height: f64,
    },
    /// [`PreparedField::downward`].
    Downward {
        /// Metres.
        depth: f64,
        /// What keeps the noise down.
        regularisation: Regularisation,
    },
    /// [`PreparedField::low_pass`].
    LowPass {
        /// Metres.
        wavelength: f64,
    },
    /// [`PreparedField::band_pass`].
    BandPass {
        /// Metres.
        short: f64,
        /// Metres.
        long: f64,
    },
    /// A first derivative, [`PreparedField::gradient`].
    First {
        /// Direction.
        toward: Toward,
        /// Metres.
        height: f64,
    },
    /// A second derivative along one axis, [`PreparedField::second_derivatives`].
    Second {
        /// Direction.
        toward: Toward,
        /// Metres.
        height: f64,
    },
    /// [`Gradient::horizontal`].
    HorizontalGradient {
        /// Metres.
        height: f64,
    },
    /// [`Gradient::total`].
    AnalyticSignal {
        /// Metres.
        height: f64,
    },
    /// [`Gradient::tilt`].
    Tilt {
        /// Metres.
        height: f64,
    },
    /// [`Gradient::tilt_gradient`].
    TiltGradient {
        /// Metres.
        height: f64,
    },
    /// [`Gradient::theta`].
    Theta {
        /// Metres.
        height: f64,
    },
    /// [`PreparedField::to_pole`].
    Pole {
        /// Field and magnetisation.
        directions: MagneticDirections,
    },
    /// [`PreparedField::to_equator`].
    Equator {
        /// Field and magnetisation.
        directions: MagneticDirections,
    },
    /// [`PreparedField::to_pseudo_gravity`].
    PseudoGravity {
        /// Field and magnetisation.
        directions: MagneticDirections,
        /// kg/m3 per A/m.
        ratio: f64,
    },
    /// [`PreparedField::to_magnetic_potential`].
    MagneticPotential {
        /// The geomagnetic field.
        field: Direction,
    },
    /// [`PreparedField::potential_to_gravity`].
    PotentialToGravity {
        /// Of the bodies.
        magnetisation: Direction,
        /// kg/m3 per A/m.
        ratio: f64,
    },
    /// [`Fabric::strike`].
    FabricStrike {
        /// Metres.
        window: f64,
    },
    /// [`Fabric::coherence`].
    FabricCoherence {
        /// Metres.
        window: f64,
    },
    /// The polynomial of [`regional`].
    Regional {
        /// 1, 2 or 3.
        degree: usize,
    },
    /// What is left when the polynomial of [`regional`] is taken off.
    Residual {
        /// 1, 2 or 3.
        degree: usize,
    },
    /// [`fill_gaps`].
    Filled,
}

/// Makes one product of a layer, on the layer's footprint (save for [`Transform::Filled`], which has no gaps).
///
/// # Errors
/// A layer without numbers or with one number throughout; parameters that the transform refuses.
///
/// ```
/// use ndarray::Array2;
/// use salband::field::{Toward, Transform, derive};
/// use salband::grid::{Frame, Grid};
/// let slope = Array2::from_shape_fn((16, 16), |(_, col)| 0.5 * col as f64);
/// let grid = Grid::new(Frame::local(100.0, 16, 16)?, slope)?;
/// let transform = Transform::First { toward: Toward::East, height: 0.0 };
/// assert!((derive(&grid, &transform)?.values()[[3, 9]] - 0.005).abs() < 1e-9);
/// assert_eq!(transform.product_unit("mGal"), "mGal/m");
/// # Ok::<(), salband::Error>(())
/// ```
pub fn derive(grid: &Grid, transform: &Transform) -> Result<Grid> {
    checked_layer(grid)?;
    let field = || PreparedField::new(grid);
    let gradient = |height: f64| field()?.gradient(height);
    match *transform {
        Transform::Upward { height } => field()?.upward(height),
        Transform::Downward { depth, regularisation } => field()?.downward(depth, regularisation)?.values(),
        Transform::LowPass { wavelength } => field()?.low_pass(wavelength)?.values(),
        Transform::BandPass { short, long } => field()?.band_pass(short, long)?.values(),
        Transform::First { toward, height } => grid.with(first(&gradient(height)?, toward)),
        Transform::Second { toward, height } => grid.with(field()?.second_derivative(toward, height)?),
        Transform::HorizontalGradient { height } => grid.with(gradient(height)?.horizontal()),
        Transform::AnalyticSignal { height } => grid.with(gradient(height)?.total()),
        Transform::Tilt { height } => grid.with(gradient(height)?.tilt()),
        Transform::TiltGradient { height } => {
            let field = field()?;
            grid.with(field.gradient(height)?.tilt_gradient(&field.second_derivatives(height)?)?)
        }
        Transform::Theta { height } => grid.with(gradient(height)?.theta()),
        Transform::Pole { directions } => field()?.to_pole(directions)?.values(),
        Transform::Equator { directions } => field()?.to_equator(directions)?.values(),
        Transform::PseudoGravity { directions, ratio } => field()?.to_pseudo_gravity(directions, ratio)?.values(),
        Transform::MagneticPotential { field: along } => field()?.to_magnetic_potential(along)?.values(),
        Transform::PotentialToGravity { magnetisation, ratio } => {
            field()?.potential_to_gravity(magnetisation, ratio)?.values()
        }
        Transform::FabricStrike { window } => {
            // A file of 32-bit floats would round what is just below 180 up to it.
            let strike = Fabric::of(&gradient(0.0)?, window)?.strike;
            grid.with(strike.mapv(|strike| if strike as f32 >= 180.0 { 0.0 } else { strike }))
        }
        Transform::FabricCoherence { window } => grid.with(Fabric::of(&gradient(0.0)?, window)?.coherence),
        Transform::Regional { degree } => Ok(regional(grid, degree)?.regional),
        Transform::Residual { degree } => Ok(regional(grid, degree)?.residual),
        Transform::Filled => grid.with(fill_gaps(grid.values())?),
    }
}

fn first(gradient: &Gradient, toward: Toward) -> ndarray::Array2<f64> {
    match toward {
        Toward::East => gradient.east(),
        Toward::North => gradient.north(),
        Toward::Down => gradient.down(),
    }
    .clone()
}

impl Transform {
    /// The transform of a name in [`Transform::list`], with parameters by name.
    ///
    /// # Errors
    /// A name that is not listed; a parameter that the transform does not take, or one that it needs and does not get. The
    /// numbers themselves are checked where they are used, directions here.
    ///
    /// ```
    /// use salband::field::Transform;
    /// let given = [("height".to_string(), 500.0)].into();
    /// assert_eq!(Transform::named("upward", &given)?, Transform::Upward { height: 500.0 });
    /// assert!(Transform::named("sideways", &given).is_err());
    /// # Ok::<(), salband::Error>(())
    /// ```
    pub fn named(name: &str, given: &BTreeMap<String, f64>) -> Result<Self> {
        let entry = listed(name)?;
        entry.check(given)?;
        (entry.make)(&Given::new(entry, given))
    }

    /// Every transform, in the order in which help should show them.
    pub fn list() -> &'static [Listed] {
        super::catalogue::LIST
    }

    /// The names of all transforms.
    pub fn names() -> impl Iterator<Item = &'static str> {
        Self::list().iter().map(|entry| entry.name)
    }

    /// The unit of the product for a layer in `unit`; an empty unit stands for a pure number.
    pub fn product_unit(&self, unit: &str) -> String {
        match self {
            Self::Upward { .. }
            | Self::Downward { .. }
            | Self::LowPass { .. }
            | Self::BandPass { .. }
            | Self::Regional { .. }
            | Self::Residual { .. }
            | Self::Filled => unit.to_string(),
            Self::First { .. } | Self::HorizontalGradient { .. } | Self::AnalyticSignal { .. } => per_metre(unit, 1),
            Self::Second { .. } => per_metre(unit, 2),
            Self::Tilt { .. } | Self::FabricStrike { .. } => "degrees".into(),
            Self::TiltGradient { .. } => "rad/m".into(),
            Self::Theta { .. } | Self::FabricCoherence { .. } => "1".into(),
            Self::Pole { .. } | Self::Equator { .. } => "nT".into(),
            Self::PseudoGravity { .. } | Self::PotentialToGravity { .. } => "mGal".into(),
            Self::MagneticPotential { .. } => "nT m".into(),
        }
    }
}

/// `unit` divided by metres `times` times, joined with a power of metres that is there already.
fn per_metre(unit: &str, times: u32) -> String {
    let (head, power) = match unit.rsplit_once("/m") {
        Some((head, "")) => (head, 1),
        Some((head, digits)) if digits.bytes().all(|digit| digit.is_ascii_digit()) => {
            digits.parse().map_or((unit, 0), |power: u32| (head, power))
        }
        _ => (unit, 0),
    };
    let head = if head.is_empty() { "1" } else { head };
    match power.saturating_add(times) {
        1 => format!("{head}/m"),
        power => format!("{head}/m{power}"),
    }
}
