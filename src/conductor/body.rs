//! Bodies of a slice beyond a threshold.

use std::cmp::Reverse;

use geo::Line;
use ndarray::Array2;

use super::axis::principal_axis;
use super::label::{Connection, labels, pieces};
use super::threshold::{Side, Threshold};
use crate::error::{Error, Result};
use crate::grid::{Frame, Grid, Mask};

/// The bodies of one slice.
#[derive(Debug, Clone)]
pub struct Bodies {
    /// The threshold in log10 ohm m.
    pub threshold_log10: f64,
    /// The cells of all bodies; pieces below the least area are not among them.
    pub mask: Mask,
    /// The number of the body that each cell belongs to; 0 for none.
    pub labels: Array2<u32>,
    /// The bodies, the largest first; those of one size in the order of their first cells, by rows from the north.
    pub bodies: Vec<Body>,
}

/// A connected body.
#[derive(Debug, Clone, PartialEq)]
pub struct Body {
    /// Its number in [`Bodies::labels`]; 1 for the largest.
    pub id: u32,
    /// How many cells it covers.
    pub cells: usize,
    /// Area, m2.
    pub area_m2: f64,
    /// Mean log10 resistivity, ohm m.
    pub mean_log10: f64,
    /// Most extreme log10 resistivity: the least of a conductor, the largest of a resistor.
    pub peak_log10: f64,
    /// Easting and northing of the most extreme cell's centre, m.
    pub peak: (f64, f64),
    /// Easting and northing of the centre of area, m.
    pub centroid: (f64, f64),
    /// Principal axis through the centroid, map coordinates: 4 sqrt(lambda) long, lambda the larger second moment; for an
    /// ellipse its longest diameter.
    pub axis: Line<f64>,
    /// Strike of the axis, degrees clockwise from grid north in [0, 180); NaN for a body without a longest direction,
    /// such as a single cell.
    pub strike_deg: f64,
    /// Ratio of the spread along the axis to that across it, 1 or more.
    pub elongation: f64,
}

/// A quantile may take in this many times its share of cells before it counts as no threshold at all.
const MOST_TIES: f64 = 1.25;

/// Finds the bodies of a slice of log10 resistivity (ohm m) on one side of a threshold.
///
/// Bodies hang together by sides and corners; those that cover less than `least_area_m2` (m2) are left out, of the mask
/// too. `seed` serves [`Threshold::Mixture`] only.
///
/// ```
/// use ndarray::array;
/// use salband::conductor::{Side, Threshold, find_bodies};
/// use salband::grid::{Frame, Grid};
/// let slice = Grid::new(Frame::local(100.0, 2, 3)?, array![[1.0, 3.0, 3.0], [1.2, 3.0, 1.4]])?;
/// let found = find_bodies(&slice, Side::Conductor, Threshold::Absolute(30.0), 0.0, 1)?;
/// assert_eq!(found.labels, array![[1, 0, 0], [1, 0, 2]]);
/// assert_eq!(found.bodies[0].area_m2, 20_000.0);
/// # Ok::<(), salband::Error>(())
/// ```
///
/// # Errors
/// A slice without data or with one value throughout; a bad threshold or least area; a mixture that does not
/// separate; a quantile whose value so many cells share that far more than its share would count. A slice without a body is an outcome, not an error: its list is empty.
pub fn find_bodies(slice: &Grid, side: Side, threshold: Threshold, least_area_m2: f64, seed: u64) -> Result<Bodies> {
    if !(least_area_m2.is_finite() && least_area_m2 >= 0.0) {
        return Err(Error::input(format!("the least area of a {}", side.word()))
            .found(least_area_m2)
            .wanted("zero or a positive number of m2")
            .mend("set least_area"));
    }
    let known: Vec<f64> = slice.values().iter().copied().filter(|value| value.is_finite()).collect();
    match slice.range() {
        None => {
            return Err(Error::input("a resistivity slice")
                .found("no cell that holds a number")
                .wanted("data on the frame")
                .mend("check the no-data value, and that the slice overlaps the frame"));
        }
        Some((low, high)) if low == high => {
            return Err(Error::input("a resistivity slice")
                .found(format!("the slice is constant: log10 resistivity {low} in every cell"))
                .wanted("a slice that varies")
                .mend("check that this is the right band of the file, or leave the slice out"));
        }
        Some(_) => {}
    }
    let threshold_log10 = threshold.of(&known, seed)?;
    let beyond = Mask(slice.values().mapv(|value| side.holds(value, threshold_log10)));
    refuse_ties(side, threshold, threshold_log10, beyond.count(), known.len())?;
    let frame = slice.frame();
    let mut kept = pieces(&beyond, Connection::SidesAndCorners);
    kept.sort_by_key(|cells| Reverse(cells.len()));
    kept.retain(|cells| cells.len() as f64 * frame.cell_area() >= least_area_m2);
    let labels = labels(frame.shape(), &kept);
    let mask = Mask(labels.mapv(|label| label != 0));
    let bodies = (1..).zip(&kept).map(|(id, cells)| body(id, cells, slice.values(), frame, side)).collect();
    Ok(Bodies { threshold_log10, mask, labels, bodies })
}

/// Refuses a quantile that many cells share, as where an inversion leaves its starting model: all of them would count.
fn refuse_ties(side: Side, threshold: Threshold, log10: f64, found: usize, cells: usize) -> Result<()> {
    let Threshold::Quantile(quantile) = threshold else { return Ok(()) };
    let (wanted, limit) = match side {
        Side::Conductor => (1.0 - quantile, "below"),
        Side::Resistor => (quantile, "above"),
    };
    if found as f64 <= MOST_TIES * wanted * cells as f64 + 1.0 {
        return Ok(());
    }
    Err(Error::input(format!("the {}s of a slice", side.word()))
        .found(format!(
            "{:.0} % of the cells at or beyond the {quantile} quantile, because many hold its value, {:.4} ohm m",
            100.0 * found as f64 / cells as f64,
            10.0_f64.powf(log10)
        ))
        .wanted(format!("about {:.0} %", 100.0 * wanted))
        .mend(format!("set a limit in ohm m instead: {{ {limit} = ... }}")))
}

fn body(id: u32, cells: &[(usize, usize)], values: &Array2<f64>, frame: &Frame, side: Side) -> Body {
    let mut peak = (cells[0], values[cells[0]]);
    let mut sum = 0.0;
    for &cell in cells {
        let value = values[cell];
        sum += value;
        let further = match side {
            Side::Conductor => value < peak.1,
            Side::Resistor => value > peak.1,
        };
        if further {
            peak = (cell, value);
        }
    }
    let axis = principal_axis(cells, frame);
    let ((row, col), peak_log10) = peak;
    Body {
        id,
        cells: cells.len(),
        area_m2: cells.len() as f64 * frame.cell_area(),
        mean_log10: sum / cells.len() as f64,
        peak_log10,
        peak: frame.position(row as f64, col as f64),
        centroid: axis.centroid,
        axis: axis.line,
        strike_deg: axis.strike_deg,
        elongation: axis.elongation,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;
    use proptest::prelude::*;

    fn grid(values: Array2<f64>) -> Grid {
        let (rows, cols) = values.dim();
        Grid::new(Frame::local(10.0, rows, cols).unwrap(), values).unwrap()
    }

    fn example() -> Grid {
        grid(array![
            [1.0, 1.1, 3.0, 3.0, 0.5],
            [3.0, 3.0, 0.9, 3.0, 3.0],
            [f64::NAN, 3.0, 3.0, 3.0, 3.0],
            [3.4, 3.5, 3.0, 1.2, 1.3],
        ])
    }

    #[test]
    fn bodies_are_joined_at_corners_and_ordered_by_size() {
        let found = find_bodies(&example(), Side::Conductor, Threshold::Absolute(100.0), 0.0, 0).unwrap();
        assert_eq!(found.threshold_log10, 2.0);
        let expected = array![[1, 1, 0, 0, 3], [0, 0, 1, 0, 0], [0, 0, 0, 0, 0], [0, 0, 0, 2, 2]];
        assert_eq!(found.labels, expected);
        let first = &found.bodies[0];
        assert_eq!((first.id, first.cells, first.area_m2, first.peak_log10), (1, 3, 300.0, 0.9));
        assert_eq!(first.peak, found_place(1, 2));
        assert!((first.mean_log10 - 1.0).abs() < 1e-12);
        assert_eq!(found.bodies[1].strike_deg, 90.0);
        assert!(found.bodies[2].strike_deg.is_nan());
        let larger = find_bodies(&example(), Side::Conductor, Threshold::Absolute(100.0), 200.0, 0).unwrap();
        assert_eq!((larger.bodies.len(), larger.mask.count()), (2, 5));
    }

    fn found_place(row: usize, col: usize) -> (f64, f64) {
        example().frame().position(row as f64, col as f64)
    }

    #[test]
    fn resistors_lie_on_the_other_side() {
        let found = find_bodies(&example(), Side::Resistor, Threshold::Absolute(2000.0), 0.0, 0).unwrap();
        assert_eq!(found.bodies.len(), 1);
        assert_eq!((found.bodies[0].cells, found.bodies[0].peak_log10), (2, 3.5));
    }

    #[test]
    fn no_body_and_all_one_body_are_outcomes() {
        let count = |ohm_m, area| {
            let found = find_bodies(&example(), Side::Conductor, Threshold::Absolute(ohm_m), area, 0).unwrap();
            (found.bodies.len(), found.mask.count())
        };
        assert_eq!(count(1.0, 0.0), (0, 0));
        assert_eq!(count(1e6, 0.0), (1, 19));
        assert_eq!(count(100.0, 1e9), (0, 0));
    }

    #[test]
    fn a_quantile_that_most_cells_share_is_refused() {
        let starting = grid(Array2::from_shape_fn((40, 40), |(row, col)| if row == 3 && col < 9 { 1.0 } else { 2.0 }));
        let refused = |side, q| find_bodies(&starting, side, Threshold::Quantile(q), 0.0, 0).unwrap_err().to_string();
        assert!(
            refused(Side::Conductor, 0.8).contains("found 100 % of the cells"),
            "{}",
            refused(Side::Conductor, 0.8)
        );
        assert!(refused(Side::Resistor, 0.2).contains("above = ..."));
        assert_eq!(find_bodies(&starting, Side::Conductor, Threshold::Absolute(50.0), 0.0, 0).unwrap().mask.count(), 9);
    }

    #[test]
    fn each_slice_or_setting_that_cannot_be_used_is_refused() {
        let refused = |slice: &Grid, threshold, area| {
            find_bodies(slice, Side::Conductor, threshold, area, 0).unwrap_err().to_string()
        };
        let flat = grid(array![[2.0, 2.0], [f64::NAN, 2.0]]);
        assert!(refused(&flat, Threshold::Quantile(0.8), 0.0).contains("the slice is constant"));
        let empty = grid(array![[f64::NAN, f64::NAN]]);
        assert!(refused(&empty, Threshold::Quantile(0.8), 0.0).contains("no cell that holds a number"));
        assert!(refused(&example(), Threshold::Absolute(f64::NAN), 0.0).contains("NaN"));
        assert!(refused(&example(), Threshold::Quantile(1.0), 0.0).contains("between 0 and 1"));
        assert!(refused(&example(), Threshold::Mixture, 0.0).contains("19 cells"));
        for area in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(refused(&example(), Threshold::Absolute(100.0), area).contains("least area"));
        }
    }

    prop_compose! {
        fn slices()(rows in 3_usize..14, cols in 3_usize..14)
            (values in proptest::collection::vec(0.0..4.0_f64, rows * cols), rows in Just(rows), cols in Just(cols))
            -> Array2<f64> {
            Array2::from_shape_vec((rows, cols), values).unwrap()
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(64) })]

        #[test]
        fn areas_add_up_and_labels_are_connected(values in slices(), share in 0.3..0.9_f64) {
            let found = find_bodies(&grid(values), Side::Conductor, Threshold::Quantile(share), 200.0, 0);
            prop_assume!(found.is_ok());
            let found = found.unwrap();
            let area: f64 = found.bodies.iter().map(|body| body.area_m2).sum();
            prop_assert_eq!(area, found.mask.count() as f64 * 100.0);
            for body in &found.bodies {
                prop_assert!(body.area_m2 >= 200.0 && body.elongation >= 1.0);
                prop_assert!(body.peak_log10 <= body.mean_log10 && body.mean_log10 <= found.threshold_log10);
                let own = Mask(found.labels.mapv(|label| label == body.id));
                prop_assert_eq!(own.count(), body.cells);
                prop_assert_eq!(pieces(&own, Connection::SidesAndCorners).len(), 1);
            }
            // Cells that touch belong to one body.
            for ((row, col), &label) in found.labels.indexed_iter() {
                for (down, across) in [(0, 1), (1, 0), (1, 1)] {
                    let beside = found.labels.get((row + down, col + across)).copied().unwrap_or(0);
                    prop_assert!(label == 0 || beside == 0 || label == beside);
                }
            }
        }

        #[test]
        fn transposing_the_slice_reflects_the_strikes(values in slices()) {
            // Swapping rows and columns turns the direction (east, north) into (-north, -east): azimuth t becomes 90 - t.
            let of = |values: Array2<f64>| find_bodies(&grid(values), Side::Resistor, Threshold::Quantile(0.2), 0.0, 0);
            let turned = Array2::from_shape_fn((values.ncols(), values.nrows()), |(row, col)| values[[col, row]]);
            let (Ok(before), Ok(after)) = (of(values), of(turned)) else { return Err(TestCaseError::reject("refused")) };
            prop_assert_eq!(&before.mask.0.t(), &after.mask.0);
            for body in &before.bodies {
                let twin = after.bodies.iter().find(|twin| twin.peak_log10 == body.peak_log10).unwrap();
                prop_assert_eq!(twin.cells, body.cells);
                prop_assert_eq!(twin.strike_deg.is_nan(), body.strike_deg.is_nan());
                if body.strike_deg.is_finite() {
                    let turn = (90.0 - body.strike_deg - twin.strike_deg).rem_euclid(180.0);
                    prop_assert!(turn.min(180.0 - turn) < 1e-6, "{} {}", body.strike_deg, twin.strike_deg);
                }
            }
        }
    }
}
