//! The white noise of a layer, estimated from its highest wavenumbers.

use std::f64::consts::{LN_2, PI};

use ndarray::Array2;
use rayon::prelude::*;
use realfft::RealFftPlanner;
use rustfft::{FftPlanner, num_complex::Complex64};

use super::gaps::fill_gaps;
use crate::error::{Error, Result};
use crate::grid::Grid;
use crate::quantile::quantile_in_place;

/// The fewest rows and columns from which noise is estimated: fewer leave too few waves near the highest wavenumber.
const LEAST_SIDE: usize = 24;

/// The least share of the layer, weighted as the taper weighs it, that must hold numbers of its own.
const LEAST_SHARE: f64 = 0.25;

/// Both wavenumbers, toward east and toward north, must reach this share of the highest one.
const INNER: f64 = 0.6;

/// Where the outer part of the corner begins.
const OUTER: f64 = 0.8;

/// The inner part is left out where it holds more than this many times the power of the outer one.
const MOST_FALL: f64 = 2.0;

/// Share of each side that is tapered at each end.
const TAPER: f64 = 0.125;

/// What is known of the white noise of a layer.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NoiseEstimate {
    /// Standard deviation of the noise in each cell, in units of the layer.
    pub sigma: f64,
    /// Standard error of `sigma` as a share of it, if the noise is white and Gaussian.
    pub relative_error: f64,
    /// Median power from 0.6 to 0.8 of the highest wavenumber over that beyond 0.8; about 1 for white noise. Infinite
    /// where the outer part holds no power at all and the inner part does, 1 where neither does.
    pub fall: f64,
    /// Waves that were used.
    pub waves: usize,
}

impl NoiseEstimate {
    /// `sigma` and one standard error: for limits that must hold their level although the noise is only estimated. At five
    /// standard deviations a noise that is taken 5 % too small lets through three times as many false crests.
    pub fn cautious(&self) -> f64 {
        self.sigma * (1.0 + self.relative_error)
    }

    /// False where the power changes between the inner and the outer part by more than three of its standard errors, or
    /// twofold. Most often it falls: the layer was interpolated or smoothed, so that its noise is larger than `sigma` says
    /// at the waves that carry contacts, or shallow sources reach this far.
    pub fn is_white(&self) -> bool {
        // The inner part holds three quarters of the waves and the outer one a quarter, so that the logarithm of their ratio
        // has an error of sqrt(4/3 + 4) times that of the whole, which is twice that of its square root, sigma.
        let error = 2.0 * self.relative_error * (4.0_f64 / 3.0 + 4.0).sqrt();
        self.fall.ln().abs() <= (3.0 * error).min(MOST_FALL.ln())
    }
}

/// Estimates the white noise of a layer from its highest wavenumbers, where the field of anything deeper than about a
/// cell has died away as exp(-|k| depth).
///
/// Steps: fill the gaps ([`super::fill_gaps`]); second differences along the rows and then the columns, which keep strong
/// long waves from leaking upward and whose gain is known; a cosine taper over an eighth of each side at each end; the
/// periodogram, over the gain and over the sum of the squared taper in cells that hold numbers of their own (filled ones
/// bring no noise); the waves whose components toward east *and* north both reach 0.6 of the highest (pi / cell), the
/// corners of the wavenumber square, which also leaves out stripes along lines of survey; of those only beyond 0.8 if the
/// power falls more than twofold; the median over ln 2. The ordinates of the periodogram of Gaussian noise are exponential,
/// so their median is ln 2 of their mean, and a few waves with signal do not move it (Priestley 1981, Spectral Analysis
/// and Time Series, section 6.1, from memory).
///
/// A grid that was interpolated between stations or lines, or smoothed, has lost its shortest waves: the noise is then
/// underestimated, often severely, and [`NoiseEstimate::is_white`] mostly says so. Give the noise of the survey instead.
///
/// # Errors
/// Fewer than 24 rows or columns; numbers in less than a quarter of the layer.
pub fn estimate_noise(grid: &Grid) -> Result<NoiseEstimate> {
    let (rows, cols) = grid.frame().shape();
    if rows.min(cols) < LEAST_SIDE {
        return Err(Error::input("estimating the noise of a layer")
            .found(format!("{rows} rows x {cols} columns"))
            .wanted(format!("at least {LEAST_SIDE} rows and {LEAST_SIDE} columns"))
            .mend("give the noise of the survey itself, or a larger frame"));
    }
    let (down, across) = (taper(rows - 2), taper(cols - 2));
    let (mut whole, mut square, mut fourth) = (0.0, 0.0, 0.0);
    for (row, &along) in down.iter().enumerate() {
        for (col, &beside) in across.iter().enumerate() {
            let weight = (along * beside).powi(2);
            whole += weight;
            if grid.values()[[row + 1, col + 1]].is_finite() {
                square += weight;
                fourth += weight * weight;
            }
        }
    }
    if square < LEAST_SHARE * whole {
        return Err(Error::input("estimating the noise of a layer")
            .found(format!("numbers in {:.0} % of the layer", 100.0 * square / whole))
            .wanted(format!("in at least {:.0} %, because cells that are filled in hold no noise", 100.0 * LEAST_SHARE))
            .mend("give the noise of the survey itself, or a frame that fits the layer more closely"));
    }
    let (mut inner, mut outer) = corner_powers(&fill_gaps(grid.values())?, &down, &across)?;
    let median = |powers: &mut [f64]| {
        quantile_in_place(powers, 0.5).ok_or_else(|| Error::ours("the median of a periodogram").found("no wave"))
    };
    let (near, far) = (median(&mut inner)?, median(&mut outer)?);
    let fall = if near == far { 1.0 } else { near / far };
    if fall <= MOST_FALL {
        outer.append(&mut inner);
    }
    let waves = outer.len();
    // The taper lets neighbouring waves share what they know. The variance of a median of exponentials is 1/n, so that
    // of median / ln 2 is 1 / (n ln^2 2), and a square root halves the share.
    let independent = waves as f64 * square * square / (fourth * (rows - 2) as f64 * (cols - 2) as f64);
    Ok(NoiseEstimate {
        sigma: (median(&mut outer)? / (LN_2 * square)).sqrt(),
        relative_error: 0.5 / (LN_2 * independent.sqrt()),
        fall,
        waves,
    })
}

/// A cosine taper that leaves the middle three quarters alone.
fn taper(length: usize) -> Vec<f64> {
    let run = (TAPER * length as f64).ceil();
    (0..length)
        .map(|at| {
            let from_end = at.min(length - 1 - at) as f64 + 0.5;
            if from_end < run { 0.5 * (1.0 - (PI * from_end / run).cos()) } else { 1.0 }
        })
        .collect()
}

/// The periodogram of the tapered second differences over their gain, at the waves of the corner from [`INNER`] to
/// [`OUTER`] and at those beyond. `values` holds a ring of one cell more than the tapers.
fn corner_powers(values: &Array2<f64>, down: &[f64], across: &[f64]) -> Result<(Vec<f64>, Vec<f64>)> {
    let (rows, cols) = (down.len(), across.len());
    let first = (INNER * cols as f64 / 2.0).ceil() as usize;
    let forward = RealFftPlanner::<f64>::new().plan_fft_forward(cols);
    let lines: Vec<Vec<Complex64>> = (0..rows)
        .into_par_iter()
        .map(|row| {
            let bend = |col: usize| values[[row, col]] - 2.0 * values[[row + 1, col]] + values[[row + 2, col]];
            let mut input: Vec<f64> = (0..cols)
                .map(|col| down[row] * across[col] * (bend(col) - 2.0 * bend(col + 1) + bend(col + 2)))
                .collect();
            let mut line = forward.make_output_vec();
            forward.process(&mut input, &mut line)?;
            Ok(line.split_off(first))
        })
        .collect::<Result<_, realfft::FftError>>()
        .map_err(|error| Error::ours("the periodogram of a layer").because(error))?;
    let along = FftPlanner::<f64>::new().plan_fft_forward(rows);
    let parts: Vec<(Vec<f64>, Vec<f64>)> = (first..cols / 2 + 1)
        .into_par_iter()
        .map(|col| {
            let mut column: Vec<Complex64> = lines.iter().map(|line| line[col - first]).collect();
            along.process(&mut column);
            let (mut inner, mut outer) = (Vec::new(), Vec::new());
            let east = 2.0 * col as f64 / cols as f64;
            for (row, bin) in column.iter().enumerate() {
                // At the highest wavenumber toward east the second half of the column repeats the first.
                let north = 2.0 * row.min(rows - row) as f64 / rows as f64;
                if north < INNER || (2 * col == cols && 2 * row > rows) {
                    continue;
                }
                let power = bin.norm_sqr() / (gain(east) * gain(north));
                if east.min(north) < OUTER { inner.push(power) } else { outer.push(power) }
            }
            (inner, outer)
        })
        .collect();
    let (inner, outer): (Vec<_>, Vec<_>) = parts.into_iter().unzip();
    Ok((inner.concat(), outer.concat()))
}

/// The gain in power of a second difference at a share of the highest wavenumber: (2 - 2 cos(pi share))^2.
fn gain(share: f64) -> f64 {
    (2.0 - 2.0 * (PI * share).cos()).powi(2)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::chance::gaussian;
    use crate::grid::Frame;

    /// The gravity of a buried point mass, up to scale: depth / (r^2 + depth^2)^1.5 (Blakely 1995, section 3.2.1).
    fn field(side: usize, depth: f64) -> Array2<f64> {
        Array2::from_shape_fn((side, side), |(row, col)| {
            let middle = 0.4 * side as f64;
            let (x, y) = (col as f64 - middle, row as f64 - middle);
            100.0 * depth.powi(3) / (x * x + y * y + depth * depth).powf(1.5) + 0.5 * x
        })
    }

    fn grid(values: Array2<f64>) -> Grid {
        Grid::new(Frame::local(50.0, values.nrows(), values.ncols()).unwrap(), values).unwrap()
    }

    #[test]
    fn a_known_noise_is_recovered_with_its_stated_error() {
        // Source: the noise that was put in. The field's range is 500 times the noise.
        let draws: Vec<f64> = (0..20)
            .map(|seed| {
                let noisy = field(128, 6.0) + gaussian((128, 128), seed) * 0.2;
                let found = estimate_noise(&grid(noisy)).unwrap();
                assert!(found.is_white(), "{found:?}");
                assert!((found.sigma / 0.2 - 1.0).abs() < 0.08, "{found:?}");
                found.sigma / 0.2
            })
            .collect();
        let mean = draws.iter().sum::<f64>() / 20.0;
        let spread = (draws.iter().map(|draw| (draw - mean).powi(2)).sum::<f64>() / 19.0).sqrt();
        let one = estimate_noise(&grid(gaussian((128, 128), 0))).unwrap();
        let stated = one.relative_error;
        assert_eq!(one.cautious(), one.sigma * (1.0 + stated));
        println!("mean {mean:.4}, spread {spread:.4}, stated {stated:.4}");
        assert!((mean - 1.0).abs() < 0.02 && (0.6..1.5).contains(&(spread / stated)));
    }

    #[test]
    fn a_field_without_noise_has_none() {
        let found = estimate_noise(&grid(field(128, 6.0))).unwrap();
        println!("noise-free: {found:?}");
        assert!(found.sigma < 1e-6, "{found:?}");
        assert_eq!(estimate_noise(&grid(Array2::from_elem((40, 40), 7.0))).unwrap().sigma, 0.0);
    }

    #[test]
    fn gaps_do_not_lower_the_noise() {
        let mut noisy = field(160, 6.0) + gaussian((160, 160), 3) * 0.2;
        noisy.slice_mut(ndarray::s![..70, 90..]).fill(f64::NAN);
        noisy.slice_mut(ndarray::s![100..120, 20..60]).fill(f64::NAN);
        let found = estimate_noise(&grid(noisy)).unwrap();
        assert!((found.sigma / 0.2 - 1.0).abs() < 0.08, "{found:?}");
    }

    #[test]
    fn a_smoothed_layer_is_recognised() {
        let noise = gaussian((128, 128), 4);
        // The mean of 2 x 2 cells has power cos^2(kx/2) cos^2(ky/2): none at the corner.
        let smooth = Array2::from_shape_fn((127, 127), |(row, col)| {
            (noise[[row, col]] + noise[[row + 1, col]] + noise[[row, col + 1]] + noise[[row + 1, col + 1]]) / 4.0
        });
        let found = estimate_noise(&grid(smooth)).unwrap();
        assert!(!found.is_white() && found.sigma < 0.2, "{found:?}");
    }

    #[test]
    fn what_cannot_be_estimated_is_refused() {
        let refused = |values| estimate_noise(&grid(values)).unwrap_err().to_string();
        assert!(refused(Array2::zeros((23, 60))).contains("23 rows"));
        assert!(refused(Array2::zeros((60, 23))).contains("23 columns"));
        assert!(refused(Array2::from_elem((40, 40), f64::NAN)).contains("0 % of the layer"));
        let mut holed = gaussian((60, 60), 1);
        holed.slice_mut(ndarray::s![.., ..50]).fill(f64::NAN);
        assert!(refused(holed).contains("numbers in"));
    }
}
