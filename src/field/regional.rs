//! The regional: a low-order polynomial through a layer, and what is left when it is taken off.

use ndarray::Array2;

use super::check::checked_layer;
use super::polynomial::{Basis, Factor, HIGHEST_DEGREE};
use crate::error::{Error, Result};
use crate::grid::Grid;

/// The cells that each coefficient needs at least.
const CELLS_PER_TERM: usize = 3;

/// A regional and its residual, both in the unit of the layer and on its footprint; their sum is the layer.
#[derive(Debug, Clone)]
pub struct Regional {
    /// The polynomial.
    pub regional: Grid,
    /// The layer less the polynomial.
    pub residual: Grid,
}

/// Fits a polynomial of total degree 1 (a plane), 2 or 3 in the two coordinates by least squares to all cells that hold a
/// number, and takes it off. Each cell counts the same, so a wide body inside the layer pulls on the fit.
///
/// Steps: coordinates from -1 to 1 across the footprint; products of Legendre polynomials, which on a full rectangle are
/// nearly orthogonal; normal equations scaled to a unit diagonal and solved by Cholesky's method, then once more for what
/// is left, which takes off the rounding of the first pass. The order of the sums does not depend on the number of threads.
///
/// Source: Agocs (1951), Geophysics 16, 686-696 (least-squares residual anomalies); Legendre polynomials and Cholesky: Golub
/// & Van Loan (2013), Matrix Computations.
///
/// # Errors
/// A degree other than 1, 2 or 3; a layer that is empty or constant; fewer than three cells per coefficient, or cells that lie
/// on a curve of that degree (a single line, say), so that the coefficients cannot be told apart.
pub fn regional(grid: &Grid, degree: usize) -> Result<Regional> {
    if !(1..=HIGHEST_DEGREE).contains(&degree) {
        return Err(Error::input("the degree of a regional")
            .found(degree)
            .wanted(format!("1 (a plane) to {HIGHEST_DEGREE}"))
            .mend("choose the lowest degree that takes the regional away"));
    }
    checked_layer(grid)?;
    let terms = (degree + 1) * (degree + 2) / 2;
    let footprint = grid.footprint();
    let cells = footprint.count();
    if cells < CELLS_PER_TERM * terms {
        return Err(Error::input(format!("a regional of degree {degree}"))
            .found(format!("{cells} cells that hold a number"))
            .wanted(format!("at least {}, {CELLS_PER_TERM} for each coefficient", CELLS_PER_TERM * terms))
            .mend("choose a lower degree or a larger layer"));
    }
    let Some(((top, left), (bottom, right))) = footprint.bounds() else {
        return Err(Error::ours("the footprint of a layer that holds numbers").found("empty"));
    };
    let basis = Basis::new(degree, (top, bottom), (left, right));
    let factor = Factor::new(basis.products(grid.values()), terms).ok_or_else(|| {
        Error::input(format!("a regional of degree {degree}"))
            .found(format!("{cells} cells that lie on a line or a curve"))
            .wanted("cells spread over an area, which tell all coefficients apart")
            .mend("choose a lower degree or a larger layer")
    })?;
    let mut fitted = Array2::zeros(grid.frame().shape());
    let mut residual = grid.values().clone();
    for _ in 0..2 {
        let coefficients = factor.solve(basis.moments(&residual));
        let step = basis.surface(&coefficients, residual.dim());
        fitted += &step;
        residual -= &step;
    }
    // Through the residual, so that the regional is missing where the layer is, and the two add up.
    let regional = Grid::new(grid.frame().clone(), &fitted + &(&residual * 0.0))?;
    Ok(Regional { regional, residual: grid.with(residual)? })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;

    fn layer(of: impl Fn(f64, f64) -> f64) -> Grid {
        let frame = Frame::local(200.0, 40, 55).unwrap();
        let values = Array2::from_shape_fn((40, 55), |(row, col)| {
            let (x, y) = frame.position(row as f64, col as f64);
            of(x / 1000.0, y / 1000.0)
        });
        Grid::new(frame, values).unwrap()
    }

    /// The same layer with a ragged footprint.
    fn ragged(grid: &Grid) -> Grid {
        let mut values = grid.values().clone();
        for ((row, col), value) in values.indexed_iter_mut() {
            if row + col > 70 || (row < 12 && col < 9) {
                *value = f64::NAN;
            }
        }
        grid.with(values).unwrap()
    }

    #[test]
    fn a_polynomial_of_each_degree_is_given_back() {
        // Source: least squares reproduces any surface of its own space.
        type Surface = fn(f64, f64) -> f64;
        let surfaces: [Surface; 3] = [
            |x, y| 40.0 + 1.5 * x - 2.5 * y,
            |x, y| -7.0 + x - 0.3 * x * y + 0.2 * y * y,
            |x, y| 980_000.0 + 0.02 * x * x * x - 0.05 * x * y * y + 0.3 * x * y + y,
        ];
        for (index, surface) in surfaces.into_iter().enumerate() {
            let grid = ragged(&layer(surface));
            let found = regional(&grid, index + 1).unwrap();
            assert_eq!(found.regional.footprint(), grid.footprint());
            assert_eq!(found.residual.footprint(), grid.footprint());
            let range = grid.range().unwrap();
            let worst = found.residual.values().iter().filter(|v| v.is_finite()).fold(0.0_f64, |m, v| m.max(v.abs()));
            assert!(worst < 1e-13 * range.1.abs().max(range.0.abs()) + 1e-11, "degree {}: {worst:e}", index + 1);
        }
    }

    #[test]
    fn what_is_left_is_orthogonal_to_every_term() {
        // Source: the normal equations of least squares, here against plain powers of the coordinates.
        let grid = ragged(&layer(|x, y| (x * 1.3).sin() * (y * 0.9).cos() + 0.1 * x));
        for degree in 1..=3 {
            let residual = regional(&grid, degree).unwrap().residual;
            let size = residual.values().iter().filter(|v| v.is_finite()).map(|v| v.abs()).sum::<f64>();
            for (i, j) in (0..=degree).flat_map(|i| (0..=degree - i).map(move |j| (i as i32, j as i32))) {
                let moment: f64 = residual
                    .values()
                    .indexed_iter()
                    .filter(|(_, value)| value.is_finite())
                    .map(|((row, col), value)| value * (row as f64 / 40.0).powi(i) * (col as f64 / 55.0).powi(j))
                    .sum();
                assert!(moment.abs() < 1e-11 * size, "{degree} {i} {j}: {moment:e}");
            }
        }
    }

    #[test]
    fn the_two_parts_add_up_to_the_layer() {
        let grid = ragged(&layer(|x, y| (x * 1.3).sin() * (y * 0.9).cos()));
        let parts = regional(&grid, 3).unwrap();
        for ((sum, part), whole) in parts.regional.values().iter().zip(parts.residual.values()).zip(grid.values()) {
            assert!(whole.is_nan() || (sum + part - whole).abs() < 1e-13);
        }
    }

    #[test]
    fn each_bad_degree_and_layer_is_refused() {
        let refused = |grid: &Grid, degree: usize| regional(grid, degree).unwrap_err().to_string();
        let bumps = layer(|x, y| x.sin() + y.cos());
        assert!(refused(&bumps, 0).contains("degree of a regional"));
        assert!(refused(&bumps, 4).contains("degree of a regional"));
        assert!(refused(&layer(|_, _| 3.0), 1).contains("the layer is constant"));
        assert!(refused(&layer(|_, _| f64::NAN), 1).contains("no cell that holds a number"));
        let few = Array2::from_shape_fn(
            (40, 55),
            |(row, col)| if row < 2 && col < 4 { (row + col) as f64 } else { f64::NAN },
        );
        assert!(refused(&bumps.with(few).unwrap(), 1).contains("8 cells"));
        let line = Array2::from_shape_fn((40, 55), |(row, col)| if row == col { row as f64 } else { f64::NAN });
        assert!(refused(&bumps.with(line).unwrap(), 1).contains("a line or a curve"));
        let rows =
            Array2::from_shape_fn((40, 55), |(row, col)| if row % 20 == 3 { (row * col) as f64 } else { f64::NAN });
        assert!(refused(&bumps.with(rows).unwrap(), 2).contains("a line or a curve"), "two rows cannot bend");
    }
}
