//! A stack of slices, each at its depth.

use super::Grid;
use crate::error::{Error, Result};

/// Slices of one quantity on one frame, from the shallowest down.
#[derive(Debug, Clone)]
pub struct Volume {
    slices: Vec<(f64, Grid)>,
}

impl Volume {
    /// Sorts the slices by depth (m, positive down) and checks that they stand on one frame.
    ///
    /// # Errors
    /// No slice, a depth that is not a finite number, two slices at one depth, or slices on different frames.
    pub fn new(mut slices: Vec<(f64, Grid)>) -> Result<Self> {
        if let Some((depth, _)) = slices.iter().find(|(depth, _)| !depth.is_finite()) {
            return Err(Error::input("the depth of a slice").found(depth).wanted("a finite number of metres"));
        }
        slices.sort_by(|a, b| a.0.total_cmp(&b.0));
        if let Some(pair) = slices.windows(2).find(|pair| pair[0].0 == pair[1].0) {
            return Err(Error::input("the depths of the slices")
                .found(format!("two slices at {} m", pair[0].0))
                .wanted("each depth once")
                .mend("name one of them"));
        }
        let Some((_, first)) = slices.first() else {
            return Err(Error::input("the conductivity model").found("no slice").wanted("at least one slice"));
        };
        if slices.iter().any(|(_, grid)| grid.frame() != first.frame()) {
            return Err(Error::ours("stacking slices").found("different frames").wanted("one frame"));
        }
        Ok(Self { slices })
    }

    /// (depth in metres, slice), from the shallowest down.
    pub fn slices(&self) -> &[(f64, Grid)] {
        &self.slices
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;
    use ndarray::Array2;

    fn slice(rows: usize) -> Grid {
        Grid::new(Frame::local(1.0, rows, 2).unwrap(), Array2::zeros((rows, 2))).unwrap()
    }

    #[test]
    fn slices_are_sorted_by_depth() {
        let volume = Volume::new(vec![(900.0, slice(2)), (100.0, slice(2))]).unwrap();
        assert_eq!(volume.slices().iter().map(|(depth, _)| *depth).collect::<Vec<_>>(), [100.0, 900.0]);
    }

    #[test]
    fn each_bad_stack_is_refused() {
        assert!(Volume::new(vec![]).unwrap_err().to_string().contains("no slice"));
        assert!(Volume::new(vec![(f64::NAN, slice(2))]).unwrap_err().to_string().contains("NaN"));
        assert!(Volume::new(vec![(1.0, slice(2)), (1.0, slice(2))]).unwrap_err().to_string().contains("two slices"));
        assert!(Volume::new(vec![(1.0, slice(2)), (2.0, slice(3))]).unwrap_err().to_string().contains("frames"));
    }
}
