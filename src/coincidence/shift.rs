//! Which displacements of the subject the null may use.

use ndarray::{Array2, Zip};

/// The least share of the overlap at no shift that an admissible shift must keep.
///
/// Below one half the distance and correlation measures lose their level (measured; see the contributors' guide).
pub const LEAST_OVERLAP: f64 = 0.5;

/// The longest admissible shift as a share of the footprint's side.
pub const LONGEST_SHIFT: f64 = 0.25;

/// How far shifts go: up to `rows` rows and `cols` columns in either direction.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Reach {
    /// The longest shift along a column, in cells.
    pub rows: usize,
    /// The longest shift along a row, in cells.
    pub cols: usize,
}

impl Reach {
    /// The reach for a footprint whose box measures `rows` x `cols` cells: a quarter of each side.
    pub fn of_box(rows: usize, cols: usize) -> Self {
        let quarter = |side: usize| (side as f64 * LONGEST_SHIFT).floor() as usize;
        Self { rows: quarter(rows), cols: quarter(cols) }
    }

    /// Shape of an array that holds one value for each shift; its centre is the shift of zero.
    pub fn shape(self) -> (usize, usize) {
        (2 * self.rows + 1, 2 * self.cols + 1)
    }

    /// Index of the shift of zero.
    pub fn zero(self) -> [usize; 2] {
        [self.rows, self.cols]
    }

    /// True if a shift lies in the ellipse whose half-axes are the reach.
    ///
    /// On a square this is the disc of shifts no longer than a quarter of the side.
    fn holds(self, down: f64, right: f64) -> bool {
        let part = |shift: f64, half: usize| match half {
            0 if shift == 0.0 => 0.0,
            0 => f64::INFINITY,
            _ => shift / half as f64,
        };
        // A hair above one, so that the four tips are never lost to rounding.
        part(down, self.rows).powi(2) + part(right, self.cols).powi(2) <= 1.0 + 1e-12
    }

    /// The reach that holds both.
    pub fn or(self, other: Self) -> Self {
        Self { rows: self.rows.max(other.rows), cols: self.cols.max(other.cols) }
    }
}

/// The admissible shifts for one pair of footprints whose overlap, in cells, at each shift is `overlap` (an array with
/// the shift of zero at its centre), for shifts up to `longest`.
///
/// A shift is admissible if it lies within the ellipse of `longest` and keeps at least [`LEAST_OVERLAP`] of the cells that
/// the footprints share at no shift. Short shifts are not excluded: without them the observed value would stand alone
/// above a continuous surface and the test would find too much.
pub fn admissible(longest: Reach, overlap: &Array2<f64>) -> Array2<bool> {
    let (up, left) = (overlap.nrows() / 2, overlap.ncols() / 2);
    let least = LEAST_OVERLAP * overlap[[up, left]];
    let mut allowed = Array2::from_elem(overlap.dim(), false);
    Zip::indexed(&mut allowed).and(overlap).for_each(|(row, col), allowed, &cells| {
        let within = longest.holds(row as f64 - up as f64, col as f64 - left as f64);
        *allowed = within && cells > 0.0 && cells >= least;
    });
    allowed
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_square_admits_the_disc_of_a_quarter_of_its_side() {
        let reach = Reach::of_box(40, 40);
        assert_eq!(reach, Reach { rows: 10, cols: 10 });
        let allowed = admissible(reach, &Array2::from_elem(reach.shape(), 100.0));
        for ((row, col), allowed) in allowed.indexed_iter() {
            let (dr, dc) = (row as f64 - 10.0, col as f64 - 10.0);
            assert_eq!(*allowed, dr.hypot(dc) <= 10.0, "shift {dr}, {dc}");
        }
    }

    #[test]
    fn overlaps_below_one_half_are_left_out() {
        let reach = Reach { rows: 1, cols: 1 };
        let overlap = ndarray::array![[0.0, 50.0, 0.0], [49.0, 100.0, 51.0], [0.0, 99.0, 0.0]];
        let allowed = admissible(reach, &overlap);
        assert_eq!(allowed, ndarray::array![[false, true, false], [false, true, true], [false, true, false]]);
    }

    #[test]
    fn a_single_row_shifts_along_itself() {
        let reach = Reach::of_box(1, 41);
        assert_eq!(reach, Reach { rows: 0, cols: 10 });
        assert_eq!(admissible(reach, &Array2::ones((1, 21))).iter().filter(|a| **a).count(), 21);
    }
}
