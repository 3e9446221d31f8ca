//! What counts as a contact.

use crate::error::{Error, Result};

/// Checked settings for finding contacts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ContactSettings {
    strong: f64,
    weak: f64,
    least_length: f64,
    significance: f64,
}

impl ContactSettings {
    /// `strong` and `weak` are quantiles of the crest strengths inside the layer: a line is kept where it holds at least one
    /// crest as strong as `strong`, and followed as far as its crests reach `weak`. `least_length` is in metres.
    ///
    /// # Errors
    /// A quantile outside [0, 1], `weak` above `strong`, a negative length, or a number that is not finite.
    pub fn new(strong: f64, weak: f64, least_length: f64) -> Result<Self> {
        for (name, quantile) in [("strong", strong), ("weak", weak)] {
            if !(0.0..=1.0).contains(&quantile) {
                return Err(Error::input(format!("the quantile {name} of contacts"))
                    .found(quantile)
                    .wanted("a number from 0 to 1")
                    .mend("0.6 for strong and 0.3 for weak are the defaults"));
            }
        }
        if weak > strong {
            return Err(Error::input("the quantile weak of contacts")
                .found(weak)
                .wanted(format!("at most the quantile strong, {strong}"))
                .mend("lower weak or raise strong"));
        }
        if !(least_length.is_finite() && least_length >= 0.0) {
            return Err(Error::input("the least length of contacts")
                .found(least_length)
                .wanted("zero or a positive number of metres")
                .mend("a few cells is a usual choice"));
        }
        Ok(Self { strong, weak, least_length, ..Self::default() })
    }

    /// No quantiles: all crests that stand above the noise count, for [`super::find_contacts_above_noise`]. `least_length`
    /// is in metres.
    ///
    /// # Errors
    /// A length that is negative or not finite.
    pub fn above_noise(least_length: f64) -> Result<Self> {
        Self::new(0.0, 0.0, least_length)
    }

    /// With another significance: the largest chance that noise alone gives a layer any line at all, 0.05 unless set here.
    /// It has an effect only where the noise is known.
    ///
    /// # Errors
    /// A number that is not above 0 and at most 0.5.
    pub fn with_significance(self, level: f64) -> Result<Self> {
        if !(level > 0.0 && level <= 0.5) {
            return Err(Error::input("the significance of contacts")
                .found(level)
                .wanted("a chance above 0 and at most 0.5")
                .mend("0.05 is the default"));
        }
        Ok(Self { significance: level, ..self })
    }

    /// The upper quantile of crest strengths.
    pub fn strong(&self) -> f64 {
        self.strong
    }

    /// The lower quantile of crest strengths.
    pub fn weak(&self) -> f64 {
        self.weak
    }

    /// The least length of a contact, m.
    pub fn least_length(&self) -> f64 {
        self.least_length
    }

    /// The largest chance that noise alone gives a layer any line.
    pub fn significance(&self) -> f64 {
        self.significance
    }
}

impl Default for ContactSettings {
    /// Strong 0.6, weak 0.3, no least length, significance 0.05.
    fn default() -> Self {
        Self { strong: 0.6, weak: 0.3, least_length: 0.0, significance: 0.05 }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_bad_setting_is_refused() {
        let refused = |strong, weak, length| ContactSettings::new(strong, weak, length).unwrap_err().to_string();
        for quantile in [f64::NAN, f64::INFINITY, -0.1, 1.1] {
            assert!(refused(quantile, 0.3, 0.0).contains("quantile strong"));
            assert!(refused(0.6, quantile, 0.0).contains("quantile weak"));
        }
        assert!(refused(0.3, 0.6, 0.0).contains("at most the quantile strong, 0.3"));
        for length in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(refused(0.6, 0.3, length).contains("least length"));
        }
    }

    #[test]
    fn each_bad_significance_is_refused() {
        for level in [f64::NAN, f64::INFINITY, -0.1, 0.0, 0.51] {
            let error = ContactSettings::default().with_significance(level).unwrap_err();
            assert!(error.to_string().contains("the significance of contacts"), "{level}");
        }
        let strict = ContactSettings::above_noise(500.0).unwrap().with_significance(0.01).unwrap();
        assert_eq!(
            (strict.significance(), strict.strong(), strict.weak(), strict.least_length()),
            (0.01, 0.0, 0.0, 500.0)
        );
        assert!(ContactSettings::above_noise(f64::NAN).is_err());
    }

    #[test]
    fn the_default_passes_its_own_check() {
        let default = ContactSettings::default();
        assert_eq!(ContactSettings::new(default.strong(), default.weak(), default.least_length()).unwrap(), default);
    }
}
