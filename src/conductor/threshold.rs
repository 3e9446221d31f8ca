//! Where a conductor or a resistor begins.

use super::mixture::valley;
use crate::error::{Error, Result};
use crate::quantile::quantile;

/// Which bodies are sought.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// Bodies of low resistivity.
    Conductor,
    /// Bodies of high resistivity.
    Resistor,
}

impl Side {
    /// True if a log10 resistivity belongs to a body with this threshold.
    pub fn holds(self, log10: f64, threshold_log10: f64) -> bool {
        match self {
            Self::Conductor => log10 <= threshold_log10,
            Self::Resistor => log10 >= threshold_log10,
        }
    }

    /// The word for one such body.
    pub fn word(self) -> &'static str {
        match self {
            Self::Conductor => "conductor",
            Self::Resistor => "resistor",
        }
    }
}

/// How the threshold is chosen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Threshold {
    /// A quantile of log10 *conductivity* over the footprint, between 0 and 1. Conductors are the cells at or above it:
    /// 0.80 gives the most conductive fifth. Resistors are the cells at or below it: 0.15 gives the most resistive 15 %.
    Quantile(f64),
    /// A resistivity in ohm m: conductors are the cells at or below it, resistors those at or above it.
    Absolute(f64),
    /// The log10 resistivity at which the two parts of a Gaussian mixture are equally likely.
    Mixture,
}

impl Threshold {
    /// The threshold in log10 ohm m over the numbers of a slice (log10 ohm m, no NaN). `seed` serves the mixture only.
    ///
    /// # Errors
    /// A quantile outside (0, 1), a resistivity that is not positive and finite, no number, or a mixture whose parts do
    /// not separate.
    pub(super) fn of(self, values: &[f64], seed: u64) -> Result<f64> {
        match self {
            Self::Quantile(share) => {
                if !(share > 0.0 && share < 1.0) {
                    return Err(Error::input("the quantile of conductors or resistors")
                        .found(share)
                        .wanted("a number between 0 and 1, both excluded")
                        .mend("0.80 takes the most conductive fifth as conductors"));
                }
                // Quantiles of log10 conductivity, which is the negative of log10 resistivity.
                let conductivity = values.iter().map(|value| -value).collect();
                quantile(conductivity, share)
                    .map(|level| -level)
                    .ok_or_else(|| Error::input("the resistivity slice").found("no number").wanted("data on the frame"))
            }
            Self::Absolute(resistivity) => {
                if !(resistivity.is_finite() && resistivity > 0.0) {
                    return Err(Error::input("the resistivity threshold of conductors or resistors")
                        .found(resistivity)
                        .wanted("a positive number of ohm m")
                        .mend("give the resistivity itself, not its logarithm"));
                }
                Ok(resistivity.log10())
            }
            Self::Mixture => valley(values, seed),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantiles_are_of_conductivity() {
        let values: Vec<f64> = (0..=100).map(|at| f64::from(at) / 50.0).collect();
        // Source: the order statistics of 0, 0.02 .. 2; the most conductive fifth lies at or below 0.4, the most resistive
        // 15 % at or above 1.7.
        let conductor = Threshold::Quantile(0.80).of(&values, 0).unwrap();
        assert!((conductor - 0.4).abs() < 1e-12);
        let resistor = Threshold::Quantile(0.15).of(&values, 0).unwrap();
        assert!((resistor - 1.7).abs() < 1e-12);
        assert!(Side::Conductor.holds(0.39, conductor) && !Side::Conductor.holds(0.41, conductor));
        assert!(Side::Resistor.holds(1.71, resistor) && !Side::Resistor.holds(1.69, resistor));
    }

    #[test]
    fn each_bad_threshold_is_refused() {
        for share in [f64::NAN, 0.0, 1.0, -0.5, 80.0] {
            let error = Threshold::Quantile(share).of(&[1.0, 2.0], 0).unwrap_err().to_string();
            assert!(error.contains("between 0 and 1"), "{error}");
        }
        for resistivity in [f64::NAN, f64::INFINITY, 0.0, -30.0] {
            let error = Threshold::Absolute(resistivity).of(&[1.0, 2.0], 0).unwrap_err().to_string();
            assert!(error.contains("ohm m"), "{error}");
        }
        assert!(Threshold::Quantile(0.5).of(&[], 0).unwrap_err().to_string().contains("no number"));
        assert_eq!(Threshold::Absolute(100.0).of(&[], 0).unwrap(), 2.0);
    }
}
