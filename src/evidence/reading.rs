//! A measure as observed, with what chance would give: what both kinds of curve draw.

/// One reading of a measure. A number that is not finite counts as absent.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Reading {
    /// What was observed; `None` where the data cannot tell.
    pub observed: Option<f64>,
    /// The 2.5 % point of the null.
    pub null_low: Option<f64>,
    /// The mean of the null.
    pub null_mean: Option<f64>,
    /// The 97.5 % point of the null.
    pub null_high: Option<f64>,
    /// The p-value adjusted for the family; `None` where there is none.
    pub p_family: Option<f64>,
}

impl Reading {
    /// The same reading without numbers that are not finite.
    pub(super) fn finite(&self) -> Self {
        let finite = |value: Option<f64>| value.filter(|value| value.is_finite());
        Self {
            observed: finite(self.observed),
            null_low: finite(self.null_low),
            null_mean: finite(self.null_mean),
            null_high: finite(self.null_high),
            p_family: finite(self.p_family),
        }
    }
}
