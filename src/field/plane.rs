//! The regional plane that is taken out before a transform.

use ndarray::{Array2, ArrayView1};

use super::dense::product_with_transpose;
use crate::grid::Plane;

/// The least-squares plane through the rim of the footprint: the first and last cell that holds a number in each row and
/// column; level zero where no cell does, and no slope where the cells cannot tell one.
///
/// The rim, not the whole: a body in the middle of a survey would tilt and lift a plane through all cells. It is where
/// [`super::sources::fit`] starts from.
pub(super) fn regional_plane(values: &Array2<f64>) -> Plane {
    let rim = rim(values);
    let (rows, cols) = values.dim();
    let (middle, longest) = ((rows as f64 / 2.0, cols as f64 / 2.0), rows.max(cols) as f64);
    let mean = rim.iter().map(|cell| values[*cell]).sum::<f64>() / rim.len().max(1) as f64;
    let equations: Vec<Vec<f64>> = rim
        .iter()
        .map(|&(row, col)| {
            let place = ((row as f64 - middle.0) / longest, (col as f64 - middle.1) / longest);
            vec![1.0, place.0, place.1, values[[row, col]] - mean]
        })
        .collect();
    let mut normal = product_with_transpose(&equations);
    if !rim.is_empty() {
        // Far below what can be seen, and enough to leave out a slope that the cells do not tell.
        (0..3).for_each(|at| normal.raise(at, 1e-13 * rim.len() as f64));
    }
    let mut plane = Plane::flat(mean);
    if let Some([level, down, right]) = normal.solved().as_deref() {
        plane.down = down / longest;
        plane.right = right / longest;
        plane.level += level - plane.down * middle.0 - plane.right * middle.1;
    }
    plane
}

/// The first and last cell that holds a number in each row and column; one that is both counts twice.
fn rim(values: &Array2<f64>) -> Vec<(usize, usize)> {
    let ends = |line: ArrayView1<f64>| {
        let known = |at: &usize| line[*at].is_finite();
        let first = (0..line.len()).find(known);
        first.into_iter().chain((0..line.len()).rev().find(known)).collect::<Vec<_>>()
    };
    let along_rows = values.rows().into_iter().enumerate();
    let along_cols = values.columns().into_iter().enumerate();
    along_rows
        .flat_map(|(row, line)| ends(line).into_iter().map(move |col| (row, col)))
        .chain(along_cols.flat_map(|(col, line)| ends(line).into_iter().map(move |row| (row, col))))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_hill_in_the_middle_does_not_tilt_the_plane() {
        let mut values = Array2::from_shape_fn((15, 15), |(_, col)| col as f64);
        values.slice_mut(ndarray::s![3..9, 8..13]).fill(40.0);
        let plane = regional_plane(&values);
        assert!((plane.right - 1.0).abs() < 1e-12 && plane.down.abs() < 1e-12, "{plane:?}");
    }

    #[test]
    fn a_plane_with_gaps_is_found() {
        let mut values = Array2::from_shape_fn((12, 17), |(row, col)| 7.0 + 0.02 * col as f64 - 0.03 * row as f64);
        values.slice_mut(ndarray::s![..5, 9..]).fill(f64::NAN);
        let plane = regional_plane(&values);
        assert!((plane.right - 0.02).abs() < 1e-12 && (plane.down + 0.03).abs() < 1e-12);
        assert!((plane.at(11, 3) - values[[11, 3]]).abs() < 1e-9);
        assert_eq!(regional_plane(&Array2::from_elem((3, 3), f64::NAN)), Plane::flat(0.0));
    }
}
