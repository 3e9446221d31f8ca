//! The noise of a gradient near the edge of the frame, measured through the padding.

use ndarray::{Array2, ArrayView2, s};
use rustfft::num_complex::Complex64;

use super::chance::gaussian;
use super::gradient_noise::GradientNoise;
use super::prepare::PreparedField;
use crate::error::Result;
use crate::grid::{Frame, Grid};

/// Layers of noise that are transformed.
const DRAWS: u64 = 6;

/// The noise is measured on a frame of at most this many cells on a side.
const LARGEST: usize = 256;

/// Layers of unit noise made into the product that contacts are picked on, to measure how noise grows toward the edges of
/// a frame, which a formula for the whole plane does not know.
///
/// Padding makes up the ground outside from the cells at the edge, so their noise runs on outward in stripes. In
/// derivatives of the field itself that matters only within about two cells plus the height, where no line starts. In
/// pseudo-gravity, which favours long waves, it reaches far inward: use this wherever contacts are picked on it.
#[derive(Debug, Clone)]
pub struct EdgeNoise {
    layers: Vec<PreparedField>,
    shape: (usize, usize),
}

impl EdgeNoise {
    /// Prepares and transforms six layers of noise on a frame of this shape, at most 256 cells on a side. The seed is fixed.
    ///
    /// `product` is what the gradient is taken of, such as `|field| field.to_pseudo_gravity(directions, ratio)`.
    ///
    /// # Errors
    /// As [`PreparedField::new`], and those of `product`.
    pub fn new(frame: &Frame, product: impl Fn(&PreparedField) -> Result<PreparedField>) -> Result<Self> {
        let frame = Frame::local(frame.cell, frame.rows.min(LARGEST), frame.cols.min(LARGEST))?;
        let layer = |seed| product(&PreparedField::new(&Grid::new(frame.clone(), gaussian(frame.shape(), seed))?)?);
        Ok(Self { layers: (0..DRAWS).map(layer).collect::<Result<_>>()?, shape: frame.shape() })
    }
}

impl GradientNoise {
    /// With the growth of the noise toward the edges, measured at the height of this noise.
    ///
    /// At each distance from each edge the larger variance of a component is taken over the middle third of the edge, and
    /// never less than farther inside. In a cell the excesses near the four edges are added, what they share in the middle
    /// once.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn near_edges(mut self, edges: &EdgeNoise) -> Result<Self> {
        if self.sigma == 0.0 {
            return Ok(self);
        }
        let height = self.height();
        let fade = |length: f64| (-length * height).exp();
        let mut squares = [Array2::<f64>::zeros(edges.shape), Array2::zeros(edges.shape)];
        for layer in &edges.layers {
            let east = layer.product(|wave| Complex64::new(0.0, wave.east * fade(wave.length)))?;
            let north = layer.product(|wave| Complex64::new(0.0, wave.north * fade(wave.length)))?;
            for (square, part) in squares.iter_mut().zip([east, north]) {
                square.zip_mut_with(&part, |sum, value| *sum += value * value);
            }
        }
        let of_one = DRAWS as f64 * (self.component() / self.sigma).powi(2);
        let [east, north] = &squares;
        let mut edges =
            [[east.view(), north.view()], [east.view(), north.view()], [east.t(), north.t()], [east.t(), north.t()]];
        // The southern and the eastern edge, seen as the first row.
        for edge in [1, 3] {
            for part in &mut edges[edge] {
                part.invert_axis(ndarray::Axis(0));
            }
        }
        self.excess = edges.map(|parts| {
            let mut most = 0.0_f64;
            let mut inward: Vec<f64> = (0..parts[0].nrows().div_ceil(2))
                .rev()
                .map(|row| {
                    most = parts.iter().map(|part| along(*part, row) / of_one - 1.0).fold(most, f64::max);
                    most
                })
                .collect();
            inward.reverse();
            inward
        });
        Ok(self)
    }
}

/// The mean over the middle third of a row.
fn along(values: ArrayView2<f64>, row: usize) -> f64 {
    let cols = values.ncols();
    let middle = cols / 3..cols - cols / 3;
    values.slice(s![row, middle.clone()]).sum() / middle.len() as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::{Direction, MagneticDirections};

    #[test]
    fn pseudo_gravity_is_noisier_toward_the_edge() {
        // Source: Monte Carlo with other layers of noise, the middle of one edge and the middle of the frame.
        let frame = Frame::local(100.0, 96, 96).unwrap();
        let inducing = MagneticDirections::induced(Direction::new(60.0, 10.0).unwrap());
        let product = |field: &PreparedField| field.to_pseudo_gravity(inducing, 1.0);
        let plain = GradientNoise::of_pseudo_gravity(0.5, 100.0, 300.0, inducing, 1.0).unwrap();
        let noise = plain.clone().near_edges(&EdgeNoise::new(&frame, product).unwrap()).unwrap();
        let mut squares = [[0.0; 2]; 2];
        for seed in 100..140 {
            let layer = Grid::new(frame.clone(), gaussian((96, 96), seed) * 0.5).unwrap();
            let gradient = product(&PreparedField::new(&layer).unwrap()).unwrap().gradient(300.0).unwrap();
            for (pair, row) in squares.iter_mut().zip([87, 47]) {
                for (square, part) in pair.iter_mut().zip([gradient.east(), gradient.north()]) {
                    *square += part.slice(s![row, 32..64]).mapv(|value| value * value).mean().unwrap() / 40.0;
                }
            }
        }
        for ([east, north], row) in squares.into_iter().zip([87, 47]) {
            let ratio = noise.growth((96, 96), (row, 47)) * noise.component() / east.max(north).sqrt();
            println!("row {row}: stated over measured {ratio:.3}, {:.3}", (east / north).sqrt());
            // Stated for the noisier direction, with the excess of two edges.
            assert!((0.85..1.3).contains(&ratio), "{ratio}");
        }
        assert!(noise.growth((96, 96), (87, 47)) > 2.0 && plain.growth((96, 96), (8, 47)) == 1.0);
        let silent = GradientNoise::of_field(0.0, 100.0, 0.0).unwrap();
        assert_eq!(
            silent.clone().near_edges(&EdgeNoise::new(&frame, |field| Ok(field.clone())).unwrap()).unwrap(),
            silent
        );
    }
}
