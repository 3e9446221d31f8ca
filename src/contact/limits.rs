//! How strong and how prominent a crest must be where the noise of the layer is known.

use ndarray::Array2;

use super::prominence::Prominence;
use super::thin::AROUND;
use crate::field::{Gradient, GradientNoise};

/// Limits on the crests that a line may start from and be followed along.
pub(super) struct Limits<'a> {
    noise: &'a GradientNoise,
    /// The magnitude that noise exceeds in a given cell with the chance of the significance.
    pointwise: f64,
    /// The magnitude that noise exceeds anywhere in the layer with that chance.
    layer: f64,
    /// Cells that must hold numbers all around the start of a line.
    edge: usize,
    along: Prominence,
    start: Prominence,
}

impl<'a> Limits<'a> {
    /// For a layer of `cells` cells.
    pub fn new(noise: &'a GradientNoise, significance: f64, cells: usize) -> Self {
        let pointwise = noise.pointwise_bound(significance);
        let layer = noise.layer_bound(significance, cells);
        // The difference of two values has the square root of two times the deviation of one.
        let fall = std::f64::consts::SQRT_2 * pointwise;
        Self {
            noise,
            pointwise,
            layer,
            edge: noise.edge(),
            along: Prominence { fall, rise: std::f64::consts::SQRT_2 * noise.component(), at_end: true },
            // On the flank of a slope every cell is strong, so the fall to both sides must be beyond the layer's noise as well.
            start: Prominence { fall: std::f64::consts::SQRT_2 * layer, rise: 0.0, at_end: false },
        }
    }

    /// True if a line may be followed along a crest in this cell.
    pub fn follow(&self, gradient: &Gradient, strength: &Array2<f64>, cell: (usize, usize)) -> bool {
        let growth = self.noise.growth(strength.dim(), cell);
        strength[cell] > growth * self.pointwise && self.along.holds(gradient, strength, cell, growth)
    }

    /// True if a line may start at a crest in this cell.
    pub fn start(&self, gradient: &Gradient, strength: &Array2<f64>, cell: (usize, usize)) -> bool {
        let growth = self.noise.growth(strength.dim(), cell);
        strength[cell] > growth * self.layer
            && self.has_room(strength, cell)
            && self.start.holds(gradient, strength, cell, growth)
    }

    /// True if the cells in the eight directions hold numbers as far as the padding of the transform matters.
    fn has_room(&self, strength: &Array2<f64>, cell: (usize, usize)) -> bool {
        AROUND.iter().all(|(down, across)| {
            (1..=self.edge as isize).all(|step| {
                let place = (cell.0.wrapping_add_signed(step * down), cell.1.wrapping_add_signed(step * across));
                strength.get(place).is_some_and(|value| value.is_finite())
            })
        })
    }
}
