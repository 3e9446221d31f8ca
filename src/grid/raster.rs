//! A layer of numbers on a frame.

use ndarray::Array2;
use ndarray_stats::QuantileExt;

use super::{Frame, Mask};
use crate::error::{Error, Result};

/// One number for each cell of a frame; missing is NaN.
#[derive(Debug, Clone)]
pub struct Grid {
    frame: Frame,
    values: Array2<f64>,
}

impl Grid {
    /// Joins values with the frame that they stand on. Infinities count as missing from here on.
    ///
    /// # Errors
    /// When the shapes differ.
    pub fn new(frame: Frame, mut values: Array2<f64>) -> Result<Self> {
        if values.dim() != frame.shape() {
            return Err(Error::ours("joining values with a frame")
                .found(format!("{:?} values", values.dim()))
                .wanted(format!("{:?}", frame.shape())));
        }
        values.mapv_inplace(|value| if value.is_finite() { value } else { f64::NAN });
        Ok(Self { frame, values })
    }

    /// The frame.
    pub fn frame(&self) -> &Frame {
        &self.frame
    }

    /// The values, NaN where missing.
    pub fn values(&self) -> &Array2<f64> {
        &self.values
    }

    /// The values, taken out.
    pub fn into_values(self) -> Array2<f64> {
        self.values
    }

    /// The cells that hold a number.
    pub fn footprint(&self) -> Mask {
        Mask::of_finite(&self.values)
    }

    /// A grid on the same frame with each number changed; missing stays missing.
    pub fn map(&self, change: impl Fn(f64) -> f64) -> Self {
        let values = self.values.mapv(|value| {
            let changed = if value.is_nan() { f64::NAN } else { change(value) };
            if changed.is_finite() { changed } else { f64::NAN }
        });
        Self { frame: self.frame.clone(), values }
    }

    /// A grid on the same frame with `values` in place of its own.
    ///
    /// # Errors
    /// When the shapes differ.
    pub fn with(&self, values: Array2<f64>) -> Result<Self> {
        Self::new(self.frame.clone(), values)
    }

    /// The smallest and the largest number, or `None` if there is none.
    pub fn range(&self) -> Option<(f64, f64)> {
        let (low, high) = (*self.values.min_skipnan(), *self.values.max_skipnan());
        // Both are NaN where every value is missing.
        low.is_finite().then_some((low, high))
    }

    /// The inner part that is left when `ring` cells are cut off each side.
    ///
    /// # Errors
    /// When nothing would be left.
    pub fn trimmed(&self, ring: usize) -> Result<Self> {
        let (rows, cols) = self.frame.shape();
        if 2 * ring >= rows.min(cols) {
            return Err(Error::ours("trimming a grid")
                .found(format!("{rows} x {cols} cells"))
                .wanted(format!("more than {} on each side", 2 * ring)));
        }
        let (inner_rows, inner_cols) = (rows - 2 * ring, cols - 2 * ring);
        let by = ring as f64 * self.frame.cell;
        let frame = Frame::new(
            self.frame.crs.clone(),
            self.frame.west + by,
            self.frame.north - by,
            self.frame.cell,
            inner_rows,
            inner_cols,
        )?;
        let window = ndarray::s![ring..ring + inner_rows, ring..ring + inner_cols];
        Self::new(frame, self.values.slice(window).to_owned())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn infinities_are_missing_and_the_footprint_knows() {
        let frame = Frame::local(1.0, 2, 2).unwrap();
        let grid = Grid::new(frame, array![[1.0, f64::INFINITY], [f64::NAN, -4.0]]).unwrap();
        assert_eq!(grid.footprint().count(), 2);
        assert_eq!(grid.range(), Some((-4.0, 1.0)));
        let logged = grid.map(f64::log10);
        assert_eq!(logged.footprint().count(), 1, "the logarithm of a negative number is missing");
    }

    #[test]
    fn shapes_must_agree_and_trimming_undoes_growing() {
        let frame = Frame::local(5.0, 3, 4).unwrap();
        assert!(Grid::new(frame.clone(), Array2::zeros((4, 3))).is_err());
        let grown = Grid::new(frame.grown(2).unwrap(), Array2::ones((7, 8))).unwrap();
        assert_eq!(grown.trimmed(2).unwrap().frame(), &frame);
        assert!(grown.trimmed(4).is_err());
    }
}
