//! The two-dimensional real Fourier transform and its inverse under a filter.

use std::f64::consts::TAU;

use ndarray::{Array2, s};
use rayon::prelude::*;
use realfft::RealFftPlanner;
use rustfft::{Fft, FftPlanner, num_complex::Complex64};

use super::padding::padded;
use crate::error::{Error, Result};

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
    /// Pads a layer without gaps and transforms it; `cell` in metres.
    pub fn new(values: &Array2<f64>, cell: f64) -> Result<Self> {
        let layer = padded(values);
        let (rows, cols) = layer.values.dim();
        let forward = RealFftPlanner::<f64>::new().plan_fft_forward(cols);
        let half = cols / 2 + 1;
        let mut lines = Array2::<Complex64>::zeros((rows, half));
        let mut input = layer.values;
        whole(&mut lines)?
            .par_chunks_mut(half)
            .zip(whole(&mut input)?.par_chunks_mut(cols))
            .try_for_each(|(line, row)| forward.process(row, line))
            .map_err(|error| Error::ours("the forward transform").because(error))?;
        let mut bins = Array2::zeros((half, rows));
        bins.assign(&lines.t());
        let along = FftPlanner::<f64>::new().plan_fft_forward(rows);
        transform_rows(&mut bins, &*along)?;
        Ok(Self { bins, shape: values.dim(), padded: (rows, cols), corner: (layer.top, layer.left), cell })
    }

    /// The spectrum with each bin multiplied by the filter's answer to its wave.
    pub fn filtered(&self, filter: impl Fn(Wave) -> Complex64 + Sync) -> Result<Self> {
        let (rows, cols) = self.padded;
        let mut bins = self.bins.clone();
        whole(&mut bins)?.par_chunks_mut(rows).enumerate().for_each(|(col, line)| {
            let east = TAU * col as f64 / (cols as f64 * self.cell);
            for (row, bin) in line.iter_mut().enumerate() {
                // Rows run south, so the wavenumber toward north is the negative of the one along the rows.
                let turns = if 2 * row > rows { row as f64 - rows as f64 } else { row as f64 };
                let north = -TAU * turns / (rows as f64 * self.cell);
                *bin *= filter(Wave {
                    east: if 2 * col == cols { 0.0 } else { east },
                    north: if 2 * row == rows { 0.0 } else { north },
                    length: east.hypot(north),
                });
            }
        });
        Ok(Self { bins, ..*self })
    }

    /// Back to the layer, of which only the cells before padding are returned.
    pub fn layer(self) -> Result<Array2<f64>> {
        let Self { mut bins, shape: (rows, cols), padded: (padded_rows, padded_cols), corner: (top, left), .. } = self;
        let half = padded_cols / 2 + 1;
        transform_rows(&mut bins, &*FftPlanner::<f64>::new().plan_fft_inverse(padded_rows))?;
        let mut lines = Array2::zeros((rows, half));
        lines.assign(&bins.slice(s![.., top..top + rows]).t());
        let inverse = RealFftPlanner::<f64>::new().plan_fft_inverse(padded_cols);
        let scale = 1.0 / (padded_rows as f64 * padded_cols as f64);
        let mut values = Array2::zeros((rows, cols));
        whole(&mut values)?
            .par_chunks_mut(cols)
            .zip(whole(&mut lines)?.par_chunks_mut(half))
            .try_for_each(|(row, line)| {
                // A real row has real first and last bins; what is there beside is rounding.
                line[0].im = 0.0;
                line[half - 1].im = 0.0;
                let mut output = inverse.make_output_vec();
                inverse.process(line, &mut output)?;
                for (value, found) in row.iter_mut().zip(&output[left..]) {
                    *value = found * scale;
                }
                Ok::<(), realfft::FftError>(())
            })
            .map_err(|error| Error::ours("the inverse transform").because(error))?;
        Ok(values)
    }
}

/// Transforms each row in place, rows in parallel.
fn transform_rows(bins: &mut Array2<Complex64>, along: &dyn Fft<f64>) -> Result<()> {
    let length = along.len();
    whole(bins)?.par_chunks_mut(length).for_each_init(
        || vec![Complex64::default(); along.get_inplace_scratch_len()],
        |scratch, row| along.process_with_scratch(row, scratch),
    );
    Ok(())
}

/// The cells of an array made in this file, as one slice.
fn whole<T>(array: &mut Array2<T>) -> Result<&mut [T]> {
    array.as_slice_mut().ok_or_else(|| Error::ours("a transform").wanted("an array in standard order"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn there_and_back_changes_nothing() {
        let values = Array2::from_shape_fn((11, 14), |(row, col)| ((row * 31 + col * 17) % 13) as f64);
        let back = Spectrum::new(&values, 10.0).unwrap().layer().unwrap();
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
        let spectrum = Spectrum::new(&values, 1.0).unwrap();
        let east = spectrum.filtered(|wave| Complex64::new(0.0, wave.east)).unwrap().layer().unwrap();
        let north = spectrum.filtered(|wave| Complex64::new(0.0, wave.north)).unwrap().layer().unwrap();
        for ((row, col), value) in values.indexed_iter() {
            let (x, y) = place(row, col);
            assert!((east[[row, col]] + x / 9.0 * value).abs() < 1e-5);
            assert!((north[[row, col]] + y / 9.0 * value).abs() < 1e-5);
        }
    }
}
