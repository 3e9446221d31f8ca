//! The plane that fits a layer best.

use ndarray::Array2;

/// A plane over the cells of an array: `level + down * (row - row0) + right * (col - col0)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plane {
    /// Value at the mean position of the cells it was fitted on.
    pub level: f64,
    /// Rise from one row to the next one south.
    pub down: f64,
    /// Rise from one column to the next one east.
    pub right: f64,
    row0: f64,
    col0: f64,
}

impl Plane {
    /// A plane without slope.
    pub fn flat(level: f64) -> Self {
        Self { level, down: 0.0, right: 0.0, row0: 0.0, col0: 0.0 }
    }

    /// The least-squares plane through the finite values, or `None` if there are none.
    ///
    /// Where the cells lie on one line, the part of the slope that they cannot tell is zero.
    pub fn fit(values: &Array2<f64>) -> Option<Self> {
        let cells = || values.indexed_iter().filter(|(_, value)| value.is_finite());
        let count = cells().count() as f64;
        if count == 0.0 {
            return None;
        }
        let (mut row0, mut col0, mut level) = (0.0, 0.0, 0.0);
        for ((row, col), value) in cells() {
            row0 += row as f64 / count;
            col0 += col as f64 / count;
            level += value / count;
        }
        let (mut rr, mut rc, mut cc, mut rv, mut cv) = (0.0, 0.0, 0.0, 0.0, 0.0);
        for ((row, col), value) in cells() {
            let (r, c, v) = (row as f64 - row0, col as f64 - col0, value - level);
            rr += r * r;
            rc += r * c;
            cc += c * c;
            rv += r * v;
            cv += c * v;
        }
        let determinant = rr * cc - rc * rc;
        let (down, right) = if determinant > 1e-9 * rr * cc {
            ((rv * cc - cv * rc) / determinant, (cv * rr - rv * rc) / determinant)
        } else if rr + cc > 0.0 {
            // All cells on one line: slope along it only.
            let (along_row, along_col) = if rr >= cc { (rr, rc) } else { (rc, cc) };
            let norm = along_row.hypot(along_col);
            let (ur, uc) = (along_row / norm, along_col / norm);
            let slope = (rv * ur + cv * uc) / (rr * ur * ur + 2.0 * rc * ur * uc + cc * uc * uc);
            (slope * ur, slope * uc)
        } else {
            (0.0, 0.0)
        };
        Some(Self { level, down, right, row0, col0 })
    }

    /// The plane's value in a cell.
    pub fn at(&self, row: usize, col: usize) -> f64 {
        self.level + self.down * (row as f64 - self.row0) + self.right * (col as f64 - self.col0)
    }

    /// What is left of the values when the plane is taken off.
    pub fn residual(&self, values: &Array2<f64>) -> Array2<f64> {
        Array2::from_shape_fn(values.dim(), |(row, col)| values[[row, col]] - self.at(row, col))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_plane_with_holes_is_found_exactly() {
        let values = Array2::from_shape_fn((9, 14), |(row, col)| {
            if (row + 2 * col) % 5 == 0 { f64::NAN } else { 3.0 - 0.25 * row as f64 + 1.5 * col as f64 }
        });
        let plane = Plane::fit(&values).unwrap();
        assert!((plane.down + 0.25).abs() < 1e-12 && (plane.right - 1.5).abs() < 1e-12);
        assert!(plane.residual(&values).iter().all(|value| value.is_nan() || value.abs() < 1e-11));
    }

    #[test]
    fn degenerate_sets_of_cells() {
        assert_eq!(Plane::fit(&Array2::from_elem((3, 3), f64::NAN)), None);
        let mut one = Array2::from_elem((3, 3), f64::NAN);
        one[[1, 2]] = 7.0;
        assert_eq!(Plane::fit(&one).map(|plane| (plane.level, plane.down, plane.right)), Some((7.0, 0.0, 0.0)));
        let line = Array2::from_shape_fn((6, 6), |(row, col)| if row == col { row as f64 } else { f64::NAN });
        let plane = Plane::fit(&line).unwrap();
        assert!((plane.at(4, 4) - 4.0).abs() < 1e-12);
        assert!((plane.down - plane.right).abs() < 1e-12, "the slope lies along the line");
    }
}
