//! The part of the arrays that matters, and how far shifts go in it.

use ndarray::{Array2, ArrayView2, s};

use super::layer::{Reference, Subject};
use super::shift::Reach;
use crate::grid::Mask;

/// The part of the arrays that holds every footprint, and how far shifts go in it.
pub(super) struct Window {
    top: usize,
    left: usize,
    rows: usize,
    cols: usize,
    pub reach: Reach,
}

impl Window {
    /// `None` if no subject shares a cell with any reference.
    pub fn around(subjects: &[Subject], references: &[Reference]) -> Option<Self> {
        let mut reach: Option<Reach> = None;
        let mut extent: Option<((usize, usize), (usize, usize))> = None;
        let mut cover = |bounds: ((usize, usize), (usize, usize))| {
            let ((top, left), (bottom, right)) = extent.unwrap_or(bounds);
            let ((t, l), (b, r)) = bounds;
            extent = Some(((top.min(t), left.min(l)), (bottom.max(b), right.max(r))));
        };
        for (number, subject) in subjects.iter().enumerate() {
            let earlier = &subjects[..number];
            if earlier.iter().any(|other| other.footprint == subject.footprint) {
                continue;
            }
            for reference in references {
                if let Some(longest) = longest_shift(&subject.footprint, &reference.footprint) {
                    reach = Some(reach.map_or(longest, |reach| reach.or(longest)));
                    [&subject.footprint, &reference.footprint].into_iter().filter_map(bounds).for_each(&mut cover);
                }
            }
        }
        let ((top, left), (bottom, right)) = extent?;
        Some(Self { top, left, rows: bottom - top + 1, cols: right - left + 1, reach: reach? })
    }

    pub fn shape(&self) -> (usize, usize) {
        (self.rows, self.cols)
    }

    /// The same part of any array.
    pub fn cut<'a, T>(&self, array: &'a Array2<T>) -> ArrayView2<'a, T> {
        array.slice(s![self.top..self.top + self.rows, self.left..self.left + self.cols])
    }
}

fn bounds(footprint: &Array2<bool>) -> Option<((usize, usize), (usize, usize))> {
    Mask(footprint.clone()).bounds()
}

/// The longest admissible shift for a pair of footprints: a quarter of the box around the cells that they share.
pub(super) fn longest_shift(a: &Array2<bool>, b: &Array2<bool>) -> Option<Reach> {
    let ((top, left), (bottom, right)) = bounds(&(a & b))?;
    Some(Reach::of_box(bottom - top + 1, right - left + 1))
}
