//! The footprints on which both the test and the full run measure the level.

use ndarray::Array2;

/// A full square.
pub fn square(side: usize) -> Array2<bool> {
    Array2::from_elem((side, side), true)
}

/// A bent L: a square without half its rows over three quarters of its columns, 62.5 % of the cells.
pub fn bent(side: usize) -> Array2<bool> {
    Array2::from_shape_fn((side, side), |(row, col)| row >= side / 2 || col < side / 4)
}
