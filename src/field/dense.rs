//! Small dense symmetric equations.

use rayon::prelude::*;

/// A symmetric matrix with a right side as its last row; the lower triangle is kept, row after row.
#[derive(Debug, Clone)]
pub(super) struct Symmetric {
    rows: Vec<Vec<f64>>,
}

/// The sums of products of all pairs of columns of `equations` (the normal equations, right side last). Sums run in the
/// order of the equations, whatever the number of threads.
pub(super) fn product_with_transpose(equations: &[Vec<f64>]) -> Symmetric {
    let width = equations.first().map_or(0, Vec::len);
    let rows = (0..width)
        .into_par_iter()
        .map(|row| {
            let mut sums = vec![0.0; row + 1];
            for equation in equations {
                let factor = equation[row];
                for (sum, value) in sums.iter_mut().zip(equation) {
                    *sum += factor * value;
                }
            }
            sums
        })
        .collect();
    Symmetric { rows }
}

impl Symmetric {
    /// One number of the lower triangle.
    pub fn at(&self, row: usize, col: usize) -> f64 {
        self.rows[row][col]
    }

    /// Adds to the diagonal.
    pub fn raise(&mut self, at: usize, by: f64) {
        self.rows[at][at] += by;
    }

    /// The solution, by Cholesky's factors; `None` if the matrix is not positive definite.
    pub fn solved(mut self) -> Option<Vec<f64>> {
        let unknowns = self.rows.len().checked_sub(1)?;
        for pivot in 0..unknowns {
            let (done, rest) = self.rows.split_at_mut(pivot + 1);
            let root = done[pivot][pivot].sqrt();
            if root.is_nan() || root <= 0.0 {
                return None;
            }
            done[pivot][pivot] = root;
            let column: Vec<f64> = rest.iter().map(|row| row[pivot] / root).collect();
            for (at, row) in rest.iter_mut().enumerate() {
                let factor = column[at];
                row[pivot] = factor;
                for (value, other) in row[pivot + 1..].iter_mut().zip(&column[..=at]) {
                    *value -= factor * other;
                }
            }
        }
        // The last row has become the solution of the forward sweep.
        let mut solution = self.rows[unknowns][..unknowns].to_vec();
        for at in (0..unknowns).rev() {
            solution[at] /= self.rows[at][at];
            let found = solution[at];
            for (value, factor) in solution[..at].iter_mut().zip(&self.rows[at]) {
                *value -= found * factor;
            }
        }
        Some(solution)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_through_three_points() {
        // By hand: least squares through (0, 1), (1, 3), (2, 8) is 0.5 + 3.5 x.
        let equations = [[1.0, 0.0, 1.0], [1.0, 1.0, 3.0], [1.0, 2.0, 8.0]].map(Vec::from);
        let found = product_with_transpose(&equations).solved().unwrap();
        assert!((found[0] - 0.5).abs() < 1e-12 && (found[1] - 3.5).abs() < 1e-12, "{found:?}");
    }

    #[test]
    fn equations_that_cannot_tell_have_no_solution() {
        assert!(product_with_transpose(&[vec![1.0, 0.0, 2.0]]).solved().is_none());
        assert!(product_with_transpose(&[]).solved().is_none());
    }
}
