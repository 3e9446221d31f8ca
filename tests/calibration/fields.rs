//! Random fields that are smooth and not periodic, and the lines that a gradient picker finds in them.

use ndarray::Array2;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;

/// Smoothness of a Matern field whose covariance has a closed form (Rasmussen & Williams 2006, equation 4.17).
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Smoothness {
    /// nu = 1.5: (1 + x) exp(-x).
    Once,
    /// nu = 2.5: (1 + x + x^2 / 3) exp(-x).
    Twice,
}

impl Smoothness {
    fn order(self) -> f64 {
        match self {
            Self::Once => 1.5,
            Self::Twice => 2.5,
        }
    }

    fn covariance(self, x: f64) -> f64 {
        match self {
            Self::Once => (1.0 + x) * (-x).exp(),
            Self::Twice => (1.0 + x + x * x / 3.0) * (-x).exp(),
        }
    }

    /// The argument at which the covariance has fallen to 1/e, by bisection.
    fn e_folding(self) -> f64 {
        let (mut low, mut high) = (0.0, 10.0);
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if self.covariance(middle) > (-1.0f64).exp() { low = middle } else { high = middle }
        }
        low
    }
}

/// Two independent Matern fields of unit variance with correlation length `length` (1/e, in cells).
///
/// White noise with the square root of the spectrum (k^2 + |w|^2)^-(nu + 1) is transformed on a grid of twice the side
/// and one quarter of it is cut out, so that opposite edges have nothing to do with one another. The real and the
/// imaginary part of one transform are independent.
pub fn pair(seed: u64, shape: (usize, usize), length: f64, smoothness: Smoothness) -> [Array2<f64>; 2] {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let (rows, cols) = (2 * shape.0, 2 * shape.1);
    let inverse_length = smoothness.e_folding() / length;
    let wave = |k: usize, n: usize| std::f64::consts::TAU * k.min(n - k) as f64 / n as f64;
    let mut power = 0.0;
    let mut spectrum = Array2::from_shape_fn((rows, cols), |(row, col)| {
        let square = wave(row, rows).powi(2) + wave(col, cols).powi(2);
        let amplitude = (inverse_length * inverse_length + square).powf(-0.5 * (smoothness.order() + 1.0));
        power += amplitude * amplitude;
        // Box & Muller (1958).
        let radius = (-2.0 * (1.0 - random.r#gen::<f64>()).ln()).sqrt();
        Complex64::from_polar(radius * amplitude, std::f64::consts::TAU * random.r#gen::<f64>())
    });
    let mut planner = FftPlanner::new();
    let along_rows = planner.plan_fft_inverse(cols);
    spectrum.rows_mut().into_iter().for_each(|mut row| along_rows.process(row.as_slice_mut().unwrap()));
    let along_cols = planner.plan_fft_inverse(rows);
    let mut kept = Array2::<Complex64>::zeros(shape);
    let mut column = vec![Complex64::default(); rows];
    for col in 0..shape.1 {
        column.iter_mut().zip(spectrum.column(col)).for_each(|(to, from)| *to = *from);
        along_cols.process(&mut column);
        kept.column_mut(col).iter_mut().zip(&column).for_each(|(to, from)| *to = *from);
    }
    let scale = power.sqrt().recip();
    [kept.mapv(|value| value.re * scale), kept.mapv(|value| value.im * scale)]
}

/// Magnitude of the horizontal gradient, by central differences; one-sided at the edge of the array.
pub fn gradient(field: &Array2<f64>) -> Array2<f64> {
    let (rows, cols) = field.dim();
    let slope = |before: [usize; 2], after: [usize; 2]| {
        let apart = (after[0] - before[0] + after[1] - before[1]) as f64;
        (field[after] - field[before]) / apart
    };
    Array2::from_shape_fn((rows, cols), |(row, col)| {
        let down = slope([row.saturating_sub(1), col], [(row + 1).min(rows - 1), col]);
        let right = slope([row, col.saturating_sub(1)], [row, (col + 1).min(cols - 1)]);
        down.hypot(right)
    })
}

/// The stronger crests of a gradient magnitude inside a footprint.
///
/// A cell is on a crest if it exceeds both neighbours in at least two of the four directions of its 3 x 3 window
/// (Blakely & Simpson 1986), all nine cells lying in the footprint; the crests above the 0.6 quantile of their strength
/// are kept.
pub fn crests(strength: &Array2<f64>, footprint: &Array2<bool>) -> Array2<bool> {
    let (rows, cols) = strength.dim();
    let mut found = Vec::new();
    for row in 1..rows - 1 {
        for col in 1..cols - 1 {
            if !footprint.slice(ndarray::s![row - 1..row + 2, col - 1..col + 2]).iter().all(|inside| *inside) {
                continue;
            }
            let here = strength[[row, col]];
            let higher = |down: usize, right: usize| {
                // Offsets 0, 1, 2 stand for -1, 0, 1.
                let (a, b) = ([row + down - 1, col + right - 1], [row + 1 - down, col + 1 - right]);
                here > strength[a] && here > strength[b]
            };
            let directions = [higher(1, 2), higher(2, 1), higher(2, 2), higher(2, 0)];
            if directions.iter().filter(|crest| **crest).count() >= 2 {
                found.push((row, col, here));
            }
        }
    }
    found.sort_by(|a, b| a.2.total_cmp(&b.2));
    let mut lines = Array2::from_elem((rows, cols), false);
    found.iter().skip((0.6 * found.len() as f64) as usize).for_each(|(row, col, _)| lines[[*row, *col]] = true);
    lines
}

/// Exact Euclidean distance, in cells, from each cell to the nearest one of a line; beyond every line if there is none.
pub fn distance(lines: &Array2<bool>) -> Array2<f64> {
    let (rows, cols) = lines.dim();
    let far = (rows + cols) as f64;
    // First along each column, then the best column for each row.
    let mut along = Array2::from_elem((rows, cols), far);
    for col in 0..cols {
        let mut last = far;
        for row in 0..rows {
            last = if lines[[row, col]] { 0.0 } else { last + 1.0 };
            along[[row, col]] = last;
        }
        last = far;
        for row in (0..rows).rev() {
            last = if lines[[row, col]] { 0.0 } else { last + 1.0 };
            along[[row, col]] = last.min(along[[row, col]]);
        }
    }
    Array2::from_shape_fn((rows, cols), |(row, col)| {
        let square = |other: usize| (other as f64 - col as f64).powi(2) + along[[row, other]].powi(2);
        (0..cols).map(square).fold(f64::INFINITY, f64::min).sqrt().min(far)
    })
}

/// The cells of a footprint that hold the highest `share` of its values.
pub fn highest(values: &Array2<f64>, footprint: &Array2<bool>, share: f64) -> Array2<bool> {
    let mut inside: Vec<f64> = values.iter().zip(footprint).filter(|(_, inside)| **inside).map(|(v, _)| *v).collect();
    let last = inside.len() - 1;
    let at = (((1.0 - share) * inside.len() as f64) as usize).min(last);
    let least = *inside.select_nth_unstable_by(at, f64::total_cmp).1;
    Array2::from_shape_fn(values.dim(), |at| footprint[at] && values[at] >= least)
}
