//! The table of transforms: names, parameters and what each gives.

use std::collections::BTreeMap;

use super::given::Given;
use super::{Toward, Transform};
use crate::error::{Error, Result};

/// A parameter of a transform.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Parameter {
    /// Its name.
    pub name: &'static str,
    /// Its unit.
    pub unit: &'static str,
    /// Whether it must be given.
    pub needed: bool,
    /// What it does.
    pub purpose: &'static str,
}

/// A transform as help shows it.
#[derive(Debug)]
pub struct Listed {
    /// The name by which it is chosen.
    pub name: &'static str,
    /// What it gives, in one line.
    pub gives: &'static str,
    /// The parameters that it takes.
    pub parameters: &'static [Parameter],
    pub(super) make: fn(&Given<'_>) -> Result<Transform>,
}

const fn needed(name: &'static str, unit: &'static str, purpose: &'static str) -> Parameter {
    Parameter { name, unit, needed: true, purpose }
}

const fn optional(name: &'static str, unit: &'static str, purpose: &'static str) -> Parameter {
    Parameter { name, unit, needed: false, purpose }
}

const HEIGHT: Parameter = optional("height", "m", "continue the field upward first; 0 if left out");
const INCLINATION: Parameter = needed("inclination", "degrees", "of the geomagnetic field, positive downward");
const DECLINATION: Parameter = needed("declination", "degrees", "of the geomagnetic field, clockwise from north");
const DIP: Parameter =
    optional("magnetisation-inclination", "degrees", "of the total magnetisation; along the field if left out");
const BEARING: Parameter =
    optional("magnetisation-declination", "degrees", "of the total magnetisation; along the field if left out");
const RATIO: Parameter =
    needed("ratio", "kg/m3 per A/m", "density contrast that stands for magnetisation; 1 for shape only");
const WINDOW: Parameter = needed("window", "m", "standard deviation of the Gaussian window");
const DEGREE: Parameter = needed("degree", "1", "of the polynomial: 1, 2 or 3");
const DIRECTIONS: &[Parameter] = &[INCLINATION, DECLINATION, DIP, BEARING];

/// Every transform.
pub(super) static LIST: &[Listed] = &[
    Listed {
        name: "upward",
        gives: "the field continued upward",
        parameters: &[needed("height", "m", "how far")],
        make: |given| Ok(Transform::Upward { height: given.needed("height")? }),
    },
    Listed {
        name: "downward",
        gives: "the field continued downward, regularised by a largest gain or by the noise of the layer",
        parameters: &[
            needed("depth", "m", "how far"),
            optional("gain", "1", "how many times a wave may be magnified; this or noise"),
            optional("noise", "unit of the layer", "standard deviation of the layer's noise; this or gain"),
        ],
        make: |given| {
            Ok(Transform::Downward { depth: given.needed("depth")?, regularisation: given.regularisation()? })
        },
    },
    Listed {
        name: "low-pass",
        gives: "waves longer than a wavelength, with a Gaussian roll-off",
        parameters: &[needed("wavelength", "m", "where half the amplitude is left")],
        make: |given| Ok(Transform::LowPass { wavelength: given.needed("wavelength")? }),
    },
    Listed {
        name: "band-pass",
        gives: "waves between two wavelengths, with Gaussian roll-offs",
        parameters: &[needed("short", "m", "the shorter end"), needed("long", "m", "the longer end")],
        make: |given| Ok(Transform::BandPass { short: given.needed("short")?, long: given.needed("long")? }),
    },
    Listed {
        name: "derivative-east",
        gives: "the first derivative toward grid east",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::First { toward: Toward::East, height: given.height() }),
    },
    Listed {
        name: "derivative-north",
        gives: "the first derivative toward grid north",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::First { toward: Toward::North, height: given.height() }),
    },
    Listed {
        name: "derivative-down",
        gives: "the first vertical derivative, positive downward",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::First { toward: Toward::Down, height: given.height() }),
    },
    Listed {
        name: "second-east",
        gives: "the second derivative toward grid east",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::Second { toward: Toward::East, height: given.height() }),
    },
    Listed {
        name: "second-north",
        gives: "the second derivative toward grid north",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::Second { toward: Toward::North, height: given.height() }),
    },
    Listed {
        name: "second-down",
        gives: "the second vertical derivative",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::Second { toward: Toward::Down, height: given.height() }),
    },
    Listed {
        name: "horizontal-gradient",
        gives: "the horizontal gradient magnitude, with crests over margins",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::HorizontalGradient { height: given.height() }),
    },
    Listed {
        name: "analytic-signal",
        gives: "the length of the three-dimensional gradient",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::AnalyticSignal { height: given.height() }),
    },
    Listed {
        name: "tilt",
        gives: "the tilt angle, zero near margins whatever their contrast",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::Tilt { height: given.height() }),
    },
    Listed {
        name: "tilt-gradient",
        gives: "the horizontal gradient magnitude of the tilt angle, with crests over margins whatever their contrast",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::TiltGradient { height: given.height() }),
    },
    Listed {
        name: "theta",
        gives: "the horizontal gradient magnitude over the analytic signal, near 1 at margins",
        parameters: &[HEIGHT],
        make: |given| Ok(Transform::Theta { height: given.height() }),
    },
    Listed {
        name: "pole",
        gives: "total-field anomalies reduced to the pole",
        parameters: DIRECTIONS,
        make: |given| Ok(Transform::Pole { directions: given.directions()? }),
    },
    Listed {
        name: "equator",
        gives: "total-field anomalies reduced to the equator",
        parameters: DIRECTIONS,
        make: |given| Ok(Transform::Equator { directions: given.directions()? }),
    },
    Listed {
        name: "pseudo-gravity",
        gives: "the gravity that the bodies of total-field anomalies would have",
        parameters: &[INCLINATION, DECLINATION, DIP, BEARING, RATIO],
        make: |given| Ok(Transform::PseudoGravity { directions: given.directions()?, ratio: given.needed("ratio")? }),
    },
    Listed {
        name: "magnetic-potential",
        gives: "the scalar magnetic potential of total-field anomalies",
        parameters: &[INCLINATION, DECLINATION],
        make: |given| Ok(Transform::MagneticPotential { field: given.field()? }),
    },
    Listed {
        name: "potential-to-gravity",
        gives: "the gravity that the bodies of a magnetic potential would have",
        parameters: &[
            needed("magnetisation-inclination", "degrees", "of the total magnetisation, positive downward"),
            needed("magnetisation-declination", "degrees", "of the total magnetisation, clockwise from north"),
            RATIO,
        ],
        make: |given| {
            Ok(Transform::PotentialToGravity { magnetisation: given.magnetisation()?, ratio: given.needed("ratio")? })
        },
    },
    Listed {
        name: "fabric-strike",
        gives: "the direction in which the layer runs, clockwise from grid north",
        parameters: &[WINDOW],
        make: |given| Ok(Transform::FabricStrike { window: given.needed("window")? }),
    },
    Listed {
        name: "fabric-coherence",
        gives: "how far the slopes agree on one direction, 0 to 1",
        parameters: &[WINDOW],
        make: |given| Ok(Transform::FabricCoherence { window: given.needed("window")? }),
    },
    Listed {
        name: "regional",
        gives: "the polynomial that fits the layer best",
        parameters: &[DEGREE],
        make: |given| Ok(Transform::Regional { degree: given.degree()? }),
    },
    Listed {
        name: "residual",
        gives: "the layer less its regional polynomial",
        parameters: &[DEGREE],
        make: |given| Ok(Transform::Residual { degree: given.degree()? }),
    },
    Listed {
        name: "filled",
        gives: "the layer with its gaps filled smoothly",
        parameters: &[],
        make: |_| Ok(Transform::Filled),
    },
];

/// The entry of a name.
pub(super) fn listed(name: &str) -> Result<&'static Listed> {
    LIST.iter().find(|entry| entry.name == name).ok_or_else(|| {
        let names: Vec<&str> = Transform::names().collect();
        Error::input("the name of a transform")
            .found(format!("{name:?}"))
            .wanted(format!("one of {}", names.join(", ")))
    })
}

impl Listed {
    /// The parameters in words.
    pub(super) fn wants(&self) -> String {
        let words: Vec<String> = self
            .parameters
            .iter()
            .map(|one| format!("{} ({}{})", one.name, one.unit, if one.needed { "" } else { ", may be left out" }))
            .collect();
        if words.is_empty() { "no parameter".into() } else { words.join(", ") }
    }

    /// Refuses a parameter that the transform does not take.
    pub(super) fn check(&self, given: &BTreeMap<String, f64>) -> Result<()> {
        match given.keys().find(|name| self.parameters.iter().all(|known| known.name != **name)) {
            None => Ok(()),
            Some(name) => Err(Error::input(format!("the transform {}", self.name))
                .found(format!("a parameter {name:?}"))
                .wanted(self.wants())
                .mend(format!("leave {name} out"))),
        }
    }
}
