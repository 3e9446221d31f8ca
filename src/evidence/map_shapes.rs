//! Bodies, contacts and gaps as path data.

use geo::{LineString, MultiPolygon};

use super::figure::path_data;
use super::map::{ContactLine, Projection, Side};
use crate::grid::{Frame, Mask};

/// Distance between two ticks of a contact, and the length of a tick, in units of the figure.
const TICK_EVERY: f64 = 13.0;
const TICK_LENGTH: f64 = 5.0;

/// A line, or a ring where it is closed.
pub(super) fn line_data(line: &LineString<f64>, projection: &Projection, closed: bool) -> String {
    let finite = line.0.iter().filter(|place| place.x.is_finite() && place.y.is_finite());
    path_data(finite.map(|place| projection.at(place.x, place.y)), closed)
}

/// A body with its holes.
pub(super) fn area_data(area: &MultiPolygon<f64>, projection: &Projection) -> String {
    let rings = area.0.iter().flat_map(|part| std::iter::once(part.exterior()).chain(part.interiors()));
    rings.map(|ring| line_data(ring, projection, true)).collect()
}

/// The line of a contact.
pub(super) fn contact_data(contact: &ContactLine, projection: &Projection) -> String {
    line_data(&contact.line, projection, false)
}

/// Short ticks at equal distances along a contact, on its dense side; nothing where that side is not known.
pub(super) fn tick_data(contact: &ContactLine, projection: &Projection) -> String {
    let Some(side) = contact.dense_side else { return String::new() };
    // Northings grow upwards and places downwards, so left of the direction is (dy, -dx) in places.
    let sign = if side == Side::Left { 1.0 } else { -1.0 };
    let mut data = String::new();
    let mut to_next = TICK_EVERY / 2.0;
    for segment in contact.line.lines() {
        let (x1, y1) = projection.at(segment.start.x, segment.start.y);
        let (x2, y2) = projection.at(segment.end.x, segment.end.y);
        let length = (x2 - x1).hypot(y2 - y1);
        if !(length.is_finite() && length > 0.0) {
            continue;
        }
        let (along_x, along_y) = ((x2 - x1) / length, (y2 - y1) / length);
        while to_next <= length {
            let (x, y) = (x1 + along_x * to_next, y1 + along_y * to_next);
            let tip = (x + sign * along_y * TICK_LENGTH, y - sign * along_x * TICK_LENGTH);
            data.push_str(&path_data([(x, y), tip], false));
            to_next += TICK_EVERY;
        }
        to_next -= length;
    }
    data
}

/// The cells without data.
///
/// Runs of cells that repeat from row to row are joined into one rectangle, so that the file stays small.
pub(super) fn void_data(footprint: &Mask, frame: &Frame, projection: &Projection) -> String {
    let mut area = String::new();
    let mut open: Vec<(usize, usize, usize)> = Vec::new();
    let (rows, cols) = footprint.shape();
    for row in 0..=rows {
        let runs = if row < rows { runs_without(footprint, row, cols) } else { Vec::new() };
        open.retain(|&(first_row, start, end)| {
            let goes_on = runs.contains(&(start, end));
            if !goes_on {
                let (left, top) =
                    projection.at(frame.west + start as f64 * frame.cell, frame.north - first_row as f64 * frame.cell);
                let (right, bottom) =
                    projection.at(frame.west + end as f64 * frame.cell, frame.north - row as f64 * frame.cell);
                area.push_str(&path_data([(left, top), (right, top), (right, bottom), (left, bottom)], true));
            }
            goes_on
        });
        for (start, end) in runs {
            if !open.iter().any(|&(_, open_start, open_end)| (open_start, open_end) == (start, end)) {
                open.push((row, start, end));
            }
        }
    }
    area
}

/// Runs of unset cells in a row, as first column and the one behind the last.
fn runs_without(footprint: &Mask, row: usize, cols: usize) -> Vec<(usize, usize)> {
    let mut runs = Vec::new();
    let mut start = None;
    for col in 0..=cols {
        let unset = col < cols && !footprint.0[(row, col)];
        match (start, unset) {
            (None, true) => start = Some(col),
            (Some(from), false) => {
                runs.push((from, col));
                start = None;
            }
            _ => {}
        }
    }
    runs
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn gaps_are_joined_into_rectangles() {
        let mask = Mask(array![[true, false, false], [true, false, false], [false, false, true]]);
        assert_eq!(runs_without(&mask, 0, 3), [(1, 3)]);
        assert_eq!(runs_without(&mask, 2, 3), [(0, 2)]);
    }
}
