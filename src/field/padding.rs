//! Padding of a layer for the transform.

use std::f64::consts::PI;

use ndarray::Array2;

use super::surroundings::Surroundings;

/// Share of the side that is added on each side at least.
const SHARE: f64 = 0.5;

/// The padded length of one axis: even, with no prime factor above 7.
fn padded_length(length: usize) -> usize {
    let least = length + 2 * (length as f64 * SHARE).ceil() as usize;
    let smooth = |mut number: usize| {
        for factor in [2, 3, 5, 7] {
            while number.is_multiple_of(factor) {
                number /= factor;
            }
        }
        number == 1
    };
    let mut padded = least + least % 2;
    while !smooth(padded) {
        padded += 2;
    }
    padded
}

/// One axis of a padded layer, cells.
#[derive(Debug, Clone, Copy)]
pub(super) struct Axis {
    /// Cells of the layer.
    pub length: usize,
    /// Cells added before the layer.
    pub before: usize,
    /// Cells after padding.
    pub padded: usize,
}

impl Axis {
    /// Half as long again on each side, or a little more.
    pub fn new(length: usize) -> Self {
        let padded = padded_length(length);
        Self { length, before: (padded - length) / 2, padded }
    }

    /// The weight of what is carried on beyond the edge, for each padded place: 1 inside, falling to nearly 0 where the
    /// next copy of the periodic array begins.
    fn weights(self) -> Vec<f64> {
        let Self { length, before, padded } = self;
        let after = padded - before - length;
        let fade = |outside: usize, room: usize| 0.5 * (1.0 + (PI * outside as f64 / (room + 1) as f64).cos());
        let (left, right) = ((1..=before).rev(), 1..=after);
        left.map(|outside| fade(outside, before))
            .chain(std::iter::repeat_n(1.0, length))
            .chain(right.map(|outside| fade(outside, after)))
            .collect()
    }

    /// The cell of the layer nearest to a padded place, and the one as far inside the edge as the place is outside.
    fn nearest_and_mirrored(self, place: usize) -> (usize, usize) {
        let last = self.length - 1;
        let nearest = place.saturating_sub(self.before).min(last);
        let outside = place.abs_diff(nearest + self.before);
        (nearest, if place < self.before { outside.min(last) } else { nearest - outside.min(nearest) })
    }
}

/// A layer in its padding, given row by row, so that the padded array never stands in memory.
///
/// Beyond the edge stands the field of the sources that were found below the layer ([`super::sources`]), which dies away
/// as attraction does. What the sources do not explain is mirrored through the values at the edge (twice the edge value
/// less the mirrored one), so that slope as well as value runs on across it, and dies away to zero under a cosine taper.
///
/// A plain mirror image breaks the slope at the edge and repeats every body near it; tests/field_worlds.rs states what
/// that costs.
pub(super) struct Padding<'a> {
    rest: &'a Array2<f64>,
    around: &'a Surroundings,
    down: Vec<f64>,
    across: Vec<f64>,
}

impl<'a> Padding<'a> {
    /// `rest` is a layer without gaps that the surroundings have been taken off.
    pub fn new(rest: &'a Array2<f64>, around: &'a Surroundings) -> Self {
        let (down, across) = around.axes();
        Self { rest, around, down: down.weights(), across: across.weights() }
    }

    /// Writes one padded row.
    pub fn row(&self, row: usize, into: &mut [f64]) {
        let (down, across) = self.around.axes();
        let (nearest, mirrored) = down.nearest_and_mirrored(row);
        let (nearest, mirrored) = (self.rest.row(nearest), self.rest.row(mirrored));
        let (before, end) = (across.before, across.before + across.length);
        for ((value, near), far) in into[before..end].iter_mut().zip(nearest).zip(mirrored) {
            *value = self.down[row] * (2.0 * near - far);
        }
        for place in (0..before).chain(end..across.padded) {
            let (edge, inside) = across.nearest_and_mirrored(place);
            into[place] = self.down[row] * self.across[place] * (2.0 * nearest[edge] - mirrored[inside]);
        }
        self.around.add(row, 0, into, 1.0);
    }
}

#[cfg(test)]
mod tests {
    use super::super::sources::Sources;
    use super::*;

    #[test]
    fn lengths_suit_the_transform() {
        for length in [8, 9, 100, 128, 257, 511] {
            let padded = padded_length(length);
            assert!(
                padded >= 2 * length && padded.is_multiple_of(2) && padded <= 2 * length + length / 4 + 8,
                "{padded}"
            );
        }
        assert_eq!(padded_length(512), 1024);
    }

    #[test]
    fn the_layer_is_kept_and_nothing_jumps() {
        let values = Array2::from_shape_fn((40, 60), |(row, col)| (row as f64 / 9.0).sin() + (col as f64 / 7.0).cos());
        let around = Surroundings::new((40, 60), &Sources::none());
        let padding = Padding::new(&values, &around);
        let (down, across) = around.axes();
        let mut padded = Array2::<f64>::zeros((down.padded, across.padded));
        for (row, mut line) in padded.outer_iter_mut().enumerate() {
            padding.row(row, line.as_slice_mut().unwrap());
        }
        let (top, left) = (down.before, across.before);
        let inner = padded.slice(ndarray::s![top..top + 40, left..left + 60]);
        assert!(inner.iter().zip(&values).all(|(a, b)| (a - b).abs() < 1e-15 * 4.0));
        // Steepest step inside: 1/9 + 1/7; the padded array, wrapped, never steps much farther.
        let (rows, cols) = padded.dim();
        for ((row, col), value) in padded.indexed_iter() {
            let below = padded[[(row + 1) % rows, col]];
            let beside = padded[[row, (col + 1) % cols]];
            assert!((value - below).abs() < 0.35 && (value - beside).abs() < 0.35, "{row} {col}");
        }
    }
}
