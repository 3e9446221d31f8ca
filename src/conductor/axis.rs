//! The principal axis of a body.

use geo::{Coord, Line};

use crate::grid::Frame;

/// The principal axis of a set of cells.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Axis {
    /// Centre of the cells, m.
    pub centroid: (f64, f64),
    /// The axis through the centroid.
    pub line: Line<f64>,
    /// Degrees clockwise from grid north in [0, 180); NaN without a longest direction.
    pub strike_deg: f64,
    /// Ratio of the longest to the shortest spread.
    pub elongation: f64,
}

/// The principal axis of cells, from the second moments of the ground they cover (each cell adds its own side^2 / 12).
///
/// The axis is 4 sqrt(lambda) long, lambda being the larger moment: for an ellipse that is its longest diameter. Elongation
/// is the square root of the ratio of the moments. A body without a longest direction (the moments differ by less than
/// 1e-9 of themselves, as for a single cell or a square) has strike NaN, and its axis is drawn toward north.
pub(super) fn principal_axis(cells: &[(usize, usize)], frame: &Frame) -> Axis {
    let count = cells.len().max(1) as f64;
    let row = cells.iter().map(|cell| cell.0 as f64).sum::<f64>() / count;
    let col = cells.iter().map(|cell| cell.1 as f64).sum::<f64>() / count;
    let (mut xx, mut xy, mut yy) = (1.0 / 12.0, 0.0, 1.0 / 12.0);
    for cell in cells {
        let (x, y) = (cell.1 as f64 - col, row - cell.0 as f64);
        xx += x * x / count;
        xy += x * y / count;
        yy += y * y / count;
    }
    let (half_sum, half_gap) = ((xx + yy) / 2.0, ((yy - xx) / 2.0).hypot(xy));
    let (longest, shortest) = (half_sum + half_gap, half_sum - half_gap);
    let directed = half_gap > 1e-9 * half_sum;
    // The moment along azimuth t is half_sum + half_gap cos(2 (t - strike)).
    let strike = if directed { (2.0 * xy).atan2(yy - xx).to_degrees() / 2.0 } else { 0.0 };
    let strike = if strike < 0.0 { strike + 180.0 } else { strike } % 180.0;
    let reach = 2.0 * longest.sqrt() * frame.cell;
    let (sin, cos) = strike.to_radians().sin_cos();
    let (x, y) = frame.position(row, col);
    let along = Coord { x: reach * sin, y: reach * cos };
    let middle = Coord { x, y };
    Axis {
        centroid: (x, y),
        line: Line::new(middle - along, middle + along),
        strike_deg: if directed { strike } else { f64::NAN },
        elongation: (longest / shortest).sqrt(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::{Euclidean, Length};

    #[test]
    fn an_ellipse_has_its_own_axis() {
        // Source: the second moment of an ellipse along its half axis a is a^2 / 4, hence length 2 a and elongation a / b.
        let frame = Frame::local(10.0, 200, 200).unwrap();
        for strike in [0.0, 30.0, 90.0, 135.0] {
            let (sin, cos) = f64::to_radians(strike).sin_cos();
            let inside = |row: usize, col: usize| {
                let (x, y) = (col as f64 - 100.0, 95.0 - row as f64);
                ((x * sin + y * cos) / 80.0).powi(2) + ((x * cos - y * sin) / 20.0).powi(2) <= 1.0
            };
            let cells: Vec<_> =
                (0..40_000).map(|at| (at / 200, at % 200)).filter(|(row, col)| inside(*row, *col)).collect();
            let axis = principal_axis(&cells, &frame);
            assert!((axis.strike_deg - strike).abs() < 0.2, "{}", axis.strike_deg);
            assert!((axis.elongation / 4.0 - 1.0).abs() < 0.01, "{}", axis.elongation);
            assert!((Euclidean.length(&axis.line) / 1600.0 - 1.0).abs() < 0.01);
            let (x, y) = frame.position(95.0, 100.0);
            assert!((axis.centroid.0 - x).abs() < 1e-6 && (axis.centroid.1 - y).abs() < 1e-6);
        }
    }

    #[test]
    fn a_single_cell_has_no_strike() {
        let axis = principal_axis(&[(2, 3)], &Frame::local(1.0, 5, 5).unwrap());
        assert!(axis.strike_deg.is_nan());
        assert_eq!((axis.elongation, axis.centroid), (1.0, (3.5, 2.5)));
    }
}
