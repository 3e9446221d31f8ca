//! The cells whose centres lie inside a polygon.

use geo::{LineString, Polygon};

use super::{Frame, Mask};

/// Sets the cells whose centre lies inside a polygon in the frame's coordinates; holes are left out.
///
/// Row by row, the edges that cross the line through the centres are sorted and every second interval is filled. An edge
/// counts its lower end and not its upper, an interval its western end and not its eastern, so that a centre on the border
/// of two neighbours belongs to just one of them. The time grows with the vertices, the crossings and the cells filled.
pub(super) fn fill_polygon(mask: &mut Mask, frame: &Frame, polygon: &Polygon<f64>) {
    let mut crossings = Vec::new();
    for ring in std::iter::once(polygon.exterior()).chain(polygon.interiors()) {
        collect_crossings(ring, frame, &mut crossings);
    }
    crossings.sort_unstable_by(|a, b| a.0.cmp(&b.0).then(a.1.total_cmp(&b.1)));
    // A closed ring crosses a line an even number of times, so the pairs never mix rows.
    for pair in crossings.chunks_exact(2) {
        let (row, first, last) = (pair[0].0, first_at_or_after(pair[0].1, frame), first_at_or_after(pair[1].1, frame));
        for col in first..last {
            mask.0[[row, col]] = true;
        }
    }
}

/// Adds (row, easting) for each edge of a ring and each row whose centre line it crosses.
fn collect_crossings(ring: &LineString<f64>, frame: &Frame, crossings: &mut Vec<(usize, f64)>) {
    let northing = |row: usize| frame.position(row as f64, 0.0).1;
    for edge in ring.lines() {
        // From one end whichever way the edge runs, so that neighbours see the same crossing.
        let (low, high) = if edge.start.y <= edge.end.y { (edge.start, edge.end) } else { (edge.end, edge.start) };
        if low.y == high.y {
            continue;
        }
        let bounded = |row: f64| row.clamp(0.0, frame.rows as f64) as usize;
        // One row more on each side: the condition below decides, without rounding.
        let (top, bottom) = (frame.row_col(0.0, high.y).0.floor() - 1.0, frame.row_col(0.0, low.y).0.ceil() + 2.0);
        for row in bounded(top)..bounded(bottom) {
            let y = northing(row);
            if low.y <= y && y < high.y {
                crossings.push((row, low.x + (y - low.y) / (high.y - low.y) * (high.x - low.x)));
            }
        }
    }
}

/// The first column whose centre lies at or east of an easting.
fn first_at_or_after(x: f64, frame: &Frame) -> usize {
    frame.row_col(x, 0.0).1.max(0.0).ceil().min(frame.cols as f64) as usize
}
