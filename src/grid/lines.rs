//! Mapped lines from a vector file, carried onto the frame.

use std::path::PathBuf;

use gdal::vector::LayerAccess;
use gdal::{Dataset, DatasetOptions, GdalOpenFlags};
use geo::{BoundingRect, Coord, Geometry, Intersects, LineString, Polygon, Rect, coord};

use super::reason::Reason;
use super::source::silence_gdal;
use super::{Crs, Frame, carry};
use crate::error::{Error, Result};

/// Which lines to read, as the user names them.
#[derive(Debug, Clone, PartialEq)]
pub struct LineSource {
    /// Path of the vector file.
    pub path: PathBuf,
    /// The layer in it; `None` takes the first.
    pub layer: Option<String>,
    /// The coordinate system, stated by the user; it takes the place of the file's own.
    pub crs: Option<String>,
}

/// Reads all lines of one layer of a vector file in the frame's system; outlines of polygons count as lines.
///
/// Lines that stay outside the frame, grown by `margin` metres on each side, are left out.
///
/// # Errors
/// A file that is not there or not a vector file, no such layer, no coordinate system, points that have no place in the
/// frame's system, or no line near the frame.
pub fn read_lines(source: &LineSource, frame: &Frame, margin: f64) -> Result<Vec<LineString<f64>>> {
    read(source, frame, margin).map_err(|error| error.file(&source.path))
}

fn read(LineSource { path, layer, crs }: &LineSource, frame: &Frame, margin: f64) -> Result<Vec<LineString<f64>>> {
    let (layer, stated) = (layer.as_deref(), crs.as_deref());
    silence_gdal();
    if !path.exists() {
        return Err(Error::input("the file")
            .found("nothing at this path")
            .wanted("a vector file with lines")
            .mend("check the path; a relative one starts at the folder of the study file"));
    }
    let options = DatasetOptions { open_flags: GdalOpenFlags::GDAL_OF_VECTOR, ..DatasetOptions::default() };
    let dataset = Dataset::open_ex(path, options).map_err(|source| {
        Error::input("the file")
            .found("something that GDAL cannot open as a vector file")
            .wanted("lines in GeoPackage, GeoJSON, shapefile or the like")
            .mend("check that the file is whole")
            .because(Reason(source))
    })?;
    let mut chosen = match layer {
        Some(name) => dataset.layer_by_name(name),
        None => dataset.layer(0),
    }
    .map_err(|source| {
        let names: Vec<String> = dataset.layers().map(|layer| layer.name()).collect();
        Error::input("the layer")
            .found(format!("no {}", layer.map_or("layer at all".into(), |name| format!("{name:?}"))))
            .wanted(format!("one of: {}", names.join(", ")))
            .because(Reason(source))
    })?;
    let crs = match (stated, chosen.spatial_ref()) {
        (Some(stated), _) => Crs::from_definition(stated)?,
        (None, Some(reference)) => Crs::from_reference(&reference)?,
        (None, None) => {
            return Err(Error::input("the coordinate system")
                .found("none in the file")
                .wanted("one that places the lines on the earth")
                .mend("state crs = \"EPSG:...\" beside the path in the study, if you know it"));
        }
    };
    let mut lines = Vec::new();
    for feature in chosen.features() {
        let Some(geometry) = feature.geometry() else { continue };
        let geometry = geometry.to_geo().map_err(|source| {
            Error::input("a line")
                .found("a shape that cannot be read")
                .wanted("lines or polygons")
                .because(Reason(source))
        })?;
        collect(geometry, &mut lines);
    }
    let ground = Rect::new(
        coord! { x: frame.west - margin, y: frame.south() - margin },
        coord! { x: frame.east() + margin, y: frame.north + margin },
    );
    let mut placed = Vec::new();
    for line in lines {
        let points: Vec<(f64, f64)> = line.0.iter().map(|at| (at.x, at.y)).collect();
        let carried = carry(&points, &crs, &frame.crs)?;
        if let Some(lost) = carried.iter().position(|(x, y)| !(x.is_finite() && y.is_finite())) {
            return Err(Error::input("a point of a line")
                .found(format!("{:?} in {}, which has no place in {}", points[lost], crs.name, frame.crs.name))
                .wanted("points that both systems cover")
                .mend("check the coordinate system of the lines"));
        }
        let line: LineString<f64> = carried.into_iter().map(|(x, y)| Coord { x, y }).collect();
        if line.bounding_rect().is_some_and(|bounds| bounds.intersects(&ground)) {
            placed.push(line);
        }
    }
    if placed.is_empty() {
        return Err(Error::input("the lines")
            .found("none on the frame")
            .wanted("at least one line that reaches it")
            .mend("check the layer and its coordinate system, or leave the lines out"));
    }
    Ok(placed)
}

/// Takes the lines out of any shape; points have none.
fn collect(geometry: Geometry<f64>, lines: &mut Vec<LineString<f64>>) {
    let rings = |polygon: Polygon<f64>, lines: &mut Vec<LineString<f64>>| {
        let (outer, inner) = polygon.into_inner();
        lines.push(outer);
        lines.extend(inner);
    };
    match geometry {
        Geometry::Line(line) => lines.push(vec![line.start, line.end].into()),
        Geometry::LineString(line) => lines.push(line),
        Geometry::MultiLineString(many) => lines.extend(many),
        Geometry::Polygon(polygon) => rings(polygon, lines),
        Geometry::MultiPolygon(many) => many.into_iter().for_each(|polygon| rings(polygon, lines)),
        Geometry::GeometryCollection(many) => many.into_iter().for_each(|inner| collect(inner, lines)),
        _ => {}
    }
}
