//! How many independent values a smooth, masked field holds.

use ndarray::Array2;

use super::correlator::Correlator;
use super::shift::Reach;

/// Counts the effectively independent values among the finite values of a field.
///
/// 1. The autocorrelation at each lag is taken over the pairs of finite cells that the lag joins.
/// 2. It is averaged over rings of equal lag length; the first ring whose mean is not positive ends the sum.
/// 3. The count is the number of finite cells over the sum of the autocorrelation inside that ring.
///
/// The idea is Bartlett's variance of a mean under autocorrelation, in two dimensions (Bartlett 1946; Clifford,
/// Richardson & Hemon 1989). Cutting the sum at the first zero keeps the count on the safe side.
/// Returns 0 for a field without spread.
pub fn independent_values(field: &Array2<f64>) -> f64 {
    let (rows, cols) = field.dim();
    let lags = Reach { rows: rows / 2, cols: cols / 2 };
    let lags = Correlator::new((rows, cols), lags);
    independent_values_with(&lags, field, &pairs_at_lags(&lags, &field.mapv(f64::is_finite)))
}

/// How many pairs of the cells given are joined by each lag; the correlator's reach bounds the lags.
pub(super) fn pairs_at_lags(lags: &Correlator, present: &Array2<bool>) -> Array2<f64> {
    let present = lags.spectrum(|row, col| f64::from(u8::from(present[[row, col]])));
    lags.counts(&present, &present)
}

/// As [`independent_values`], with the transforms planned and the pairs of the finite cells counted beforehand.
pub(super) fn independent_values_with(lags: &Correlator, field: &Array2<f64>, pairs: &Array2<f64>) -> f64 {
    let count = field.iter().filter(|value| value.is_finite()).count();
    if count == 0 {
        return 0.0;
    }
    let mean = field.iter().filter(|value| value.is_finite()).sum::<f64>() / count as f64;
    let centred = lags.spectrum(|row, col| {
        let value = field[[row, col]];
        if value.is_finite() { value - mean } else { 0.0 }
    });
    let products = lags.sums(&centred, &centred);
    let reach = lags.reach();
    let variance = products[reach.zero()] / count as f64;
    if variance.is_nan() || variance <= f64::MIN_POSITIVE {
        return 0.0;
    }
    let longest = (reach.rows as f64).hypot(reach.cols as f64).round() as usize;
    let mut rings = vec![(0.0, 0usize); longest + 1];
    for ((row, col), product) in products.indexed_iter() {
        let joined = pairs[[row, col]];
        if joined > 0.0 {
            let lag = (row as f64 - reach.rows as f64).hypot(col as f64 - reach.cols as f64);
            let ring = &mut rings[lag.round() as usize];
            ring.0 += product / joined / variance;
            ring.1 += 1;
        }
    }
    let positive = rings.iter().take_while(|(sum, lags)| *lags > 0 && *sum > 0.0);
    let area: f64 = positive.map(|(sum, _)| sum).sum();
    count as f64 / area.max(1.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};
    use rand_xoshiro::Xoshiro256PlusPlus;

    #[test]
    fn white_noise_is_almost_all_independent() {
        let mut random = Xoshiro256PlusPlus::seed_from_u64(1);
        let field = Array2::from_shape_fn((64, 64), |_| random.gen_range(-1.0..1.0));
        let count = independent_values(&field);
        // Expected: 4096 for uncorrelated cells, by definition; the ring sum adds only positive noise.
        assert!(count > 0.6 * 4096.0 && count <= 4096.0, "{count}");
    }

    #[test]
    fn a_block_mean_field_holds_about_one_value_for_each_block() {
        // Blocks of b x b equal cells with independent values: the autocorrelation is the product of two triangles
        // (1 - |h|/b), whose sum over all lags is b^2, so the count is cells / b^2: the number of blocks.
        let mut random = Xoshiro256PlusPlus::seed_from_u64(5);
        let blocks = Array2::from_shape_fn((24, 24), |_| random.gen_range(-1.0..1.0));
        let field = Array2::from_shape_fn((144, 144), |(row, col)| blocks[[row / 6, col / 6]]);
        let count = independent_values(&field);
        assert!((0.6 * 576.0..1.3 * 576.0).contains(&count), "{count} for 576 blocks");
        let holes = Array2::from_shape_fn((144, 144), |(row, col)| if col < 72 { field[[row, col]] } else { f64::NAN });
        let half = independent_values(&holes);
        assert!((0.6 * 288.0..1.3 * 288.0).contains(&half), "{half} for 288 blocks");
    }

    #[test]
    fn nothing_and_a_constant_hold_no_value() {
        assert_eq!(independent_values(&Array2::from_elem((8, 8), f64::NAN)), 0.0);
        assert_eq!(independent_values(&Array2::from_elem((8, 8), 3.5)), 0.0);
    }
}
