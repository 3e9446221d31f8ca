//! The guard against a trend that both layers share: the one alternative that fools every null.

use ndarray::Array2;
use statrs::distribution::{ContinuousCDF, FisherSnedecor};

use super::independent::independent_values;
use crate::grid::Plane;

/// The level at which a layer counts as loading on a direction.
const LEVEL: f64 = 0.05;

/// Two directions closer than this count as one, in degrees.
const SAME_DIRECTION: f64 = 45.0;

/// How far a layer follows a plane over its footprint.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Trend {
    /// Share of the layer's variance that the plane explains, 0 to 1.
    pub share: f64,
    /// Direction in which the plane rises, in degrees clockwise from the top of the array (north).
    pub rises_toward: f64,
    /// p-value of that share under the F test, with the effective number of independent cells of what the plane leaves.
    pub p: f64,
    /// That effective number.
    pub independent_cells: f64,
}

impl Trend {
    /// Fits the plane to the finite values and tests it; also returns what the plane leaves, scaled to unit variance.
    ///
    /// F = (share / 2) / ((1 - share) / (m - 3)) with 2 and m - 3 degrees of freedom, m being the effective number of
    /// independent cells instead of the number of cells, because neighbouring cells repeat one another.
    /// Returns `None` for a layer that does not vary once the plane is gone.
    pub fn remove(values: &Array2<f64>) -> Option<(Self, Array2<f64>)> {
        let plane = Plane::fit(values)?;
        let mut residual = plane.residual(values);
        let spread = |values: &Array2<f64>, centre: f64| {
            let finite = values.iter().filter(|value| value.is_finite());
            finite.map(|value| (value - centre).powi(2)).sum::<f64>()
        };
        let (total, left) = (spread(values, plane.level), spread(&residual, 0.0));
        let count = residual.iter().filter(|value| value.is_finite()).count() as f64;
        let scale = (left / count).sqrt();
        let rounding = 1e-18 * total.max(count * plane.level * plane.level);
        if left.is_nan() || left <= rounding || scale < f64::MIN_POSITIVE {
            return None;
        }
        residual.mapv_inplace(|value| value / scale);
        let share = (1.0 - left / total).clamp(0.0, 1.0);
        let independent_cells = independent_values(&residual);
        let freedom = independent_cells - 3.0;
        let p = match FisherSnedecor::new(2.0, freedom) {
            Ok(law) if freedom > 0.0 => law.sf(share / 2.0 / ((1.0 - share) / freedom)),
            _ => 1.0,
        };
        let rises_toward = plane.right.atan2(-plane.down).to_degrees().rem_euclid(360.0);
        Some((Self { share, rises_toward, p, independent_cells }, residual))
    }

    /// True if both layers load on one direction, or on opposite ends of it.
    pub fn shared_with(&self, other: &Self) -> bool {
        let apart = (self.rises_toward - other.rises_toward).rem_euclid(180.0);
        self.p <= LEVEL && other.p <= LEVEL && apart.min(180.0 - apart) <= SAME_DIRECTION
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng};
    use rand_xoshiro::Xoshiro256PlusPlus;

    fn noise(seed: u64) -> Array2<f64> {
        let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
        Array2::from_shape_fn((40, 40), |_| random.gen_range(-1.0..1.0))
    }

    #[test]
    fn a_plane_is_found_with_its_direction() {
        // Rising to the east and north equally: 45 degrees.
        let tilted = Array2::from_shape_fn((40, 40), |(row, col)| 0.2 * (col as f64 - row as f64)) + noise(1);
        let (trend, residual) = Trend::remove(&tilted).unwrap();
        assert!((trend.rises_toward - 45.0).abs() < 2.0, "{trend:?}");
        assert!(trend.share > 0.9 && trend.p < 1e-6, "{trend:?}");
        let square = residual.iter().map(|value| value * value).sum::<f64>() / 1600.0;
        assert!((square - 1.0).abs() < 1e-9);
        let opposite = Trend::remove(&tilted.mapv(|value| -value)).unwrap().0;
        assert!(trend.shared_with(&opposite), "opposite ends of one direction are shared");
        let across = Array2::from_shape_fn((40, 40), |(row, col)| 0.2 * (col as f64 + row as f64)) + noise(2);
        assert!(!trend.shared_with(&Trend::remove(&across).unwrap().0));
    }

    #[test]
    fn noise_seldom_counts_as_a_trend() {
        // Under no trend p is about uniform: of 200, 10 are expected at .05; 23 is its 99.99 % point (scipy.stats.binom).
        let found = (0..200).filter(|seed| Trend::remove(&noise(*seed)).unwrap().0.p <= 0.05).count();
        assert!(found <= 23, "{found} of 200");
        assert!(found >= 1, "the test can find something");
    }

    #[test]
    fn a_layer_that_does_not_vary_has_no_trend() {
        assert!(Trend::remove(&Array2::from_elem((9, 9), 1e6)).is_none());
        assert!(Trend::remove(&Array2::from_elem((9, 9), f64::NAN)).is_none());
        assert!(Trend::remove(&Array2::from_shape_fn((9, 9), |(row, _)| row as f64)).is_none(), "a plane alone");
    }
}
