//! Sums of products of two layers at every shift at once, by fast Fourier transform.

use std::sync::Arc;

use ndarray::Array2;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use rustfft::num_complex::Complex64;
use rustfft::{Fft, FftPlanner};

use super::shift::Reach;

/// How many rows are transposed at a time: eight complex numbers fill two cache lines.
const BLOCK: usize = 8;

/// Computes `sum over x of A(x) B(x + s)` for every shift `s` within a reach, without wrapping.
///
/// Both layers are padded by the reach, not by their own size: a product that wraps around lands on padding for every
/// shift that is kept. The layers are real, so half of each spectrum is stored and transformed; of the inverse only
/// the rows of shifts that are kept are computed.
pub struct Correlator {
    rows: usize,
    cols: usize,
    reach: Reach,
    padded_rows: usize,
    padded_cols: usize,
    row_forward: Arc<dyn RealToComplex<f64>>,
    row_inverse: Arc<dyn ComplexToReal<f64>>,
    column_forward: Arc<dyn Fft<f64>>,
    column_inverse: Arc<dyn Fft<f64>>,
}

/// The spectrum of one padded layer, held column by column so that the long transforms run over contiguous memory.
pub struct Spectrum(Vec<Complex64>);

impl Correlator {
    /// Plans the transforms for layers of `shape` (rows, columns) and shifts up to `reach`.
    pub fn new(shape: (usize, usize), reach: Reach) -> Self {
        let padded_rows = smooth_length(shape.0 + reach.rows);
        // An even length keeps the real transform at half the cost of a complex one.
        let padded_cols = 2 * smooth_length((shape.1 + reach.cols).div_ceil(2));
        let mut real = RealFftPlanner::new();
        let mut complex = FftPlanner::new();
        Self {
            rows: shape.0,
            cols: shape.1,
            reach,
            padded_rows,
            padded_cols,
            row_forward: real.plan_fft_forward(padded_cols),
            row_inverse: real.plan_fft_inverse(padded_cols),
            column_forward: complex.plan_fft_forward(padded_rows),
            column_inverse: complex.plan_fft_inverse(padded_rows),
        }
    }

    /// The shifts that are computed.
    pub fn reach(&self) -> Reach {
        self.reach
    }

    fn half(&self) -> usize {
        self.padded_cols / 2 + 1
    }

    /// The spectrum of a layer; `value` gives the number in each cell and must be finite (0 outside a footprint).
    pub fn spectrum(&self, value: impl Fn(usize, usize) -> f64) -> Spectrum {
        let (half, length) = (self.half(), self.padded_rows);
        let mut columns = vec![Complex64::default(); half * length];
        let mut row = self.row_forward.make_input_vec();
        let mut block = vec![Complex64::default(); BLOCK * half];
        let mut scratch = self.row_forward.make_scratch_vec();
        for first in (0..self.rows).step_by(BLOCK) {
            let count = BLOCK.min(self.rows - first);
            for (offset, line) in block.chunks_exact_mut(half).take(count).enumerate() {
                row[self.cols..].fill(0.0);
                for (col, cell) in row[..self.cols].iter_mut().enumerate() {
                    *cell = value(first + offset, col);
                }
                // The lengths are the planner's own, so the transform cannot fail.
                let done = self.row_forward.process_with_scratch(&mut row, line, &mut scratch);
                debug_assert!(done.is_ok());
            }
            for (k, column) in columns.chunks_exact_mut(length).enumerate() {
                for offset in 0..count {
                    column[first + offset] = block[offset * half + k];
                }
            }
        }
        let mut scratch = vec![Complex64::default(); self.column_forward.get_inplace_scratch_len()];
        for column in columns.chunks_exact_mut(length) {
            self.column_forward.process_with_scratch(column, &mut scratch);
        }
        Spectrum(columns)
    }

    /// `sum over x of A(x) B(x + s)` for every shift within the reach, as an array whose centre is the shift of zero.
    pub fn sums(&self, moved: &Spectrum, fixed: &Spectrum) -> Array2<f64> {
        let (half, length) = (self.half(), self.padded_rows);
        let mut columns = vec![Complex64::default(); half * length];
        let mut scratch = vec![Complex64::default(); self.column_inverse.get_inplace_scratch_len()];
        let pairs = moved.0.chunks_exact(length).zip(fixed.0.chunks_exact(length));
        for (column, (a, b)) in columns.chunks_exact_mut(length).zip(pairs) {
            for ((product, a), b) in column.iter_mut().zip(a).zip(b) {
                *product = a.conj() * b;
            }
            self.column_inverse.process_with_scratch(column, &mut scratch);
        }
        let (up, left) = (self.reach.rows, self.reach.cols);
        let scale = 1.0 / (self.padded_rows * self.padded_cols) as f64;
        let mut sums = Array2::zeros(self.reach.shape());
        let mut block = vec![Complex64::default(); BLOCK * half];
        let mut row = self.row_inverse.make_output_vec();
        let mut scratch = self.row_inverse.make_scratch_vec();
        let wanted = 2 * up + 1;
        for first in (0..wanted).step_by(BLOCK) {
            let count = BLOCK.min(wanted - first);
            for (k, column) in columns.chunks_exact(length).enumerate() {
                for offset in 0..count {
                    // Row `up` of the result is the shift of zero; negative shifts sit at the end of the padded column.
                    block[offset * half + k] = column[(first + offset + length - up) % length];
                }
            }
            for (offset, line) in block.chunks_exact_mut(half).take(count).enumerate() {
                // These two are real but for rounding, and the transform insists on it.
                line[0].im = 0.0;
                line[half - 1].im = 0.0;
                let done = self.row_inverse.process_with_scratch(line, &mut row, &mut scratch);
                debug_assert!(done.is_ok());
                for (col, sum) in sums.row_mut(first + offset).iter_mut().enumerate() {
                    *sum = row[(col + self.padded_cols - left) % self.padded_cols] * scale;
                }
            }
        }
        sums
    }

    /// As [`Correlator::sums`] for two masks: counts of cells, which are whole numbers, so rounding is taken off.
    pub fn counts(&self, moved: &Spectrum, fixed: &Spectrum) -> Array2<f64> {
        let mut counts = self.sums(moved, fixed);
        counts.mapv_inplace(|count| count.round() + 0.0);
        counts
    }
}

/// The least length of at least `least` whose only prime factors are 2, 3 and 5, for which the transforms are fast.
fn smooth_length(least: usize) -> usize {
    let least = least.max(1);
    let mut best = least.next_power_of_two();
    let mut fives = 1;
    while fives < best {
        let mut threes = fives;
        while threes < best {
            let twos = least.div_ceil(threes).next_power_of_two();
            best = best.min(twos * threes);
            threes *= 3;
        }
        fives *= 5;
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn smooth_lengths_are_the_least_of_their_kind() {
        let smooth = |mut n: usize| {
            for prime in [2, 3, 5] {
                while n % prime == 0 {
                    n /= prime;
                }
            }
            n == 1
        };
        for least in 1..700 {
            let found = smooth_length(least);
            assert!(smooth(found) && found >= least, "{least}: {found}");
            assert!((least..found).all(|n| !smooth(n)), "{least}: {found} is not the least");
        }
    }

    #[test]
    fn equals_the_defining_sum_at_every_shift() {
        // Expected: the definition, summed cell by cell.
        for (rows, cols, up, left) in [(9, 13, 4, 6), (16, 8, 3, 0), (1, 7, 0, 5), (20, 20, 19, 19)] {
            let a = Array2::from_shape_fn((rows, cols), |(i, j)| ((i * 7 + j * 3) % 11) as f64 - 4.0);
            let b = Array2::from_shape_fn((rows, cols), |(i, j)| ((i * 5 + j * j) % 13) as f64 / 3.0);
            let correlator = Correlator::new((rows, cols), Reach { rows: up, cols: left });
            let sums = correlator.sums(&correlator.spectrum(|i, j| a[[i, j]]), &correlator.spectrum(|i, j| b[[i, j]]));
            for ((row, col), sum) in sums.indexed_iter() {
                let (dr, dc) = (row as isize - up as isize, col as isize - left as isize);
                let mut expected = 0.0;
                for ((i, j), value) in a.indexed_iter() {
                    let (y, x) = (i as isize + dr, j as isize + dc);
                    if y >= 0 && x >= 0 && y < rows as isize && x < cols as isize {
                        expected += value * b[[y as usize, x as usize]];
                    }
                }
                assert!((sum - expected).abs() < 1e-9, "shift {dr}, {dc}: {sum} against {expected}");
            }
        }
    }
}
