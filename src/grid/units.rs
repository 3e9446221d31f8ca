//! Mapped units from a vector file: polygons as cells of the frame, and their boundaries.

use geo::orient::Direction;
use geo::{Area, BooleanOps, BoundingRect, Geometry, Intersects, LineString, Orient, Polygon, Rect, unary_union};

use super::bend::carry_lines;
use super::clip::clip_line;
use super::fill::fill_polygon;
use super::lines::{LEAST, STRAY, ground};
use super::rings::fault_of;
use super::vector::{Shapes, VectorSource};
use super::{Frame, Mask};
use crate::error::{Error, Result};

/// How near the edge of the frame, in cells, a boundary counts as drawn along it.
const ALONG: f64 = 1e-6;

/// Mapped units on a frame.
#[derive(Debug, Clone)]
pub struct Units {
    /// The cells whose centre lies inside a unit; shape (rows, columns) of the frame.
    pub mask: Mask,
    /// The boundaries between units and other ground inside the frame, in its coordinates (m). Boundaries between two
    /// of the units are not among them, nor is the edge of the frame.
    pub outlines: Vec<LineString<f64>>,
    /// Area of the units inside the frame, m2: that of the polygons, not of the cells.
    pub area_m2: f64,
    /// Number of features that reach the frame.
    pub features: usize,
    /// What a reader should know, a sentence each without a full stop; empty if nothing is unusual.
    pub notes: Vec<String>,
}

/// A polygon in the frame's system, and the feature that it comes from.
struct Placed {
    id: u64,
    polygon: Polygon<f64>,
}

/// Reads the polygons of one layer of a vector file as mapped units on a frame.
///
/// Steps: vertices are carried into the frame's system, with vertices added where a long edge bends by more than a
/// hundredth of a cell; rings are checked; cells are set by their centres, holes left out and overlaps counted once; the
/// polygons are merged, and the boundary of the merged ground is cut at the frame.
///
/// Neighbours merge where they share their vertices. A gap between them, however thin, is other ground, and has boundaries.
///
/// # Errors
/// A file that is not there or not a vector file, no such layer, no coordinate system, a filter that names no column or
/// leaves nothing, vertices that have no place in the frame's system, no polygon, none on the frame, none with a cell
/// centre inside, or a polygon on the frame whose rings enclose no plain area.
pub fn read_units(source: &VectorSource, frame: &Frame) -> Result<Units> {
    read(source, frame).map_err(|error| error.file(&source.path))
}

fn read(source: &VectorSource, frame: &Frame) -> Result<Units> {
    let found = source.shapes("polygons")?;
    let placed = place(&found, frame)?;
    let mut ids: Vec<u64> = placed.iter().map(|placed| placed.id).collect();
    ids.sort_unstable();
    ids.dedup();
    let mut mask = Mask::none(frame.shape());
    for Placed { polygon, .. } in &placed {
        fill_polygon(&mut mask, frame, polygon);
    }
    if mask.is_empty() {
        return Err(Error::input("the polygons")
            .found(format!("{} on the frame, without a cell centre inside", placed.len()))
            .wanted("units at least as wide as a cell")
            .mend(format!("choose cells smaller than {} m, or use the outlines under [[lines]]", frame.cell)));
    }
    let turned: Vec<Polygon<f64>> =
        placed.into_iter().map(|placed| placed.polygon.orient(Direction::Default)).collect();
    // A single polygon keeps its vertices to the last digit.
    let merged: Vec<Polygon<f64>> = if turned.len() == 1 { turned } else { unary_union(&turned).0 };
    let bounds = ground(frame, 0.0);
    let area = |polygon: &Polygon<f64>| polygon.intersection(&bounds.to_polygon()).unsigned_area();
    let rings = merged.iter().flat_map(|polygon| std::iter::once(polygon.exterior()).chain(polygon.interiors()));
    let outlines: Vec<LineString<f64>> = rings
        .flat_map(|ring| clip_line(ring, &bounds, LEAST * frame.cell))
        .flat_map(|line| off_edge(&line, frame))
        .collect();
    let mut notes = Vec::new();
    if mask.count() == frame.rows * frame.cols {
        notes.push(
            "every cell of the frame lies inside the units, so there is no ground outside to compare with".into(),
        );
    } else if outlines.is_empty() {
        notes.push("no boundary of the units lies inside the frame".into());
    }
    if !found.unmet.is_empty() {
        let values: Vec<String> = found.unmet.iter().map(|value| format!("{value:?}")).collect();
        notes.push(format!("no feature has the value {}, which the filter asks for", values.join(" or ")));
    }
    Ok(Units { mask, area_m2: merged.iter().map(area).sum(), outlines, features: ids.len(), notes })
}

/// The polygons that reach the frame, in its system, checked.
fn place(found: &Shapes, frame: &Frame) -> Result<Vec<Placed>> {
    let mut polygons = Vec::new();
    for shape in &found.shapes {
        collect(&shape.geometry, shape.id, &mut polygons);
    }
    if polygons.is_empty() {
        return Err(no_polygon(found));
    }
    let bounds = ground(frame, 0.0);
    // A vertex that is no number has no place anywhere; the check of rings names its feature.
    let unknown = |ring: &LineString<f64>| ring.0.iter().any(|at| !(at.x.is_finite() && at.y.is_finite()));
    let broken = |polygon: &Polygon<f64>| unknown(polygon.exterior()) || polygon.interiors().iter().any(unknown);
    if let Some((id, polygon)) = polygons.iter().find(|(_, polygon)| broken(polygon)) {
        check(*id, polygon)?;
    }
    let rings = polygons.iter().flat_map(|(_, polygon)| std::iter::once(polygon.exterior()).chain(polygon.interiors()));
    let carried = carry_lines(rings.cloned().collect(), (&found.crs, &frame.crs), &bounds, STRAY * frame.cell)?;
    let mut carried = carried.into_iter();
    let mut placed = Vec::new();
    for (id, own) in &polygons {
        let Some(outer) = carried.next() else { break };
        let polygon = Polygon::new(outer, carried.by_ref().take(own.interiors().len()).collect());
        if polygon.bounding_rect().is_some_and(|around| around.intersects(&bounds)) {
            // In the file's own coordinates, where touching rings touch without rounding.
            check(*id, own)?;
            placed.push(Placed { id: *id, polygon });
        }
    }
    if placed.is_empty() {
        return Err(Error::input("the polygons")
            .found("none on the frame")
            .wanted("at least one polygon that reaches it")
            .mend("check the layer and its coordinate system, or leave the units out"));
    }
    Ok(placed)
}

fn check(id: u64, polygon: &Polygon<f64>) -> Result<()> {
    fault_of(polygon).map_or(Ok(()), |fault| {
        Err(Error::input(format!("the polygon of feature {id}"))
            .found(fault)
            .wanted("rings that enclose a plain area")
            .mend("repair the polygon in the program that drew it, or leave it out with a filter"))
    })
}

fn no_polygon(found: &Shapes) -> Error {
    let lines = |shape: &super::vector::Shape| {
        matches!(shape.geometry, Geometry::Line(_) | Geometry::LineString(_) | Geometry::MultiLineString(_))
    };
    let error = Error::input("the layer").wanted("polygons");
    if found.shapes.is_empty() {
        error.found("no shape in any feature").mend("choose another layer or file")
    } else if found.shapes.iter().any(lines) {
        error.found("lines and no polygon").mend("name the file under [[lines]] instead, or choose another layer")
    } else {
        error.found("points only").mend("choose another layer or file; known deposits belong under [deposits]")
    }
}

/// Takes the polygons out of any shape.
fn collect(geometry: &Geometry<f64>, id: u64, polygons: &mut Vec<(u64, Polygon<f64>)>) {
    match geometry {
        Geometry::Polygon(polygon) => polygons.push((id, polygon.clone())),
        Geometry::MultiPolygon(many) => polygons.extend(many.iter().map(|polygon| (id, polygon.clone()))),
        Geometry::GeometryCollection(many) => many.iter().for_each(|inner| collect(inner, id, polygons)),
        _ => {}
    }
}

/// The parts of a line that do not run along the edge of the frame: maps are often cut there, which is no boundary.
fn off_edge(line: &LineString<f64>, frame: &Frame) -> Vec<LineString<f64>> {
    let near = ALONG * frame.cell;
    let bounds: Rect<f64> = ground(frame, 0.0);
    let (low, high) = (bounds.min(), bounds.max());
    let on = |value: f64, side: f64| (value - side).abs() <= near;
    let mut parts: Vec<Vec<geo::Coord<f64>>> = vec![Vec::new()];
    for edge in line.lines() {
        let (from, to) = (edge.start, edge.end);
        let along = [low.x, high.x].iter().any(|&side| on(from.x, side) && on(to.x, side))
            || [low.y, high.y].iter().any(|&side| on(from.y, side) && on(to.y, side));
        match parts.last_mut() {
            Some(part) if !along && part.is_empty() => part.extend([from, to]),
            Some(part) if !along => part.push(to),
            Some(part) if !part.is_empty() => parts.push(Vec::new()),
            _ => {}
        }
    }
    parts.into_iter().filter(|part| !part.is_empty()).map(LineString).collect()
}
