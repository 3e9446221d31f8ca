//! A set of cells of a frame: a footprint, a body, the ground within a distance of a line.

use ndarray::{Array2, Zip};

/// A set of cells, one boolean for each cell of an array.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Mask(pub Array2<bool>);

impl Mask {
    /// A mask with every cell set.
    pub fn all(shape: (usize, usize)) -> Self {
        Self(Array2::from_elem(shape, true))
    }

    /// A mask with no cell set.
    pub fn none(shape: (usize, usize)) -> Self {
        Self(Array2::from_elem(shape, false))
    }

    /// The cells that hold a finite number.
    pub fn of_finite(values: &Array2<f64>) -> Self {
        Self(values.mapv(f64::is_finite))
    }

    /// How many cells are set.
    pub fn count(&self) -> usize {
        self.0.iter().filter(|set| **set).count()
    }

    /// True if no cell is set.
    pub fn is_empty(&self) -> bool {
        !self.0.iter().any(|set| *set)
    }

    /// (rows, columns).
    pub fn shape(&self) -> (usize, usize) {
        self.0.dim()
    }

    /// The cells set in both. Both must have one shape.
    pub fn and(&self, other: &Self) -> Self {
        let mut both = self.0.clone();
        Zip::from(&mut both).and(&other.0).for_each(|a, &b| *a &= b);
        Self(both)
    }

    /// The smallest box that holds every set cell, as first and last (row, column); `None` if no cell is set.
    pub fn bounds(&self) -> Option<((usize, usize), (usize, usize))> {
        let mut bounds: Option<((usize, usize), (usize, usize))> = None;
        for ((row, col), set) in self.0.indexed_iter() {
            if *set {
                let ((top, left), (bottom, right)) = bounds.unwrap_or(((row, col), (row, col)));
                bounds = Some(((top.min(row), left.min(col)), (bottom.max(row), right.max(col))));
            }
        }
        bounds
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn counts_bounds_and_intersection() {
        let mask = Mask::of_finite(&array![[f64::NAN, 1.0, 2.0], [f64::NAN, f64::INFINITY, 0.0]]);
        assert_eq!(mask.count(), 3);
        assert_eq!(mask.bounds(), Some(((0, 1), (1, 2))));
        assert_eq!(mask.and(&Mask::none((2, 3))).bounds(), None);
        assert!(Mask::none((2, 3)).is_empty());
        assert_eq!(mask.and(&Mask::all((2, 3))), mask);
    }
}
