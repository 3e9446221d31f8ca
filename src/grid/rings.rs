//! Whether the rings of a polygon enclose what they seem to.

use geo::coordinate_position::CoordPos;
use geo::line_intersection::{LineIntersection, line_intersection};
use geo::{Area, CoordinatePosition, Line, LineString, Polygon};
use rstar::primitives::GeomWithData;
use rstar::{AABB, RTree, RTreeObject};

/// Crossings that reach no farther past an edge than this share of the coordinates are rounding, not crossings.
const ROUNDING: f64 = 1e-9;

/// What is wrong with a polygon, in words, or `None`.
///
/// A polygon is refused when a ring has fewer than three different vertices or no area, a vertex is not a number, two edges
/// cross, or a hole lies outside. Rings that touch themselves or each other enclose a plain area and pass. Edges are
/// compared through an R-tree, so that the time grows little faster than their number.
pub(super) fn fault_of(polygon: &Polygon<f64>) -> Option<String> {
    for ring in rings(polygon) {
        if let Some(at) = ring.0.iter().find(|at| !(at.x.is_finite() && at.y.is_finite())) {
            return Some(format!("a vertex at {}, {}", at.x, at.y));
        }
        let first = ring.0.first();
        let second = ring.0.iter().find(|at| Some(*at) != first);
        if !ring.0.iter().any(|at| Some(at) != first && Some(at) != second) {
            return Some("a ring with fewer than three different vertices".into());
        }
    }
    if let Some((x, y)) = crossing(polygon) {
        return Some(format!("edges that cross at {x}, {y}"));
    }
    let flat = |ring: &LineString<f64>| Polygon::new(ring.clone(), Vec::new()).unsigned_area() == 0.0;
    if rings(polygon).any(flat) {
        return Some("a ring without area".into());
    }
    let outer = Polygon::new(polygon.exterior().clone(), Vec::new());
    let outside = |hole: &&LineString<f64>| {
        let place = |at| outer.coordinate_position(at);
        hole.0.iter().map(place).find(|place| *place != CoordPos::OnBoundary) == Some(CoordPos::Outside)
    };
    let hole = polygon.interiors().iter().find(outside)?;
    Some(format!("a hole at {}, {} outside the outline", hole.0[0].x, hole.0[0].y))
}

fn rings(polygon: &Polygon<f64>) -> impl Iterator<Item = &LineString<f64>> {
    std::iter::once(polygon.exterior()).chain(polygon.interiors())
}

/// The first place where two edges cross, each passing through the other.
fn crossing(polygon: &Polygon<f64>) -> Option<(f64, f64)> {
    let edges: Vec<Line<f64>> =
        rings(polygon).flat_map(LineString::lines).filter(|edge| edge.start != edge.end).collect();
    let indexed: Vec<_> = edges.iter().enumerate().map(|(index, edge)| GeomWithData::new(*edge, index)).collect();
    let tree = RTree::bulk_load(indexed);
    for (index, edge) in edges.iter().enumerate() {
        let bounds: AABB<_> = edge.envelope();
        let crossed = tree
            .locate_in_envelope_intersecting(&bounds)
            .filter(|other| other.data > index)
            .filter_map(|other| Some((other.data, crossing_of(*edge, edges[other.data])?)))
            .min_by_key(|(other, _)| *other);
        if let Some((_, place)) = crossed {
            return Some(place);
        }
    }
    None
}

fn crossing_of(a: Line<f64>, b: Line<f64>) -> Option<(f64, f64)> {
    let Some(LineIntersection::SinglePoint { intersection, is_proper: true }) = line_intersection(a, b) else {
        return None;
    };
    let ends = [a.start, a.end, b.start, b.end];
    let largest = ends.iter().fold(0.0f64, |largest, at| largest.max(at.x.abs()).max(at.y.abs()));
    let off = |at: geo::Coord<f64>, edge: Line<f64>| {
        let (along, aside) = (edge.delta(), at - edge.start);
        (along.x * aside.y - along.y * aside.x).abs() / along.x.hypot(along.y)
    };
    let least = off(a.start, b).min(off(a.end, b)).min(off(b.start, a)).min(off(b.end, a));
    (least > ROUNDING * largest).then_some((intersection.x, intersection.y))
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::polygon;

    #[test]
    fn plain_and_touching_rings_pass() {
        let holed = polygon!(exterior: [(x: 0., y: 0.), (x: 9., y: 0.), (x: 9., y: 9.), (x: 0., y: 9.)],
            interiors: [[(x: 0., y: 3.), (x: 3., y: 2.), (x: 3., y: 4.)]]);
        assert_eq!(fault_of(&holed), None);
        // Two squares that meet at (4, 4), drawn as one ring: it touches itself without crossing.
        let waist = polygon![(x: 0., y: 0.), (x: 4., y: 0.), (x: 4., y: 4.), (x: 8., y: 4.), (x: 8., y: 8.),
            (x: 4., y: 8.), (x: 4., y: 4.), (x: 0., y: 4.)];
        assert_eq!(fault_of(&waist), None);
    }

    #[test]
    fn each_fault_is_named() {
        let bow = polygon![(x: 0., y: 0.), (x: 4., y: 4.), (x: 6., y: 0.), (x: 0., y: 3.)];
        // y = x meets y = 3 - x / 2 at x = 2.
        assert_eq!(fault_of(&bow).unwrap(), "edges that cross at 2, 2");
        let flat = polygon![(x: 0., y: 0.), (x: 4., y: 4.), (x: 8., y: 8.)];
        assert_eq!(fault_of(&flat).unwrap(), "a ring without area");
        let two = polygon![(x: 0., y: 0.), (x: 4., y: 4.), (x: 0., y: 0.)];
        assert_eq!(fault_of(&two).unwrap(), "a ring with fewer than three different vertices");
        let lost = polygon![(x: 0., y: 0.), (x: 4., y: f64::NAN), (x: 8., y: 8.)];
        assert_eq!(fault_of(&lost).unwrap(), "a vertex at 4, NaN");
        let stray = polygon!(exterior: [(x: 0., y: 0.), (x: 9., y: 0.), (x: 9., y: 9.), (x: 0., y: 9.)],
            interiors: [[(x: 20., y: 3.), (x: 23., y: 2.), (x: 23., y: 4.)]]);
        assert_eq!(fault_of(&stray).unwrap(), "a hole at 20, 3 outside the outline");
    }
}
