//! The fine raster in EPSG:32633 on which the model is drawn before it is sampled into files.

use crate::bodies::{CORNER, SIZE};
use ndarray::{Array2, ArrayView2, s};

/// Side of a cell, m.
const CELL: f64 = 200.0;
/// How far the canvas reaches beyond the survey area, so that no edge of it shows in the files, m.
pub const RIM: f64 = 8_000.0;

/// Values at cell centres; rows run north to south.
#[derive(Debug, Clone)]
pub struct Canvas {
    /// The values, (row, col).
    pub values: Array2<f64>,
}

impl Canvas {
    /// A canvas of one value.
    pub fn filled(value: f64) -> Self {
        let [cols, rows] = SIZE.map(|side| ((side + 2.0 * RIM) / CELL).round() as usize);
        Self { values: Array2::from_elem((rows, cols), value) }
    }

    /// Column and row, in cells and fractions, of a place (easting, northing).
    fn position(&self, [east, north]: [f64; 2]) -> [f64; 2] {
        [(east - CORNER[0] + RIM) / CELL - 0.5, (CORNER[1] + SIZE[1] + RIM - north) / CELL - 0.5]
    }

    /// The value at a place by bilinear interpolation; the nearest cell's beyond the edge.
    pub fn at(&self, place: [f64; 2]) -> f64 {
        let [col, row] = self.position(place);
        let (rows, cols) = self.values.dim();
        let (row, col) = (row.clamp(0.0, rows as f64 - 1.001), col.clamp(0.0, cols as f64 - 1.001));
        let (i, j) = (row as usize, col as usize);
        let (down, right) = (row - i as f64, col - j as f64);
        let cells = &self.values;
        (1.0 - down) * ((1.0 - right) * cells[[i, j]] + right * cells[[i, j + 1]])
            + down * ((1.0 - right) * cells[[i + 1, j]] + right * cells[[i + 1, j + 1]])
    }

    /// A canvas made cell by cell from this one, in reading order.
    pub fn map(&self, mut make: impl FnMut(f64) -> f64) -> Self {
        Self { values: self.values.map(|value| make(*value)) }
    }

    /// The part that lies in the survey area, without the rim.
    pub fn inside(&self) -> ArrayView2<'_, f64> {
        let rim = (RIM / CELL).round() as isize;
        self.values.slice(s![rim..-rim, rim..-rim])
    }

    /// Lowers every cell in a disc (centre, radius in m) to at most `value`.
    pub fn lower_disc(&mut self, centre: [f64; 2], radius: f64, value: f64) {
        let [col, row] = self.position(centre);
        let reach = radius / CELL;
        let (rows, cols) = self.values.dim();
        let span = |middle: f64, count: usize| {
            let first = (middle - reach).ceil().max(0.0) as usize;
            first..((middle + reach).floor() + 1.0).clamp(first as f64, count.max(first) as f64) as usize
        };
        for i in span(row, rows) {
            for j in span(col, cols) {
                if (i as f64 - row).hypot(j as f64 - col) <= reach {
                    let cell = &mut self.values[[i, j]];
                    *cell = cell.min(value);
                }
            }
        }
    }

    /// Convolution with a Gaussian of `sigma` metres; the edge is mirrored.
    pub fn smoothed(&self, sigma: f64) -> Self {
        let reach = (4.0 * sigma / CELL).ceil() as usize;
        let weight = |k: usize| (-0.5 * ((k as f64 - reach as f64) * CELL / sigma).powi(2)).exp();
        let weights: Vec<f64> = (0..=2 * reach).map(weight).collect();
        let total: f64 = weights.iter().sum();
        let pass = |from: &Array2<f64>| {
            let (rows, cols) = from.dim();
            // Written transposed, so that two passes smooth both directions and turn the raster back.
            let mut turned = Array2::zeros((cols, rows));
            for (i, row) in from.rows().into_iter().enumerate() {
                let column = |k: usize| mirrored(k as isize - reach as isize, cols as isize);
                let padded: Vec<f64> = (0..cols + 2 * reach).map(|k| row[column(k)]).collect();
                for (j, window) in padded.windows(weights.len()).enumerate() {
                    turned[[j, i]] =
                        window.iter().zip(&weights).map(|(value, weight)| value * weight).sum::<f64>() / total;
                }
            }
            turned
        };
        Self { values: pass(&pass(&self.values)) }
    }
}

/// An index beyond the edge, reflected back inside.
fn mirrored(index: isize, count: isize) -> usize {
    let folded = index.rem_euclid(2 * count);
    folded.min(2 * count - 1 - folded) as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A unit disc keeps its volume under the smoothing, and its second moment grows by sigma squared in each direction
    /// (a property of the Gaussian).
    #[test]
    fn smoothing_keeps_volume_and_adds_variance() {
        let middle = [CORNER[0] + SIZE[0] / 2.0, CORNER[1] + SIZE[1] / 2.0];
        let mut spot = Canvas::filled(0.0);
        spot.lower_disc(middle, 150.0, -1.0);
        let wide = spot.smoothed(1000.0);
        let moment = |canvas: &Canvas| -> (f64, f64) {
            let sum = canvas.values.sum();
            let centre = spot.position(middle)[0];
            let second: f64 =
                canvas.values.indexed_iter().map(|((_, j), v)| v * ((j as f64 - centre) * CELL).powi(2)).sum();
            (sum, second / sum)
        };
        let ((before, narrow), (after, broad)) = (moment(&spot), moment(&wide));
        assert!((before - after).abs() < 1e-9 && before < 0.0);
        assert!((broad - narrow - 1.0e6).abs() < 0.01e6, "{narrow} {broad}");
    }

    #[test]
    fn a_disc_is_found_where_it_was_put() {
        let mut canvas = Canvas::filled(2.0);
        let place = [CORNER[0] + 10_000.0, CORNER[1] + 5_000.0];
        canvas.lower_disc(place, 900.0, 1.0);
        assert_eq!(canvas.at(place), 1.0);
        assert_eq!(canvas.at([place[0] + 1300.0, place[1]]), 2.0);
        assert_eq!(canvas.at([place[0], place[1] - 1300.0]), 2.0);
    }
}
