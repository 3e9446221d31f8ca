//! One definition of a quantile for the whole crate.

use ndarray::{Array1, Axis};
use ndarray_stats::{MaybeNan, QuantileExt, interpolate::Linear};

/// The `q` quantile of `values` with linear interpolation between order statistics (type 7 of Hyndman & Fan 1996).
///
/// NaN among the values are passed over. `None` if no number is left or `q` is not in [0, 1].
pub(crate) fn quantile(values: Vec<f64>, q: f64) -> Option<f64> {
    if !(0.0..=1.0).contains(&q) {
        return None;
    }
    let at = *q.try_as_not_nan()?;
    let found = Array1::from(values).quantile_axis_skipnan_mut(Axis(0), at, &Linear).ok()?;
    found.first().copied().filter(|value| value.is_finite())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn interpolates_between_order_statistics() {
        // Type 7: position (n - 1) q, so 0.8 of four values stands at 2.4 (Hyndman & Fan 1996).
        let value = quantile(vec![4.0, 1.0, f64::NAN, 3.0, 2.0], 0.8).unwrap();
        assert!((value - 3.4).abs() < 1e-12, "{value}");
        assert_eq!(quantile(vec![2.0, 7.0], 0.0), Some(2.0));
        assert_eq!(quantile(vec![2.0, 7.0], 1.0), Some(7.0));
    }

    #[test]
    fn nothing_to_rank_gives_none() {
        assert_eq!(quantile(vec![], 0.5), None);
        assert_eq!(quantile(vec![f64::NAN], 0.5), None);
        assert_eq!(quantile(vec![1.0], f64::NAN), None);
        assert_eq!(quantile(vec![1.0], 1.5), None);
    }
}
