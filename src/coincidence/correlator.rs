//! Sums of products of two layers at every shift at once, by fast Fourier transform.

use std::sync::Arc;

use ndarray::{Array2, Zip};
use rayon::prelude::*;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use rustfft::num_complex::Complex64;
use rustfft::{Fft, FftPlanner};

use super::shift::Reach;

/// How many rows or columns are transposed at a time: eight complex numbers fill two cache lines.
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
        let (up, left) = (self.reach.rows, self.reach.cols);
        let wanted = 2 * up + 1;
        // Half spectra of the wanted rows only: a few columns are transformed at a time and stay in the cache.
        let mut lines = vec![Complex64::default(); wanted * half];
        let mut block = vec![Complex64::default(); BLOCK * length];
        let mut scratch = vec![Complex64::default(); self.column_inverse.get_inplace_scratch_len()];
        for first in (0..half).step_by(BLOCK) {
            let count = BLOCK.min(half - first);
            let part = first * length..(first + count) * length;
            let block = &mut block[..count * length];
            for ((product, a), b) in block.iter_mut().zip(&moved.0[part.clone()]).zip(&fixed.0[part]) {
                *product = a.conj() * b;
            }
            self.column_inverse.process_with_scratch(block, &mut scratch);
            for (row, line) in lines.chunks_exact_mut(half).enumerate() {
                // Row `up` of the result is the shift of zero; negative shifts sit at the end of the padded column.
                let source = (row + length - up) % length;
                for (to, column) in line[first..first + count].iter_mut().zip(block.chunks_exact(length)) {
                    *to = column[source];
                }
            }
        }
        let scale = 1.0 / (self.padded_rows * self.padded_cols) as f64;
        let mut sums = Array2::zeros(self.reach.shape());
        let mut row = self.row_inverse.make_output_vec();
        let mut scratch = self.row_inverse.make_scratch_vec();
        for (line, mut sums) in lines.chunks_exact_mut(half).zip(sums.rows_mut()) {
            // These two are real but for rounding, and the transform insists on it.
            line[0].im = 0.0;
            line[half - 1].im = 0.0;
            let done = self.row_inverse.process_with_scratch(line, &mut row, &mut scratch);
            debug_assert!(done.is_ok());
            let (forward, backward) = (&row[..=left], &row[self.padded_cols - left..]);
            sums.iter_mut().zip(backward.iter().chain(forward)).for_each(|(to, sum)| *to = sum * scale);
        }
        sums
    }

    /// As [`Correlator::sums`] for two masks: counts of cells, which are whole numbers, so rounding is taken off.
    pub fn counts(&self, moved: &Spectrum, fixed: &Spectrum) -> Array2<f64> {
        let mut counts = self.sums(moved, fixed);
        counts.mapv_inplace(|count| count.round() + 0.0);
        counts
    }

    /// Transforms masks that stay in place, two to a spectrum where rounding allows it; see [`Correlator::counts_of`].
    ///
    /// `inside(mask, row, col)` says whether a cell belongs to the mask of that number.
    pub fn masks(&self, count: usize, inside: impl Fn(usize, usize, usize) -> bool + Sync) -> Masks {
        self.masks_by(pairing_base(self.rows * self.cols), count, inside)
    }

    fn masks_by(&self, base: Option<f64>, count: usize, inside: impl Fn(usize, usize, usize) -> bool + Sync) -> Masks {
        let cell = |mask, row, col| f64::from(u8::from(inside(mask, row, col)));
        let step = if base.is_some() { 2 } else { 1 };
        let firsts: Vec<usize> = (0..count).step_by(step).collect();
        let spectra = firsts.into_par_iter().map(|first| match base {
            Some(base) if first + 1 < count => {
                self.spectrum(|row, col| cell(first, row, col) + base * cell(first + 1, row, col))
            }
            _ => self.spectrum(|row, col| cell(first, row, col)),
        });
        Masks { spectra: spectra.collect(), count, base }
    }

    /// Counts of cells, as [`Correlator::counts`], of one mask that is moved against each of several that stay.
    ///
    /// Two masks A and B travel in one spectrum as A + base B, base being a power of two above any count: the sum is a
    /// whole number whose lower digits count A and whose upper digits count B, which halves the transforms.
    pub fn counts_of(&self, moved: &Spectrum, masks: &Masks) -> Vec<Array2<f64>> {
        let pairs: Vec<Vec<Array2<f64>>> = masks
            .spectra
            .par_iter()
            .enumerate()
            .map(|(number, spectrum)| {
                let mut lower = self.counts(moved, spectrum);
                match masks.base {
                    Some(base) if 2 * number + 1 < masks.count => {
                        let mut upper = Array2::zeros(lower.dim());
                        Zip::from(&mut lower).and(&mut upper).for_each(|lower, upper| {
                            *upper = (*lower / base).floor();
                            *lower -= *upper * base;
                        });
                        vec![lower, upper]
                    }
                    _ => vec![lower],
                }
            })
            .collect();
        pairs.into_iter().flatten().collect()
    }
}

/// Several masks that stay in place, transformed.
pub struct Masks {
    spectra: Vec<Spectrum>,
    count: usize,
    /// The factor of the second mask of each spectrum; `None` where each mask has a spectrum of its own.
    base: Option<f64>,
}

/// The factor by which two counts of up to `cells` are held apart in one double, or `None` where rounding forbids it.
///
/// The sums reach cells x base, and a transform of N numbers errs by about log2 N rounding units of that; a tenth of a
/// cell is allowed. At 512 x 512 cells the estimate is 0.0006; it is exceeded from 2,048 x 2,048 on.
fn pairing_base(cells: usize) -> Option<f64> {
    let base = (cells + 1).next_power_of_two() as f64;
    let error = f64::EPSILON * base * cells as f64 * (4.0 * cells as f64).log2();
    (error < 0.1).then_some(base)
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
            for prime in [2usize, 3, 5] {
                while n.is_multiple_of(prime) {
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
    fn pairs_of_masks_are_told_apart_exactly() {
        // Expected: two full rectangles share (rows - |dr|) (cols - |dc|) cells; the second mask is the left half.
        for (base, side, reach) in
            [(pairing_base(400 * 400), 400, 100), (pairing_base(40 * 40), 40, 10), (None, 40, 10)]
        {
            let engine = Correlator::new((side, side), Reach { rows: reach, cols: reach });
            let moved = engine.spectrum(|_, _| 1.0);
            let masks = engine.masks_by(base, 3, |mask, _, col| [true, col < side / 2, col == 0][mask]);
            let counts = engine.counts_of(&moved, &masks);
            assert_eq!(counts.len(), 3);
            for ((row, col), all) in counts[0].indexed_iter() {
                let (down, right) = (row.abs_diff(reach) as f64, col as f64 - reach as f64);
                let (rows, side) = (side as f64 - down, side as f64);
                // Columns c of the mask for which c - right is a column.
                let columns = |end: f64| (end.min(side + right) - right.max(0.0)).max(0.0);
                assert_eq!(*all, rows * columns(side));
                assert_eq!(counts[1][[row, col]], rows * columns(side / 2.0));
                assert_eq!(counts[2][[row, col]], rows * columns(1.0));
            }
        }
        assert!(pairing_base(512 * 512).is_some() && pairing_base(4096 * 4096).is_none());
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
