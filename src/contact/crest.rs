//! Crest points of the horizontal gradient magnitude.

use ndarray::Array2;
use rayon::prelude::*;

use crate::error::Result;
use crate::field::Gradient;

/// A crest must rise above both neighbours by more than this share of the layer's largest gradient. It stands far above
/// the rounding of a transform (about 1e-12) and far below the rise of a real crest: one as broad as 1,000 cells still
/// rises by 1e-6 of itself within a cell.
const RISE: f64 = 1e-7;

/// In how many of the four directions a crest must stand above its neighbours.
const LEAST_DIRECTIONS: u8 = 2;

/// The four directions through a cell, as (rows, columns) of the step.
const DIRECTIONS: [(isize, isize); 4] = [(0, 1), (1, 0), (1, 1), (1, -1)];

/// A point on a crest of the horizontal gradient magnitude.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CrestPoint {
    /// (row, column) of the cell that holds it.
    pub cell: (usize, usize),
    /// Fractional row of the crest; whole numbers are cell centres.
    pub row: f64,
    /// Fractional column.
    pub col: f64,
    /// The gradient on the crest, units of the field per metre.
    pub strength: f64,
    /// In how many of the four directions (2 to 4) the cell stands above its neighbours.
    pub directions: u8,
}

/// Crest points in row order, at most one for a cell.
///
/// Each cell whose eight neighbours all hold a number is compared with the two neighbours in each of four directions
/// (along the row, the column and both diagonals). Where it stands above both, a parabola through the three values gives
/// the crest's place and height. A cell is a crest where at least 2 directions agree. To stand above means by more than
/// 1e-7 of the layer's largest gradient, which no rounding reaches; where a crest runs midway between two cells that are
/// equal to within that, the next cell beyond decides.
///
/// The place is taken from the direction in which the parabola bends most, which is the one that crosses the crest most
/// squarely; it is at most half a step from the cell's centre.
///
/// Source: Blakely & Simpson (1986), Approximating edges of source bodies from magnetic or gravity anomalies, Geophysics 51,
/// 1494-1498; they take the place from the direction with the largest value, which on a straight oblique crest may
/// be one nearly along it.
///
/// # Errors
/// Only a defect in the shapes of the gradient.
pub fn crest_points(gradient: &Gradient) -> Result<Vec<CrestPoint>> {
    Ok(points(&gradient.horizontal()))
}

/// As [`crest_points`], of the magnitude itself.
pub(super) fn points(strength: &Array2<f64>) -> Vec<CrestPoint> {
    let largest = strength.iter().copied().filter(|value| value.is_finite()).fold(0.0, f64::max);
    let (rows, cols) = strength.dim();
    (1..rows.saturating_sub(1))
        .into_par_iter()
        .flat_map_iter(|row| {
            (1..cols.saturating_sub(1)).filter_map(move |col| crest_at(strength, row, col, RISE * largest))
        })
        .collect()
}

/// The crest in one cell.
fn crest_at(strength: &Array2<f64>, row: usize, col: usize, rise: f64) -> Option<CrestPoint> {
    let middle = strength[[row, col]];
    let mut directions = 0;
    let (mut sharpest, mut best) = (0.0, (0.0, 0.0, middle));
    for (down, across) in DIRECTIONS {
        let before = strength[[row.wrapping_add_signed(-down), col.wrapping_add_signed(-across)]];
        let after = strength[[row.wrapping_add_signed(down), col.wrapping_add_signed(across)]];
        if !(before.is_finite() && after.is_finite() && middle.is_finite()) {
            return None;
        }
        let falls = |next: f64, down: isize, across: isize| {
            middle - next > rise
                || ((middle - next).abs() <= rise && middle - two_away(strength, (row, col), down, across) > rise)
        };
        if falls(before, -down, -across) && falls(after, down, across) {
            directions += 1;
            let bend = (before - 2.0 * middle + after) / 2.0;
            let slope = (after - before) / 2.0;
            let squared_step = (down * down + across * across) as f64;
            if bend / squared_step < sharpest {
                sharpest = bend / squared_step;
                let shift = -slope / (2.0 * bend);
                best = (shift * down as f64, shift * across as f64, middle - slope * slope / (4.0 * bend));
            }
        }
    }
    (directions >= LEAST_DIRECTIONS).then_some(CrestPoint {
        cell: (row, col),
        row: row as f64 + best.0,
        col: col as f64 + best.1,
        strength: best.2,
        directions,
    })
}

/// The value two steps away, or infinity where there is none.
fn two_away(strength: &Array2<f64>, (row, col): (usize, usize), down: isize, across: isize) -> f64 {
    let place = (row.wrapping_add_signed(2 * down), col.wrapping_add_signed(2 * across));
    strength.get(place).copied().filter(|value| value.is_finite()).unwrap_or(f64::INFINITY)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;

    fn gradient(east: Array2<f64>) -> Gradient {
        let shape = east.dim();
        let frame = Frame::local(1.0, shape.0, shape.1).unwrap();
        Gradient::new(frame, east, Array2::zeros(shape), Array2::zeros(shape)).unwrap()
    }

    #[test]
    fn a_parabola_is_placed_exactly() {
        // Source: the vertex of 30 - (col - 4.3)^2 stands at column 4.3 with height 30.
        let east = Array2::from_shape_fn((7, 9), |(_, col)| 30.0 - (col as f64 - 4.3).powi(2));
        let crests = crest_points(&gradient(east)).unwrap();
        assert_eq!(crests.len(), 5);
        for crest in crests {
            assert!((crest.col - 4.3).abs() < 1e-9 && (crest.strength - 30.0).abs() < 1e-9);
            assert_eq!((crest.cell.1, crest.directions), (4, 3));
            assert_eq!(crest.row, crest.cell.0 as f64);
        }
    }

    #[test]
    fn a_crest_midway_between_cells_is_found_and_a_terrace_is_not() {
        // Source: the vertex of the same parabola between two cells; both give one place.
        let midway = Array2::from_shape_fn((7, 10), |(_, col)| 30.0 - (col as f64 - 4.5).powi(2));
        let crests = crest_points(&gradient(midway)).unwrap();
        assert_eq!(crests.len(), 10);
        assert!(crests.iter().all(|crest| (crest.col - 4.5).abs() < 1e-9));
        let terrace = Array2::from_shape_fn((7, 10), |(_, col)| (col as f64).min(5.0));
        assert!(crest_points(&gradient(terrace)).unwrap().is_empty());
    }

    #[test]
    fn a_peak_agrees_in_four_directions_and_gaps_are_passed_over() {
        let peak =
            Array2::from_shape_fn((9, 9), |(row, col)| 50.0 - (col as f64 - 4.0).powi(2) - (row as f64 - 4.0).powi(2));
        let crests = crest_points(&gradient(peak.clone())).unwrap();
        assert!(crests.iter().any(|crest| crest.cell == (4, 4) && crest.directions == 4));
        let mut holed = peak;
        holed[[3, 3]] = f64::NAN;
        assert!(crest_points(&gradient(holed)).unwrap().iter().all(|crest| crest.cell != (4, 4)));
    }

    #[test]
    fn a_layer_too_small_for_a_window_has_no_crest() {
        assert!(crest_points(&gradient(Array2::ones((2, 9)))).unwrap().is_empty());
        assert!(crest_points(&gradient(Array2::ones((1, 1)))).unwrap().is_empty());
    }
}
