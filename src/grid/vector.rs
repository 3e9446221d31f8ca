//! A vector file: opened, filtered, and its shapes taken out.

use std::path::PathBuf;

use gdal::vector::{Geometry as GdalGeometry, Layer, LayerAccess, OGRwkbGeometryType, geometry_type_flatten};
use gdal::{Dataset, DatasetOptions, GdalOpenFlags};
use geo::Geometry;

use super::Crs;
use super::attribute::AttributeFilter;
use super::reason::Reason;
use super::source::silence_gdal;
use crate::error::{Error, Result};

/// Which features of which vector file to read, as the user names them.
#[derive(Debug, Clone, PartialEq)]
pub struct VectorSource {
    /// Path of the vector file.
    pub path: PathBuf,
    /// The layer in it; `None` takes the first.
    pub layer: Option<String>,
    /// The coordinate system, stated by the user; it takes the place of the file's own.
    pub crs: Option<String>,
    /// The features to keep; `None` keeps all.
    pub filter: Option<AttributeFilter>,
}

/// One feature of a layer.
pub(super) struct Shape {
    /// The feature's number in the file.
    pub id: u64,
    pub geometry: Geometry<f64>,
}

/// The shapes of one layer that the filter keeps, in the layer's own system.
pub(super) struct Shapes {
    pub crs: Crs,
    pub shapes: Vec<Shape>,
    /// Values that the filter asks for and no feature has.
    pub unmet: Vec<String>,
}

impl VectorSource {
    /// Reads the shapes of the chosen layer; features without a shape are passed over. `wanted` names what is looked for.
    pub(super) fn shapes(&self, wanted: &str) -> Result<Shapes> {
        silence_gdal();
        if !self.path.exists() {
            return Err(Error::input("the file")
                .found("nothing at this path")
                .wanted(format!("a vector file with {wanted}"))
                .mend("check the path; a relative one starts at the folder of the study file"));
        }
        let options = DatasetOptions { open_flags: GdalOpenFlags::GDAL_OF_VECTOR, ..DatasetOptions::default() };
        let dataset = Dataset::open_ex(&self.path, options).map_err(|source| {
            Error::input("the file")
                .found("something that GDAL cannot open as a vector file")
                .wanted(format!("{wanted} in GeoPackage, GeoJSON, shapefile or the like"))
                .mend("check that the file is whole")
                .because(Reason(source))
        })?;
        let mut layer = self.choose(&dataset)?;
        let crs = self.system(&layer, wanted)?;
        let mut test = self.filter.as_ref().map(|filter| filter.bind(&layer)).transpose()?;
        let (mut shapes, mut kept) = (Vec::new(), 0);
        for (index, feature) in layer.features().enumerate() {
            if let Some(test) = &mut test
                && !test.keeps(&feature)?
            {
                continue;
            }
            kept += 1;
            let id = feature.fid().unwrap_or(index as u64);
            if let Some(geometry) = feature.geometry().filter(|geometry| !geometry.is_empty()) {
                shapes.push(Shape { id, geometry: flat(geometry, id)? });
            }
        }
        match test {
            Some(test) if kept == 0 => Err(test.nothing_left()),
            test => Ok(Shapes { crs, shapes, unmet: test.map(|test| test.unmet()).unwrap_or_default() }),
        }
    }

    fn choose<'a>(&self, dataset: &'a Dataset) -> Result<Layer<'a>> {
        if self.layer.is_none() && dataset.layer_count() > 1 {
            let names: Vec<String> = dataset.layers().map(|layer| layer.name()).collect();
            return Err(Error::input("the layer")
                .found(format!("{} layers and no choice among them", names.len()))
                .wanted(format!("one of: {}", names.join(", ")))
                .mend("set layer"));
        }
        let chosen = match &self.layer {
            Some(name) => dataset.layer_by_name(name),
            None => dataset.layer(0),
        };
        chosen.map_err(|source| {
            let names: Vec<String> = dataset.layers().map(|layer| layer.name()).collect();
            let missing = self.layer.as_ref().map_or("layer at all".into(), |name| format!("{name:?}"));
            Error::input("the layer")
                .found(format!("no {missing}"))
                .wanted(format!("one of: {}", names.join(", ")))
                .because(Reason(source))
        })
    }

    fn system(&self, layer: &Layer<'_>, wanted: &str) -> Result<Crs> {
        match (&self.crs, layer.spatial_ref()) {
            (Some(stated), _) => Crs::from_definition(stated),
            (None, Some(reference)) => Crs::from_reference(&reference),
            (None, None) => Err(Error::input("the coordinate system")
                .found("none in the file")
                .wanted(format!("one that places the {wanted} on the earth"))
                .mend("state crs = \"EPSG:...\" beside the path in the study, if you know it")),
        }
    }
}

/// A shape without heights, which files often carry along.
fn flat(geometry: &GdalGeometry, id: u64) -> Result<Geometry<f64>> {
    let kind = geometry.geometry_type();
    let level = if geometry_type_flatten(kind) == kind && kind != OGRwkbGeometryType::wkbGeometryCollection {
        geometry.to_geo()
    } else {
        let mut copy = geometry.clone();
        copy.flatten_to_2d();
        copy.to_geo()
    };
    level.map_err(|_| {
        Error::input(format!("the shape of feature {id}"))
            .found(format!("{}, which is not read", geometry.geometry_name()))
            .wanted("points, lines or polygons with straight edges")
            .mend("convert the layer to straight edges first, or leave the feature out with a filter")
    })
}
