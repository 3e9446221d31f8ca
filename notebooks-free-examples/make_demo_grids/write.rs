//! Writing rasters through GDAL. Missing is NaN in memory and [`NO_DATA`] on disk; the same values give the same bytes.

use crate::layout::{Layout, crs};
use gdal::errors::Result;
use gdal::raster::{Buffer, GdalType, RasterCreationOptions};
use gdal::{Dataset, Driver, DriverManager, Metadata};
use std::path::Path;

/// What stands for "no data" in the files of floats.
pub const NO_DATA: f64 = -9999.0;
/// What stands for "no data" in the file of 16-bit integers.
const NO_DATA_SHORT: i16 = i16::MIN;

/// A layer to be written: where its cells lie, its values in reading order, and what they are.
#[derive(Debug)]
pub struct Layer<'a> {
    /// Where the cells lie.
    pub layout: &'a Layout,
    /// Values in reading order; NaN is missing.
    pub values: &'a [f64],
    /// What the values are, with the unit.
    pub about: &'a str,
}

/// A tiled and deflated GeoTIFF of 32-bit floats.
pub fn float_tiff(path: &Path, layer: &Layer) -> Result<()> {
    let floats = layer.values.iter().map(|value| float(*value)).collect();
    let dataset = tiff::<f32>(path, layer, "PREDICTOR=3", NO_DATA, floats)?;
    dataset.close()
}

/// A GeoTIFF of 16-bit integers; the value is number x `scale` + `offset`. Values outside the range are put at its end.
pub fn scaled_tiff(path: &Path, layer: &Layer, scale: f64, offset: f64) -> Result<()> {
    let number = |value: f64| ((value - offset) / scale).round().clamp(-32_767.0, 32_767.0) as i16;
    let numbers =
        layer.values.iter().map(|value| if value.is_nan() { NO_DATA_SHORT } else { number(*value) }).collect();
    let dataset = tiff::<i16>(path, layer, "PREDICTOR=2", f64::from(NO_DATA_SHORT), numbers)?;
    let mut band = dataset.rasterband(1)?;
    band.set_scale(scale)?;
    band.set_offset(offset)?;
    dataset.close()
}

/// An ESRI ASCII grid with its `.prj`.
pub fn ascii(path: &Path, layer: &Layer) -> Result<()> {
    let memory = in_memory(layer.layout, &[layer.values])?;
    let options = RasterCreationOptions::from_iter(["SIGNIFICANT_DIGITS=5"]);
    memory.create_copy(&DriverManager::get_driver_by_name("AAIGrid")?, path, &options)?.close()
}

/// A virtual raster over two GeoTIFFs beside it, one for the west and one for the east.
pub fn virtual_halves(path: &Path, halves: [&Path; 2], layer: &Layer) -> Result<()> {
    let (_, cols) = layer.layout.shape;
    let middle = cols / 2;
    let parts = layer.layout.split(middle);
    for (part, (half, file)) in parts.iter().zip(halves).enumerate() {
        let wanted = |col: usize| (col >= middle) == (part == 1);
        let values: Vec<f64> =
            layer.values.iter().enumerate().filter(|(i, _)| wanted(i % cols)).map(|(_, value)| *value).collect();
        float_tiff(file, &Layer { layout: half, values: &values, about: layer.about })?;
    }
    let sources = [Dataset::open(halves[0])?, Dataset::open(halves[1])?];
    gdal::programs::raster::build_vrt(Some(path), &sources, None)?.close()
}

/// A CF NetCDF volume: one variable on (depth, y, x), with `layers` from shallow to deep.
pub fn netcdf(path: &Path, layout: &Layout, depths: &[f64], layers: &[Vec<f64>]) -> Result<()> {
    let layers: Vec<&[f64]> = layers.iter().map(Vec::as_slice).collect();
    let mut memory = in_memory(layout, &layers)?;
    let list = depths.iter().map(f64::to_string).collect::<Vec<_>>().join(",");
    // Type 6 is a NetCDF double.
    for (key, value) in [
        ("NETCDF_DIM_EXTRA", "{depth}".to_string()),
        ("NETCDF_DIM_depth_DEF", format!("{{{},6}}", depths.len())),
        ("NETCDF_DIM_depth_VALUES", format!("{{{list}}}")),
        ("depth#units", "m".into()),
        ("depth#positive", "down".into()),
        ("depth#axis", "Z".into()),
        ("depth#standard_name", "depth".into()),
    ] {
        memory.set_metadata_item(key, &value, "")?;
    }
    for (index, depth) in depths.iter().enumerate() {
        let mut band = memory.rasterband(index + 1)?;
        band.set_metadata_item("NETCDF_VARNAME", "resistivity", "")?;
        band.set_metadata_item("NETCDF_DIM_depth", &depth.to_string(), "")?;
        band.set_metadata_item("units", "ohm m", "")?;
        band.set_metadata_item("long_name", "electrical resistivity", "")?;
    }
    // Without the history line, which holds the time of day, and the library's version the bytes are always the same.
    let options = RasterCreationOptions::from_iter([
        "FORMAT=NC4",
        "COMPRESS=DEFLATE",
        "ZLEVEL=6",
        "WRITE_GDAL_HISTORY=NO",
        "WRITE_GDAL_VERSION=NO",
    ]);
    memory.create_copy(&DriverManager::get_driver_by_name("netCDF")?, path, &options)?.close()
}

/// The value as it is kept on disk.
fn float(value: f64) -> f32 {
    if value.is_nan() { NO_DATA as f32 } else { value as f32 }
}

fn tiff<T: GdalType + Copy>(
    path: &Path,
    layer: &Layer,
    predictor: &str,
    no_data: f64,
    values: Vec<T>,
) -> Result<Dataset> {
    let (rows, cols) = layer.layout.shape;
    let options = ["COMPRESS=DEFLATE", "ZLEVEL=9", predictor, "TILED=YES", "BLOCKXSIZE=128", "BLOCKYSIZE=128"];
    let options = RasterCreationOptions::from_iter(options);
    let driver = DriverManager::get_driver_by_name("GTiff")?;
    let mut dataset = driver.create_with_band_type_with_options::<T, _>(path, cols, rows, 1, &options)?;
    georeference(&mut dataset, layer.layout)?;
    let mut band = dataset.rasterband(1)?;
    band.set_no_data_value(Some(no_data))?;
    band.set_description(layer.about)?;
    band.write((0, 0), (cols, rows), &mut Buffer::new((cols, rows), values))?;
    Ok(dataset)
}

fn in_memory(layout: &Layout, layers: &[&[f64]]) -> Result<Dataset> {
    let (rows, cols) = layout.shape;
    let driver: Driver = DriverManager::get_driver_by_name("MEM")?;
    let mut dataset = driver.create_with_band_type::<f32, _>("", cols, rows, layers.len())?;
    georeference(&mut dataset, layout)?;
    for (index, values) in layers.iter().enumerate() {
        let mut band = dataset.rasterband(index + 1)?;
        band.set_no_data_value(Some(NO_DATA))?;
        let floats = values.iter().map(|value| float(*value)).collect();
        band.write((0, 0), (cols, rows), &mut Buffer::new((cols, rows), floats))?;
    }
    Ok(dataset)
}

fn georeference(dataset: &mut Dataset, layout: &Layout) -> Result<()> {
    let [west, north] = layout.corner;
    dataset.set_geo_transform(&[west, layout.cell, 0.0, north, 0.0, -layout.cell])?;
    dataset.set_spatial_ref(&crs(layout.epsg)?)
}
