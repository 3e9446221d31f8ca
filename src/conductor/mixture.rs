//! A threshold from the two parts of a Gaussian mixture.

use linfa::DatasetBase;
use linfa::ParamGuard;
use linfa::traits::Fit;
use linfa_clustering::GaussianMixtureModel;
use ndarray::Array2;
use rand::SeedableRng;
use rand::seq::index::sample;
use rand_xoshiro::Xoshiro256Plus;

use crate::error::{Error, Result};

/// Larger slices are sampled down to this many cells.
const MOST_CELLS: usize = 20_000;

/// The fewest cells that a mixture is fitted to.
const LEAST_CELLS: usize = 20;

/// The least separation D of the parts (Ashman, Bird & Zepf 1994).
const LEAST_SEPARATION: f64 = 2.0;

/// One part of the mixture.
#[derive(Debug, Clone, Copy)]
struct Part {
    weight: f64,
    mean: f64,
    deviation: f64,
}

impl Part {
    /// Weighted density.
    fn density(&self, value: f64) -> f64 {
        let away = (value - self.mean) / self.deviation;
        self.weight * (-0.5 * away * away).exp() / (self.deviation * std::f64::consts::TAU.sqrt())
    }
}

/// The log10 resistivity between the means of a two-part Gaussian mixture where the weighted densities cross.
///
/// `values` are log10 ohm m without NaN; more than 20,000 are sampled without replacement. `seed` fixes sample and start.
///
/// Steps: expectation-maximisation from several seeded starts; refuse if the parts do not separate, that is if
/// D = sqrt(2) |m1 - m2| / sqrt(s1^2 + s2^2) is below 2 or the mixture has no valley between its means; bisect
/// for the crossing.
///
/// Source of D: Ashman, Bird & Zepf (1994), Detecting bimodality in astronomical datasets, Astronomical Journal 108, 2348.
///
/// # Errors
/// Fewer than 20 cells, no convergence, or parts that do not separate.
pub(super) fn valley(values: &[f64], seed: u64) -> Result<f64> {
    let refused = || {
        Error::input("the mixture threshold of a resistivity slice")
            .mend("choose a quantile or a resistivity as the threshold instead")
    };
    if values.len() < LEAST_CELLS {
        return Err(refused()
            .found(format!("{} cells with data", values.len()))
            .wanted(format!("at least {LEAST_CELLS}")));
    }
    let mut random = Xoshiro256Plus::seed_from_u64(seed);
    let kept: Vec<f64> = if values.len() > MOST_CELLS {
        let mut chosen = sample(&mut random, values.len(), MOST_CELLS).into_vec();
        chosen.sort_unstable();
        chosen.into_iter().map(|at| values[at]).collect()
    } else {
        values.to_vec()
    };
    let column = Array2::from_shape_fn((kept.len(), 1), |(at, _)| kept[at]);
    let no_fit = "a mixture of two parts that fits";
    let model = GaussianMixtureModel::params_with_rng(2, random)
        .n_runs(5)
        .tolerance(1e-6)
        .max_n_iterations(500)
        .check()
        .map_err(|error| Error::ours("fitting a mixture").because(error))?
        .fit(&DatasetBase::from(column))
        .map_err(|error| refused().wanted(no_fit).because(error))?;
    let part = |at: usize| Part {
        weight: model.weights()[at],
        mean: model.means()[[at, 0]],
        deviation: model.covariances()[[at, 0, 0]].max(0.0).sqrt(),
    };
    let (mut low, mut high) = (part(0), part(1));
    if low.mean > high.mean {
        std::mem::swap(&mut low, &mut high);
    }
    let spread = low.deviation.hypot(high.deviation);
    let separation = std::f64::consts::SQRT_2 * (high.mean - low.mean) / spread;
    let does_not_separate = || {
        refused()
            .found(format!(
                "parts at {:.3} and {:.3} (log10 ohm m) whose separation D is {separation:.2}: they do not separate",
                low.mean, high.mean
            ))
            .wanted(format!("two parts with a valley between them and D of at least {LEAST_SEPARATION}"))
    };
    let leads = |value: f64| low.density(value) - high.density(value);
    // Written so that NaN is refused as well.
    if !(separation >= LEAST_SEPARATION && leads(low.mean) > 0.0 && leads(high.mean) < 0.0) {
        return Err(does_not_separate());
    }
    let (mut below, mut above) = (low.mean, high.mean);
    for _ in 0..200 {
        let middle = 0.5 * (below + above);
        if leads(middle) > 0.0 { below = middle } else { above = middle }
    }
    let crossing = 0.5 * (below + above);
    let mixture = |value: f64| low.density(value) + high.density(value);
    if mixture(crossing) < mixture(low.mean).min(mixture(high.mean)) { Ok(crossing) } else { Err(does_not_separate()) }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quantiles of a normal distribution at even steps, by the logistic approximation scaled to unit variance: enough for a
    /// sample with one hump.
    fn hump(mean: f64, deviation: f64, count: usize) -> Vec<f64> {
        let scale = deviation * 3.0_f64.sqrt() / std::f64::consts::PI;
        (0..count)
            .map(|at| {
                let share = (at as f64 + 0.5) / count as f64;
                mean + scale * (share / (1.0 - share)).ln()
            })
            .collect()
    }

    #[test]
    fn two_humps_of_one_shape_part_halfway() {
        // Source: symmetry. The mirror image of the sample about 2.0 is the sample, so the crossing stands at 2.0.
        let values = [hump(1.0, 0.2, 500), hump(3.0, 0.2, 500)].concat();
        let threshold = valley(&values, 7).unwrap();
        assert!((threshold - 2.0).abs() < 0.02, "{threshold}");
        assert_eq!(valley(&values, 7).unwrap().to_bits(), threshold.to_bits());
    }

    #[test]
    fn a_large_slice_is_sampled_and_repeats_itself() {
        let values = [hump(1.0, 0.2, 30_000), hump(3.0, 0.2, 30_000)].concat();
        let threshold = valley(&values, 7).unwrap();
        assert!((threshold - 2.0).abs() < 0.03, "{threshold}");
        assert_eq!(valley(&values, 7).unwrap().to_bits(), threshold.to_bits());
    }

    #[test]
    fn what_does_not_separate_is_refused() {
        let error = valley(&hump(2.0, 0.5, 2000), 7).unwrap_err().to_string();
        assert!(error.contains("do not separate"), "{error}");
        let error = valley(&[1.0, 2.0, 3.0], 7).unwrap_err().to_string();
        assert!(error.contains("3 cells"), "{error}");
    }
}
