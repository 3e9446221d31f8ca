//! Points, lines and polygons for a GIS, as a GeoPackage.

use std::path::Path;

use gdal::config;
use gdal::spatial_ref::SpatialRef;
use gdal::vector::{Feature, FieldDefn, Geometry, LayerAccess, LayerOptions, OGRFieldType, OGRwkbGeometryType, ToGdal};
use gdal::{Dataset, DriverManager};

use super::column::{Column, Values};
use crate::error::{Error, Result};
use crate::grid::Crs;

/// The moment written into every GeoPackage instead of the present one, so that equal content gives equal bytes.
const FIXED_MOMENT: &str = "2000-01-01T00:00:00.000Z";
/// The option through which GDAL takes that moment.
const MOMENT_OPTION: &str = "OGR_CURRENT_DATE";

/// The geometry of one feature, in the coordinates of the layer's CRS.
#[derive(Debug, Clone, PartialEq)]
pub enum Shape {
    /// A place.
    Point(geo::Point<f64>),
    /// A line of at least two vertices.
    Line(geo::LineString<f64>),
    /// An area, in one or more parts.
    Polygon(geo::MultiPolygon<f64>),
}

impl Shape {
    fn kind(&self) -> OGRwkbGeometryType::Type {
        match self {
            Self::Point(_) => OGRwkbGeometryType::wkbPoint,
            Self::Line(_) => OGRwkbGeometryType::wkbLineString,
            Self::Polygon(_) => OGRwkbGeometryType::wkbMultiPolygon,
        }
    }

    fn geometry(&self) -> gdal::errors::Result<Geometry> {
        match self {
            Self::Point(point) => point.to_gdal(),
            Self::Line(line) => line.to_gdal(),
            Self::Polygon(area) => area.to_gdal(),
        }
    }
}

/// A layer: one shape for each row of its fields, all of one kind.
#[derive(Debug, Clone, PartialEq)]
pub struct VectorLayer {
    /// Name of the layer.
    pub name: String,
    /// The shapes; all points, all lines or all polygons.
    pub geometry: Vec<Shape>,
    /// The fields, each with one value for each shape. `fid` and `geom` are taken by the file itself.
    pub fields: Vec<Column>,
}

/// Writes layers into a new GeoPackage. The bytes depend on the arguments alone. Empty cells become NULL; a layer without
/// shapes is written as an empty layer.
///
/// # Errors
/// A file that exists already, a layer whose fields and shapes do not match, or a failure of GDAL.
pub fn write_geopackage(path: &Path, crs: &Crs, layers: &[VectorLayer]) -> Result<()> {
    if path.symlink_metadata().is_ok() {
        return Err(Error::ours("writing a GeoPackage").file(path).found("a file of that name"));
    }
    layers.iter().try_for_each(|layer| check(layer).map_err(|error| error.file(path)))?;
    config::set_thread_local_config_option(MOMENT_OPTION, FIXED_MOMENT)
        .map_err(|error| Error::ours("setting up GDAL").because(error))?;
    let written = write_layers(path, crs, layers);
    let cleared = config::clear_thread_local_config_option(MOMENT_OPTION);
    written.and(cleared).map_err(|error| Error::ours("writing a GeoPackage").file(path).because(error))
}

fn check(layer: &VectorLayer) -> Result<()> {
    let wrong = |found: String, wanted: &str| {
        Err(Error::ours(format!("the GIS layer {}", layer.name)).found(found).wanted(wanted))
    };
    for field in &layer.fields {
        if field.values.len() != layer.geometry.len() {
            let found = format!("{} values of {} for {} shapes", field.values.len(), field.name, layer.geometry.len());
            return wrong(found, "one value for each shape");
        }
        if ["fid", "geom"].iter().any(|taken| field.name.eq_ignore_ascii_case(taken)) {
            return wrong(format!("a field called {}", field.name), "another name: the file uses this one itself");
        }
    }
    if layer.geometry.windows(2).any(|pair| pair[0].kind() != pair[1].kind()) {
        return wrong("shapes of different kinds".into(), "points, lines or polygons only");
    }
    Ok(())
}

fn write_layers(path: &Path, crs: &Crs, layers: &[VectorLayer]) -> gdal::errors::Result<()> {
    let mut dataset = DriverManager::get_driver_by_name("GPKG")?.create_vector_only(path)?;
    let reference = if crs.wkt.is_empty() { None } else { Some(SpatialRef::from_wkt(&crs.wkt)?) };
    for layer in layers {
        write_layer(&mut dataset, reference.as_ref(), layer)?;
    }
    dataset.close()
}

fn write_layer(dataset: &mut Dataset, reference: Option<&SpatialRef>, layer: &VectorLayer) -> gdal::errors::Result<()> {
    // One transaction for each layer: without it, SQLite would bring every feature to the disk by itself.
    let mut transaction = dataset.start_transaction()?;
    let target = transaction.create_layer(LayerOptions {
        name: &layer.name,
        srs: reference,
        ty: layer.geometry.first().map_or(OGRwkbGeometryType::wkbUnknown, Shape::kind),
        options: None,
    })?;
    for field in &layer.fields {
        let kind = match field.values {
            Values::Number(_) => OGRFieldType::OFTReal,
            Values::Count(_) => OGRFieldType::OFTInteger64,
            Values::Text(_) => OGRFieldType::OFTString,
        };
        FieldDefn::new(&field.name, kind)?.add_to_layer(&target)?;
    }
    for (row, shape) in layer.geometry.iter().enumerate() {
        let mut feature = Feature::new(target.defn())?;
        feature.set_geometry(shape.geometry()?)?;
        for (index, field) in layer.fields.iter().enumerate() {
            match &field.values {
                Values::Number(cells) => match cells[row].filter(|value| value.is_finite()) {
                    Some(value) => feature.set_field_double(index, value)?,
                    None => feature.set_field_null(index)?,
                },
                Values::Count(cells) => match cells[row] {
                    Some(value) => feature.set_field_integer64(index, value)?,
                    None => feature.set_field_null(index)?,
                },
                Values::Text(cells) if cells[row].is_empty() => feature.set_field_null(index)?,
                Values::Text(cells) => feature.set_field_string(index, &cells[row].replace('\0', ""))?,
            }
        }
        feature.create(&target)?;
    }
    transaction.commit()
}

#[cfg(test)]
mod tests {
    use super::*;
    use geo::{LineString, MultiPolygon, Point, polygon};

    fn layers() -> Vec<VectorLayer> {
        let square = polygon![
            exterior: [(x: 0.0, y: 0.0), (x: 90.0, y: 0.0), (x: 90.0, y: 90.0), (x: 0.0, y: 90.0)],
            interiors: [[(x: 30.0, y: 30.0), (x: 30.0, y: 60.0), (x: 60.0, y: 60.0), (x: 60.0, y: 30.0)]],
        ];
        vec![
            VectorLayer {
                name: "conductors".into(),
                geometry: vec![
                    Shape::Polygon(MultiPolygon(vec![square.clone()])),
                    Shape::Polygon(MultiPolygon(vec![square])),
                ],
                fields: vec![
                    Column::number("depth_m", "m", "Depth", [Some(500.0), None]),
                    Column::count("cells", "", "Cells", [None, Some(1 << 40)]),
                    Column::text("name", "Name", ["'); DROP TABLE x; --", ""]),
                ],
            },
            VectorLayer {
                name: "contacts".into(),
                geometry: vec![Shape::Line(LineString::from(vec![(0.0, 0.0), (3.0, 4.0)]))],
                fields: vec![Column::number("length_m", "m", "Length", [Some(5.0)])],
            },
            VectorLayer {
                name: "deposits".into(),
                geometry: vec![Shape::Point(Point::new(500_000.0, 6_500_000.0))],
                fields: vec![],
            },
            VectorLayer {
                name: "targets".into(),
                geometry: vec![],
                fields: vec![Column::count("rank", "", "Rank", [])],
            },
        ]
    }

    fn zone_33() -> Crs {
        let wkt = SpatialRef::from_epsg(32633).unwrap().to_wkt().unwrap();
        Crs { name: "EPSG:32633".into(), wkt, geographic: false, metres_per_unit: 1.0 }
    }

    #[test]
    fn layers_read_back_through_gdal() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("evidence.gpkg");
        write_geopackage(&path, &zone_33(), &layers()).unwrap();
        let dataset = Dataset::open(&path).unwrap();
        assert_eq!(dataset.layer_count(), 4);
        let mut layer = dataset.layer_by_name("conductors").unwrap();
        assert_eq!(layer.feature_count(), 2);
        assert_eq!(layer.spatial_ref().unwrap().auth_code().unwrap(), 32633);
        let features: Vec<Feature> = layer.features().collect();
        // 90 x 90 less the hole of 30 x 30.
        assert_eq!(features[0].geometry().unwrap().area(), 7200.0);
        assert_eq!(features[0].field_as_double(0).unwrap(), Some(500.0));
        assert_eq!(features[0].field_as_integer64(1).unwrap(), None);
        assert_eq!(features[0].field_as_string(2).unwrap().as_deref(), Some("'); DROP TABLE x; --"));
        assert_eq!(features[1].field_as_double(0).unwrap(), None);
        assert_eq!(features[1].field_as_integer64(1).unwrap(), Some(1 << 40));
        assert_eq!(features[1].field_as_string(2).unwrap(), None);
        let mut contacts = dataset.layer_by_name("contacts").unwrap();
        assert_eq!(contacts.features().next().unwrap().geometry().unwrap().length(), 5.0);
        let mut deposits = dataset.layer_by_name("deposits").unwrap();
        assert_eq!(deposits.features().next().unwrap().geometry().unwrap().get_point(0).1, 6_500_000.0);
        assert_eq!(dataset.layer_by_name("targets").unwrap().feature_count(), 0);
    }

    #[test]
    fn two_writes_give_equal_bytes() {
        let folder = tempfile::tempdir().unwrap();
        let (one, two) = (folder.path().join("one.gpkg"), folder.path().join("two.gpkg"));
        write_geopackage(&one, &zone_33(), &layers()).unwrap();
        std::thread::sleep(std::time::Duration::from_millis(1100));
        write_geopackage(&two, &zone_33(), &layers()).unwrap();
        assert_eq!(std::fs::read(&one).unwrap(), std::fs::read(&two).unwrap());
    }

    #[test]
    fn a_local_frame_has_no_reference_system() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("local.gpkg");
        write_geopackage(&path, &Crs::local(), &layers()).unwrap();
        assert_eq!(Dataset::open(&path).unwrap().layer_count(), 4);
    }

    #[test]
    fn each_bad_layer_is_refused() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("bad.gpkg");
        let refused = |change: fn(&mut VectorLayer)| {
            let mut layer = layers().swap_remove(0);
            change(&mut layer);
            write_geopackage(&path, &Crs::local(), &[layer]).unwrap_err().to_string()
        };
        assert!(refused(|layer| layer.geometry.truncate(1)).contains("2 values of depth_m for 1 shapes"));
        assert!(refused(|layer| layer.fields[0].name = "FID".into()).contains("called FID"));
        assert!(refused(|layer| layer.fields[0].name = "geom".into()).contains("called geom"));
        assert!(refused(|layer| layer.geometry[1] = Shape::Point(Point::new(0.0, 0.0))).contains("different kinds"));
        assert!(!path.exists());
        std::fs::write(&path, "x").unwrap();
        assert!(write_geopackage(&path, &Crs::local(), &layers()).is_err(), "a file is never overwritten");
    }
}
