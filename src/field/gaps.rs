//! Filling of missing cells, so that a layer with gaps can be transformed.

use ndarray::Array2;

use crate::error::{Error, Result};

/// A sweep stops when no equation is out by more than this share of the range of the known values.
const TOLERANCE: f64 = 1e-6;

/// Marks a neighbour that is not an unknown.
const NONE: usize = usize::MAX;

/// Fills each missing (NaN) cell with the harmonic function that meets the known cells around it.
///
/// Inside a gap each cell becomes the mean of its four neighbours (Laplace's equation, five-point formula); at the edge
/// of the array only the neighbours that exist count, which is the natural condition of no flow across the edge. The
/// filled values therefore never leave the range of the known ones. Known cells are kept as they are.
///
/// Steps: halve the array by the mean of the known cells in each block of 2 x 2 and fill that first, down to a single
/// cell; spread the result by bilinear interpolation as a first guess; finish with conjugate gradients (Hestenes &
/// Stiefel 1952). No step depends on the number of threads.
///
/// # Errors
/// No known cell, or no convergence.
pub fn fill_gaps(values: &Array2<f64>) -> Result<Array2<f64>> {
    let (low, high) = values
        .iter()
        .filter(|value| value.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &value| (low.min(value), high.max(value)));
    if low > high {
        return Err(Error::input("filling the gaps of a layer")
            .found("no cell that holds a number")
            .wanted("at least one")
            .mend("check the no-data value and the extent of the layer"));
    }
    let mut filled = values.clone();
    fill(&mut filled, TOLERANCE * (high - low))?;
    Ok(filled)
}

/// Fills in place, coarser levels first. At least one cell is known.
fn fill(values: &mut Array2<f64>, tolerance: f64) -> Result<()> {
    let (rows, cols) = values.dim();
    let gaps: Vec<(usize, usize)> =
        values.indexed_iter().filter(|(_, value)| !value.is_finite()).map(|(index, _)| index).collect();
    if gaps.is_empty() {
        return Ok(());
    }
    let mut coarse = halved(values);
    fill(&mut coarse, tolerance)?;
    let guess = gaps.iter().map(|&(row, col)| interpolated(&coarse, row, col)).collect();
    let mut place = Array2::from_elem((rows, cols), NONE);
    for (index, &cell) in gaps.iter().enumerate() {
        place[cell] = index;
    }
    let mut equations = Vec::with_capacity(gaps.len());
    for &(row, col) in &gaps {
        let mut equation = Equation { neighbours: [NONE; 4], count: 0.0, known: 0.0 };
        let sides = [
            (row > 0).then(|| (row - 1, col)),
            (row + 1 < rows).then_some((row + 1, col)),
            (col > 0).then(|| (row, col - 1)),
            (col + 1 < cols).then_some((row, col + 1)),
        ];
        for (slot, side) in equation.neighbours.iter_mut().zip(sides) {
            let Some(side) = side else { continue };
            equation.count += 1.0;
            *slot = place[side];
            if place[side] == NONE {
                equation.known += values[side];
            }
        }
        equations.push(equation);
    }
    for (&cell, value) in gaps.iter().zip(solve(&equations, guess, tolerance)?) {
        values[cell] = value;
    }
    Ok(())
}

/// The five-point equation of one missing cell: count x value - sum of unknown neighbours = known.
struct Equation {
    neighbours: [usize; 4],
    count: f64,
    known: f64,
}

impl Equation {
    fn apply(&self, at: usize, values: &[f64]) -> f64 {
        let around: f64 = self.neighbours.iter().filter(|side| **side != NONE).map(|side| values[*side]).sum();
        self.count * values[at] - around
    }
}

/// Conjugate gradients on the equations; the matrix is symmetric and, as each gap meets a known cell, positive definite.
fn solve(equations: &[Equation], mut values: Vec<f64>, tolerance: f64) -> Result<Vec<f64>> {
    let mut residual: Vec<f64> =
        equations.iter().enumerate().map(|(at, equation)| equation.known - equation.apply(at, &values)).collect();
    let mut direction = residual.clone();
    let mut square: f64 = residual.iter().map(|value| value * value).sum();
    let most = 1000 + equations.len();
    for _ in 0..most {
        if residual.iter().all(|value| value.abs() <= tolerance) {
            return Ok(values);
        }
        let applied: Vec<f64> = equations.iter().enumerate().map(|(at, row)| row.apply(at, &direction)).collect();
        let bend: f64 = direction.iter().zip(&applied).map(|(a, b)| a * b).sum();
        let step = square / bend;
        for (at, value) in values.iter_mut().enumerate() {
            *value += step * direction[at];
            residual[at] -= step * applied[at];
        }
        let next: f64 = residual.iter().map(|value| value * value).sum();
        let share = next / square;
        square = next;
        for (towards, rest) in direction.iter_mut().zip(&residual) {
            *towards = rest + share * *towards;
        }
    }
    Err(Error::ours("filling the gaps of a layer")
        .found(format!("no convergence after {most} steps for {} missing cells", equations.len()))
        .wanted(format!("residuals below {tolerance:e}")))
}

/// Half the rows and columns: the mean of the known cells in each block of 2 x 2, NaN where none is known.
fn halved(values: &Array2<f64>) -> Array2<f64> {
    let (rows, cols) = values.dim();
    Array2::from_shape_fn((rows.div_ceil(2), cols.div_ceil(2)), |(row, col)| {
        let (mut sum, mut count) = (0.0, 0.0);
        for r in 2 * row..(2 * row + 2).min(rows) {
            for c in 2 * col..(2 * col + 2).min(cols) {
                if values[[r, c]].is_finite() {
                    sum += values[[r, c]];
                    count += 1.0;
                }
            }
        }
        sum / count
    })
}

/// The halved array at the centre of a cell of the full one, bilinear, held at the edge.
fn interpolated(coarse: &Array2<f64>, row: usize, col: usize) -> f64 {
    let pair = |at: usize, len: usize| {
        let middle = ((at as f64 - 0.5) / 2.0).clamp(0.0, (len - 1) as f64);
        let first = middle.floor() as usize;
        (first, (first + 1).min(len - 1), middle - first as f64)
    };
    let (top, bottom, down) = pair(row, coarse.nrows());
    let (left, right, across) = pair(col, coarse.ncols());
    let along = |r: usize| coarse[[r, left]] * (1.0 - across) + coarse[[r, right]] * across;
    along(top) * (1.0 - down) + along(bottom) * down
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_harmonic_polynomial_is_given_back() {
        // x^2 - y^2 and x y satisfy the five-point formula exactly (their fourth differences vanish).
        let truth = Array2::from_shape_fn((40, 50), |(row, col)| {
            let (x, y) = (col as f64 / 10.0 - 2.0, row as f64 / 10.0 - 1.0);
            x * x - y * y + 0.5 * x * y + 3.0
        });
        let mut holed = truth.clone();
        holed.slice_mut(ndarray::s![8..31, 6..44]).fill(f64::NAN);
        let filled = fill_gaps(&holed).unwrap();
        let worst = filled.iter().zip(&truth).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
        assert!(worst < 1e-3, "{worst}");
    }

    #[test]
    fn the_edge_is_natural_and_corners_are_filled() {
        // Known: only the first and the last column of a strip; with no flow across the other edges the answer is linear.
        let mut strip = Array2::from_elem((6, 11), f64::NAN);
        strip.column_mut(0).fill(0.0);
        strip.column_mut(10).fill(10.0);
        for ((_, col), value) in fill_gaps(&strip).unwrap().indexed_iter() {
            assert!((value - col as f64).abs() < 1e-3, "{value} in column {col}");
        }
        // One known cell: the only harmonic answer with natural edges is a constant.
        let mut single = Array2::from_elem((9, 13), f64::NAN);
        single[[8, 12]] = 4.0;
        assert!(fill_gaps(&single).unwrap().iter().all(|value| *value == 4.0));
    }

    #[test]
    fn known_cells_stay_and_the_range_holds() {
        let mut values = Array2::from_shape_fn((33, 47), |(row, col)| ((row * 7919 + col * 104729) % 97) as f64);
        values.slice_mut(ndarray::s![..20, ..15]).fill(f64::NAN);
        values.slice_mut(ndarray::s![25.., 30..]).fill(f64::NAN);
        let filled = fill_gaps(&values).unwrap();
        for (known, value) in values.iter().zip(&filled) {
            assert!(known.is_nan() || known == value);
            // Maximum principle, to the tolerance of the solver.
            assert!((-1e-2..=96.01).contains(value), "{value}");
        }
    }

    #[test]
    fn nothing_known_is_refused() {
        let error = fill_gaps(&Array2::from_elem((9, 9), f64::NAN)).unwrap_err();
        assert!(error.to_string().contains("no cell that holds a number"));
    }
}
