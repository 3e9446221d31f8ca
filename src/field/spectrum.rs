//! The two-dimensional real Fourier transform and its inverse under a filter.

use std::f64::consts::TAU;

use ndarray::Array2;
use rayon::prelude::*;
use realfft::RealFftPlanner;
use rustfft::{FftPlanner, num_complex::Complex64};

use super::padding::Padding;
use super::surroundings::Surroundings;
use crate::error::{Error, Result};

/// Rows that are transformed before they are turned into columns: few enough to stay in the cache.
const BAND: usize = 32;

/// Rows or columns that are turned together: a few lines of the cache.
const BLOCK: usize = 16;

/// One wave of the spectrum, radians per metre.
#[derive(Debug, Clone, Copy)]
pub(super) struct Wave {
    /// Toward east; zero at the highest wavenumber of the axis, where an odd filter has no real counterpart.
    pub east: f64,
    /// Toward north; zero at the highest wavenumber of the axis.
    pub north: f64,
    /// The length of the wavenumber, never cut.
    pub length: f64,
}

/// The spectrum of a padded layer. One row of `bins` holds one wavenumber toward east, for the waves that are not
/// negative there; its columns hold the wavenumbers along the rows of the layer.
///
/// Neither the padded layer nor a filtered copy of the spectrum is ever whole in memory unless [`Spectrum::filtered`] is
/// asked for: rows are padded, transformed and turned in bands, and a product is filtered wave by wave on its way back.
/// Each number is made by one thread in one order, so the bytes do not depend on the number of threads.
#[derive(Debug, Clone)]
pub(super) struct Spectrum {
    bins: Array2<Complex64>,
    /// (rows, columns) of the layer before padding.
    shape: (usize, usize),
    /// (rows, columns) after padding.
    padded: (usize, usize),
    /// (top, left) of the layer in the padded array.
    corner: (usize, usize),
    cell: f64,
}

impl Spectrum {
    /// Pads a layer without gaps and transforms it; `cell` in metres. The surroundings, made for the same shape, have been
    /// taken off the layer; their field is part of the spectrum.
    pub fn new(rest: &Array2<f64>, around: &Surroundings, cell: f64) -> Result<Self> {
        let padding = Padding::new(rest, around);
        let (down, across) = around.axes();
        let (rows, cols) = (down.padded, across.padded);
        let forward = RealFftPlanner::<f64>::new().plan_fft_forward(cols);
        let half = cols / 2 + 1;
        let mut bins = Array2::<Complex64>::zeros((half, rows));
        let columns = whole(&mut bins)?;
        let mut band = vec![Complex64::default(); BAND * half];
        for first in (0..rows).step_by(BAND) {
            let count = BAND.min(rows - first);
            band[..count * half]
                .par_chunks_mut(half)
                .enumerate()
                .try_for_each_init(
                    || (forward.make_input_vec(), forward.make_scratch_vec()),
                    |(row, scratch), (at, line)| {
                        padding.row(first + at, row);
                        forward.process_with_scratch(row, line, scratch)
                    },
                )
                .map_err(|error| Error::ours("the forward transform").because(error))?;
            columns.par_chunks_mut(BLOCK * rows).enumerate().for_each(|(block, columns)| {
                for (at, line) in band[..count * half].chunks_exact(half).enumerate() {
                    let line = &line[block * BLOCK..];
                    for (column, bin) in columns.chunks_exact_mut(rows).zip(line) {
                        column[first + at] = *bin;
                    }
                }
            });
        }
        let along = FftPlanner::<f64>::new().plan_fft_forward(rows);
        columns.par_chunks_mut(rows).for_each_init(
            || vec![Complex64::default(); along.get_inplace_scratch_len()],
            |scratch, column| along.process_with_scratch(column, scratch),
        );
        Ok(Self { bins, shape: rest.dim(), padded: (rows, cols), corner: (down.before, across.before), cell })
    }

    /// The spectrum with each bin multiplied by the filter's answer to its wave.
    pub fn filtered(&self, filter: impl Fn(Wave) -> Complex64 + Sync) -> Result<Self> {
        let mut bins = self.bins.clone();
        let norths = self.norths();
        whole(&mut bins)?
            .par_chunks_mut(self.padded.0)
            .enumerate()
            .for_each(|(col, column)| self.filter(col, &norths, column, &filter));
        Ok(Self { bins, ..*self })
    }

    /// For each bin of a column the wavenumber toward north, zero at the highest, and the square of it, never cut.
    fn norths(&self) -> Vec<(f64, f64)> {
        let rows = self.padded.0;
        let step = TAU / (rows as f64 * self.cell);
        (0..rows)
            .map(|row| {
                // Rows run south, so the wavenumber toward north is the negative of the one along the rows.
                let turns = if 2 * row > rows { row as f64 - rows as f64 } else { row as f64 };
                (if 2 * row == rows { 0.0 } else { -step * turns }, (step * turns).powi(2))
            })
            .collect()
    }

    /// Multiplies the bins of one wavenumber toward east by the filter.
    fn filter(&self, col: usize, norths: &[(f64, f64)], column: &mut [Complex64], filter: &impl Fn(Wave) -> Complex64) {
        let cols = self.padded.1;
        let across = TAU * col as f64 / (cols as f64 * self.cell);
        let east = if 2 * col == cols { 0.0 } else { across };
        for (bin, &(north, square)) in column.iter_mut().zip(norths) {
            *bin *= filter(Wave { east, north, length: (across * across + square).sqrt() });
        }
    }

    /// Tells the length of each wavenumber and the power that it carries, that of its twin in the half left out included.
    pub fn for_each_power(&self, mut tell: impl FnMut(f64, f64)) {
        let cols = self.padded.1;
        let norths = self.norths();
        for (col, column) in self.bins.rows().into_iter().enumerate() {
            let across = TAU * col as f64 / (cols as f64 * self.cell);
            let twins = if col == 0 || 2 * col == cols { 1.0 } else { 2.0 };
            for (bin, (_, square)) in column.iter().zip(&norths) {
                tell((across * across + square).sqrt(), twins * bin.norm_sqr());
            }
        }
    }

    /// Back to the layer, of which only the cells before padding are returned.
    pub fn layer(&self) -> Result<Array2<f64>> {
        self.layer_under(|_| Complex64::new(1.0, 0.0))
    }

    /// The layer of [`Spectrum::filtered`], without a copy of the spectrum.
    pub fn layer_under(&self, filter: impl Fn(Wave) -> Complex64 + Sync) -> Result<Array2<f64>> {
        let ((rows, cols), (padded_rows, padded_cols), (top, left)) = (self.shape, self.padded, self.corner);
        let half = padded_cols / 2 + 1;
        let bins = self.bins.as_slice().ok_or_else(out_of_order)?;
        let along = FftPlanner::<f64>::new().plan_fft_inverse(padded_rows);
        let norths = self.norths();
        // Of each wavenumber toward east the rows of the layer, one after the other.
        let mut inner = vec![Complex64::default(); half * rows];
        inner.par_chunks_mut(rows).zip(bins.par_chunks(padded_rows)).enumerate().for_each_init(
            || (vec![Complex64::default(); padded_rows], vec![Complex64::default(); along.get_inplace_scratch_len()]),
            |(column, scratch), (col, (kept, bins))| {
                column.copy_from_slice(bins);
                self.filter(col, &norths, column, &filter);
                along.process_with_scratch(column, scratch);
                kept.copy_from_slice(&column[top..top + rows]);
            },
        );
        let inverse = RealFftPlanner::<f64>::new().plan_fft_inverse(padded_cols);
        let scale = 1.0 / (padded_rows as f64 * padded_cols as f64);
        let mut values = Array2::zeros((rows, cols));
        whole(&mut values)?
            .par_chunks_mut(cols * BLOCK)
            .enumerate()
            .try_for_each_init(
                || (vec![Complex64::default(); BLOCK * half], inverse.make_output_vec(), inverse.make_scratch_vec()),
                |(lines, output, scratch), (block, values)| {
                    let first = block * BLOCK;
                    for (col, column) in inner.chunks_exact(rows).enumerate() {
                        for (line, bin) in lines.chunks_exact_mut(half).zip(&column[first..]) {
                            line[col] = *bin;
                        }
                    }
                    for (row, line) in values.chunks_exact_mut(cols).zip(lines.chunks_exact_mut(half)) {
                        // A real row has real first and last bins; what is there beside is rounding.
                        line[0].im = 0.0;
                        line[half - 1].im = 0.0;
                        inverse.process_with_scratch(line, output, scratch)?;
                        for (value, found) in row.iter_mut().zip(&output[left..]) {
                            *value = found * scale;
                        }
                    }
                    Ok::<(), realfft::FftError>(())
                },
            )
            .map_err(|error| Error::ours("the inverse transform").because(error))?;
        Ok(values)
    }
}

/// The cells of an array made in this file, as one slice.
fn whole<T>(array: &mut Array2<T>) -> Result<&mut [T]> {
    array.as_slice_mut().ok_or_else(out_of_order)
}

fn out_of_order() -> Error {
    Error::ours("a transform").wanted("an array in standard order")
}

#[cfg(test)]
mod tests {
    use super::super::sources::Sources;
    use super::*;

    fn spectrum(values: &Array2<f64>, cell: f64) -> Spectrum {
        Spectrum::new(values, &Surroundings::new(values.dim(), &Sources::none()), cell).unwrap()
    }

    #[test]
    fn there_and_back_changes_nothing() {
        let values = Array2::from_shape_fn((11, 14), |(row, col)| ((row * 31 + col * 17) % 13) as f64);
        let back = spectrum(&values, 10.0).layer().unwrap();
        for (a, b) in values.iter().zip(&back) {
            assert!((a - b).abs() < 1e-12);
        }
    }

    #[test]
    fn a_derivative_points_east_and_north() {
        // A Gaussian hill, whose derivative is known: d/dx exp(-r2/2s2) = -x/s2 exp(-r2/2s2).
        let hill = |x: f64, y: f64| (-(x * x + y * y) / 18.0).exp();
        let place = |row: usize, col: usize| (col as f64 - 24.0, 20.0 - row as f64);
        let values = Array2::from_shape_fn((41, 49), |(row, col)| {
            let (x, y) = place(row, col);
            hill(x, y)
        });
        let spectrum = spectrum(&values, 1.0);
        let east = spectrum.filtered(|wave| Complex64::new(0.0, wave.east)).unwrap().layer().unwrap();
        let north = spectrum.filtered(|wave| Complex64::new(0.0, wave.north)).unwrap().layer().unwrap();
        for ((row, col), value) in values.indexed_iter() {
            let (x, y) = place(row, col);
            assert!((east[[row, col]] + x / 9.0 * value).abs() < 1e-5);
            assert!((north[[row, col]] + y / 9.0 * value).abs() < 1e-5);
        }
    }

    #[test]
    fn the_bins_are_those_of_scipy() {
        // Source: tests/reference/make_spectrum_reference.py, scipy.fft.rfft2.
        let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/fields/spectrum_reference.json");
        let text = std::fs::read_to_string(path).unwrap();
        let numbers = |name: &str| -> Vec<f64> {
            let list = text.split_once(&format!("\"{name}\": [")).unwrap().1.split_once(']').unwrap().0;
            list.split(',').map(|number| number.trim().parse().unwrap()).collect()
        };
        let (real, imaginary) = (numbers("real"), numbers("imaginary"));
        assert_eq!((real.len(), imaginary.len()), (20 * 13, 20 * 13));
        let values = Array2::from_shape_fn((10, 12), |(row, col)| ((row * 31 + col * 17) % 13) as f64);
        let found = spectrum(&values, 10.0);
        let largest = found.bins.iter().map(|bin| bin.norm()).fold(0.0, f64::max);
        for ((col, row), bin) in found.bins.indexed_iter() {
            let at = row * 13 + col;
            assert!((bin - Complex64::new(real[at], imaginary[at])).norm() < 1e-12 * largest, "{row} {col}");
        }
    }

    #[test]
    fn the_number_of_threads_changes_no_byte() {
        let values = Array2::from_shape_fn((61, 75), |(row, col)| ((row * 31 + col * 17) % 13) as f64);
        let with = |threads| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            pool.install(|| spectrum(&values, 10.0).layer_under(|wave| Complex64::new(wave.length, wave.east)).unwrap())
        };
        assert_eq!(with(1), with(3));
    }

    #[test]
    fn a_product_needs_no_copy_of_the_spectrum() {
        let values = Array2::from_shape_fn((23, 30), |(row, col)| ((row * 31 + col * 17) % 13) as f64);
        let found = spectrum(&values, 10.0);
        let filter = |wave: Wave| Complex64::new((-9.0 * wave.length).exp(), wave.north);
        assert_eq!(found.filtered(filter).unwrap().layer().unwrap(), found.layer_under(filter).unwrap());
    }
}
