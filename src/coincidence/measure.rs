//! The measures: each a ratio of sums that are known at every shift.

use std::fmt;

use ndarray::{Array2, Zip};

/// One number for how closely the subject keeps to the reference.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Measure {
    /// (share of subject cells within a distance of the lines) / (share of all cells within it).
    Enrichment {
        /// The distance.
        within: f64,
    },
    /// Mean capped distance of subject cells to the nearest line; a description, since its level is approximate.
    MeanDistance,
    /// Pearson's correlation of the two strengths over the overlap, a plane taken out of each.
    Correlation,
}

impl Measure {
    /// Name in tables.
    pub fn name(self) -> &'static str {
        match self {
            Self::Enrichment { .. } => "enrichment",
            Self::MeanDistance => "mean_distance",
            Self::Correlation => "correlation",
        }
    }

    /// Name for people.
    pub fn words(self) -> &'static str {
        match self {
            Self::Enrichment { .. } => "enrichment",
            Self::MeanDistance => "mean distance",
            Self::Correlation => "correlation",
        }
    }

    /// The distance, for the measures that have one.
    pub fn within(self) -> Option<f64> {
        match self {
            Self::Enrichment { within } => Some(within),
            Self::MeanDistance | Self::Correlation => None,
        }
    }
}

impl fmt::Display for Measure {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.within() {
            Some(within) => write!(f, "{} within {within}", self.name()),
            None => f.write_str(self.name()),
        }
    }
}

/// Enrichment at every shift: `(hits / subject) / (near / cells)`, NaN where it is not defined.
///
/// `hits`: subject cells near the lines; `subject`: subject cells in the overlap; `near`: cells of the overlap near the
/// lines; `cells`: all cells of the overlap.
pub fn enrichment(hits: &Array2<f64>, subject: &Array2<f64>, near: &Array2<f64>, cells: &Array2<f64>) -> Array2<f64> {
    let mut ratio = hits.clone();
    Zip::from(&mut ratio).and(subject).and(near).and(cells).for_each(|ratio, &subject, &near, &cells| {
        *ratio = if subject > 0.0 && near > 0.0 { (*ratio / subject) / (near / cells) } else { f64::NAN };
    });
    ratio
}

/// Closeness at every shift: mean distance of all cells of the overlap less that of the subject's cells.
///
/// `subject_sum` and `cells_sum` are sums of capped distance. Larger means closer; NaN where it is not defined.
pub fn closeness(
    subject_sum: &Array2<f64>,
    subject: &Array2<f64>,
    cells_sum: &Array2<f64>,
    cells: &Array2<f64>,
) -> Array2<f64> {
    let mut closeness = subject_sum.clone();
    Zip::from(&mut closeness).and(subject).and(cells_sum).and(cells).for_each(|value, &subject, &sum, &cells| {
        *value = if subject > 0.0 && cells > 0.0 { sum / cells - *value / subject } else { f64::NAN };
    });
    closeness
}

/// Sums of one of the two strengths over the overlap, at every shift.
pub struct Moments<'a> {
    /// Sum of the numbers.
    pub sum: &'a Array2<f64>,
    /// Sum of their squares.
    pub square: &'a Array2<f64>,
}

/// Pearson's correlation at every shift from sums over the overlap; NaN where either strength does not vary there.
///
/// The strengths should be centred and scaled beforehand, so that the differences of sums lose nothing to rounding.
pub fn correlation(
    product: &Array2<f64>,
    subject: &Moments<'_>,
    reference: &Moments<'_>,
    cells: &Array2<f64>,
) -> Array2<f64> {
    Array2::from_shape_fn(product.dim(), |at| {
        let n = cells[at];
        let (a, b) = (subject.sum[at], reference.sum[at]);
        let covariance = product[at] - a * b / n;
        let (va, vb) = (subject.square[at] - a * a / n, reference.square[at] - b * b / n);
        // Scaled strengths have squares of the order of n; a remainder of 1e-9 n is rounding.
        if n > 2.0 && va > 1e-9 * n && vb > 1e-9 * n {
            (covariance / (va * vb).sqrt()).clamp(-1.0, 1.0)
        } else {
            f64::NAN
        }
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn ratios_by_hand() {
        // 6 of 8 subject cells near the lines, 20 of 80 cells near them: (6/8) / (20/80) = 3.
        let value = enrichment(&array![[6.0]], &array![[8.0]], &array![[20.0]], &array![[80.0]]);
        assert_eq!(value, array![[3.0]]);
        assert!(enrichment(&array![[0.0]], &array![[0.0]], &array![[20.0]], &array![[80.0]])[[0, 0]].is_nan());
        // Subject cells 2.5 away on average, all cells 4: closer by 1.5.
        let value = closeness(&array![[20.0]], &array![[8.0]], &array![[320.0]], &array![[80.0]]);
        assert_eq!(value, array![[1.5]]);
    }

    #[test]
    fn correlation_of_four_pairs() {
        // numpy.corrcoef([1, 2, 3, 5], [2, 1, 4, 6])[0, 1] = 0.9022436387
        let (x, y) = ([1.0, 2.0, 3.0, 5.0], [2.0, 1.0, 4.0, 6.0]);
        let sum = |f: &dyn Fn(usize) -> f64| array![[(0..4).map(f).sum::<f64>()]];
        let value = correlation(
            &sum(&|i| x[i] * y[i]),
            &Moments { sum: &sum(&|i| x[i]), square: &sum(&|i| x[i] * x[i]) },
            &Moments { sum: &sum(&|i| y[i]), square: &sum(&|i| y[i] * y[i]) },
            &array![[4.0]],
        );
        assert!((value[[0, 0]] - 0.902_243_638_7).abs() < 1e-9, "{value}");
    }

    #[test]
    fn a_constant_has_no_correlation() {
        let four = array![[4.0]];
        let one = Moments { sum: &four, square: &four };
        assert!(correlation(&four, &one, &one, &four)[[0, 0]].is_nan());
    }
}
