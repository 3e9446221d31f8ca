//! What a conductivity model's files hold, and how it becomes log10 resistivity.

use ndarray::Array2;

use crate::error::{Error, Result};

/// The quantity in a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantity {
    /// Resistivity, ohm m.
    Resistivity,
    /// Conductivity, S/m.
    Conductivity,
    /// log10 of resistivity in ohm m.
    Log10Resistivity,
    /// log10 of conductivity in S/m.
    Log10Conductivity,
}

/// log10 values beyond this are no earth material: 10^12 ohm m and more is vacuum, 10^-12 a superconductor. A grid of plain
/// resistivity given as logarithms lands here.
const LARGEST_LOG10: f64 = 12.0;

impl Quantity {
    const ALL: [(Self, &'static str); 4] = [
        (Self::Resistivity, "resistivity"),
        (Self::Conductivity, "conductivity"),
        (Self::Log10Resistivity, "log10-resistivity"),
        (Self::Log10Conductivity, "log10-conductivity"),
    ];

    /// The names that a study may use.
    pub fn names() -> [&'static str; 4] {
        Self::ALL.map(|(_, name)| name)
    }

    /// The quantity of a name.
    pub fn from_name(name: &str) -> Option<Self> {
        Self::ALL.iter().find(|(_, known)| *known == name).map(|(quantity, _)| *quantity)
    }

    /// Name in the study file.
    pub fn name(self) -> &'static str {
        match self {
            Self::Resistivity => "resistivity",
            Self::Conductivity => "conductivity",
            Self::Log10Resistivity => "log10-resistivity",
            Self::Log10Conductivity => "log10-conductivity",
        }
    }

    /// Turns values into log10 resistivity (ohm m); NaN stays missing.
    ///
    /// # Errors
    /// Values that are zero or negative where a logarithm is to be taken, and logarithms beyond any earth material.
    pub fn to_log10_resistivity(self, mut values: Array2<f64>) -> Result<Array2<f64>> {
        let logarithm = matches!(self, Self::Log10Resistivity | Self::Log10Conductivity);
        let bad = |value: &&f64| if logarithm { value.abs() > LARGEST_LOG10 } else { **value <= 0.0 };
        let count = values.iter().filter(bad).count();
        if let Some(first) = values.iter().find(bad) {
            let error = Error::input(self.name()).found(format!("{count} cells such as {first}"));
            return Err(if logarithm {
                error.wanted(format!("logarithms between -{LARGEST_LOG10} and {LARGEST_LOG10}")).mend(
                    "check conductivity.quantity: the values may not be logarithms; or mark those cells as no data",
                )
            } else {
                error
                    .wanted("positive values")
                    .mend("check conductivity.quantity: the values may be logarithms; or mark those cells as no data")
            });
        }
        values.mapv_inplace(|value| match self {
            Self::Resistivity => value.log10(),
            Self::Conductivity => -value.log10(),
            Self::Log10Resistivity => value,
            Self::Log10Conductivity => -value,
        });
        Ok(values)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn one_earth_in_four_quantities() {
        // 100 ohm m is 0.01 S/m by definition.
        for (quantity, value) in [
            (Quantity::Resistivity, 100.0),
            (Quantity::Conductivity, 0.01),
            (Quantity::Log10Resistivity, 2.0),
            (Quantity::Log10Conductivity, -2.0),
        ] {
            let log = quantity.to_log10_resistivity(array![[value, f64::NAN]]).unwrap();
            assert!((log[[0, 0]] - 2.0).abs() < 1e-12 && log[[0, 1]].is_nan());
            assert_eq!(Quantity::from_name(quantity.name()), Some(quantity));
        }
        assert_eq!(Quantity::from_name("ohms"), None);
    }

    #[test]
    fn impossible_values_are_refused() {
        for value in [0.0, -3.0] {
            let message = Quantity::Resistivity.to_log10_resistivity(array![[value, 5.0]]).unwrap_err().to_string();
            assert!(message.contains("1 cells such as") && message.contains("positive"), "{message}");
        }
        let message = Quantity::Log10Resistivity.to_log10_resistivity(array![[1500.0]]).unwrap_err().to_string();
        assert!(message.contains("may not be logarithms"), "{message}");
    }
}
