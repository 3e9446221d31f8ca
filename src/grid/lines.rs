//! Mapped lines from a vector file, carried onto the frame.

use geo::{Geometry, LineString, Polygon, Rect, coord};

use super::bend::carry_lines;
use super::clip::clip_line;
use super::vector::VectorSource;
use super::{Crs, Frame};
use crate::error::{Error, Result};

/// How far, in cells, the image of a straight edge may stray from it before a vertex is added.
pub(super) const STRAY: f64 = 0.01;
/// Pieces shorter than this many cells are leftovers of clipping.
pub(super) const LEAST: f64 = 1e-9;

/// Reads the lines of one layer of a vector file in the frame's system; outlines of polygons count as lines.
///
/// Lines are cut at the frame grown by `margin` metres on each side, so that their lengths are those inside.
///
/// # Errors
/// A file that is not there or not a vector file, no such layer, no coordinate system, a filter that names no column or
/// leaves nothing, points that have no place in the frame's system, a layer of points, no line near the frame, or a margin
/// that is not a number of metres.
pub fn read_lines(source: &VectorSource, frame: &Frame, margin: f64) -> Result<Vec<LineString<f64>>> {
    if !(margin.is_finite() && margin >= 0.0) {
        return Err(Error::input("the margin").found(margin).wanted("a number of metres, zero or more"));
    }
    read(source, frame, margin).map_err(|error| error.file(&source.path))
}

fn read(source: &VectorSource, frame: &Frame, margin: f64) -> Result<Vec<LineString<f64>>> {
    let found = source.shapes("lines")?;
    if !found.unmet.is_empty() {
        let values: Vec<String> = found.unmet.iter().map(|value| format!("{value:?}")).collect();
        return Err(Error::input("the filter")
            .found(format!("no feature with the value {}", values.join(" or ")))
            .wanted("values that the file has")
            .mend("check the spelling, capitals included, or take the value out"));
    }
    let mut lines = Vec::new();
    for shape in &found.shapes {
        collect(&shape.geometry, &mut lines);
    }
    if lines.is_empty() {
        let what = if found.shapes.is_empty() { "no shape in any feature" } else { "points only" };
        return Err(Error::input("the layer")
            .found(what)
            .wanted("lines, or polygons whose outlines count as lines")
            .mend("choose another layer or file; known deposits belong under [deposits]"));
    }
    let ground = ground(frame, margin);
    let systems: (&Crs, &Crs) = (&found.crs, &frame.crs);
    let placed: Vec<LineString<f64>> = carry_lines(lines, systems, &ground, STRAY * frame.cell)?
        .iter()
        .flat_map(|line| clip_line(line, &ground, LEAST * frame.cell))
        .collect();
    if placed.is_empty() {
        return Err(Error::input("the lines")
            .found("none on the frame")
            .wanted("at least one line that reaches it")
            .mend("check the layer and its coordinate system, or leave the lines out"));
    }
    Ok(placed)
}

/// The frame as a box, grown by a margin in metres.
pub(super) fn ground(frame: &Frame, margin: f64) -> Rect<f64> {
    Rect::new(
        coord! { x: frame.west - margin, y: frame.south() - margin },
        coord! { x: frame.east() + margin, y: frame.north + margin },
    )
}

/// Takes the lines out of any shape; points have none.
fn collect(geometry: &Geometry<f64>, lines: &mut Vec<LineString<f64>>) {
    let rings = |polygon: &Polygon<f64>, lines: &mut Vec<LineString<f64>>| {
        lines.push(polygon.exterior().clone());
        lines.extend_from_slice(polygon.interiors());
    };
    match geometry {
        Geometry::Line(line) => lines.push(vec![line.start, line.end].into()),
        Geometry::LineString(line) => lines.push(line.clone()),
        Geometry::MultiLineString(many) => lines.extend_from_slice(&many.0),
        Geometry::Polygon(polygon) => rings(polygon, lines),
        Geometry::MultiPolygon(many) => many.iter().for_each(|polygon| rings(polygon, lines)),
        Geometry::GeometryCollection(many) => many.iter().for_each(|inner| collect(inner, lines)),
        _ => {}
    }
}
