//! One definition of a quantile for the whole crate.

/// The `q` quantile of `values` with linear interpolation between order statistics (type 7 of Hyndman & Fan 1996).
///
/// NaN among the values are passed over. `None` if no number is left or `q` is not in [0, 1].
pub(crate) fn quantile(values: Vec<f64>, q: f64) -> Option<f64> {
    let mut numbers: Vec<f64> = values.into_iter().filter(|value| !value.is_nan()).collect();
    quantile_in_place(&mut numbers, q)
}

/// As [`quantile`], of numbers without NaN, which it reorders.
///
/// By selection, whose time and stack do not grow with ties: a half-space fills a slice with one value.
pub(crate) fn quantile_in_place(numbers: &mut [f64], q: f64) -> Option<f64> {
    if !(0.0..=1.0).contains(&q) {
        return None;
    }
    let at = q * numbers.len().checked_sub(1)? as f64;
    let (_, below, rest) = numbers.select_nth_unstable_by(at.floor() as usize, f64::total_cmp);
    let below = *below;
    let found = if at.fract() > 0.0 {
        below + at.fract() * (rest.iter().copied().fold(f64::INFINITY, f64::min) - below)
    } else {
        below
    };
    found.is_finite().then_some(found)
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
    fn a_hundred_thousand_ties_are_no_burden() {
        let mut values = vec![2.0; 100_000];
        values.extend([1.0, 3.0]);
        assert_eq!(quantile(values, 0.85), Some(2.0));
        // numpy.quantile(numpy.arange(101.), [.025, .975]) gives 2.5 and 97.5.
        let values: Vec<f64> = (0..101).map(|i| f64::from(i * 37 % 101)).collect();
        assert!((quantile(values.clone(), 0.025).unwrap() - 2.5).abs() < 1e-12);
        assert!((quantile(values, 0.975).unwrap() - 97.5).abs() < 1e-12);
    }

    #[test]
    fn nothing_to_rank_gives_none() {
        assert_eq!(quantile(vec![], 0.5), None);
        assert_eq!(quantile(vec![f64::NAN], 0.5), None);
        assert_eq!(quantile(vec![1.0], f64::NAN), None);
        assert_eq!(quantile(vec![1.0], 1.5), None);
    }
}
