//! Writing a grid as a GeoTIFF.

use std::path::Path;

use gdal::raster::{Buffer, RasterCreationOptions};
use gdal::{DriverManager, Metadata};

use super::Grid;
use super::reason::Reason;
use super::source::silence_gdal;
use crate::error::{Error, Result};

/// Writes a grid as a GeoTIFF: one band of 32-bit floats, tiled, compressed without loss, NaN as no-data.
///
/// `description` becomes the band's description, `unit` its unit. The same grid gives the same bytes.
///
/// # Errors
/// When the file cannot be written.
pub fn write_raster(path: &Path, grid: &Grid, description: &str, unit: &str) -> Result<()> {
    silence_gdal();
    let failed = |source: gdal::errors::GdalError| {
        Error::input("writing a raster")
            .file(path)
            .found("a file that cannot be written")
            .wanted("a writable folder with room")
            .because(Reason(source))
    };
    let frame = grid.frame();
    let options = RasterCreationOptions::from_iter([
        "TILED=YES",
        "BLOCKXSIZE=256",
        "BLOCKYSIZE=256",
        "COMPRESS=DEFLATE",
        "PREDICTOR=3",
        "NUM_THREADS=1",
    ]);
    let driver = DriverManager::get_driver_by_name("GTiff").map_err(failed)?;
    let mut dataset = driver
        .create_with_band_type_with_options::<f32, _>(path, frame.cols, frame.rows, 1, &options)
        .map_err(failed)?;
    let position = [frame.west, frame.cell, 0.0, frame.north, 0.0, -frame.cell];
    dataset.set_geo_transform(&position).map_err(failed)?;
    if !frame.crs.wkt.is_empty() {
        dataset.set_spatial_ref(&frame.crs.reference()?).map_err(failed)?;
    }
    let mut band = dataset.rasterband(1).map_err(failed)?;
    band.set_no_data_value(Some(f64::NAN)).map_err(failed)?;
    band.set_description(description).map_err(failed)?;
    band.set_metadata_item("units", unit, "").map_err(failed)?;
    // Maps need no more than seven digits; the tables carry full numbers.
    let numbers = grid.values().iter().map(|value| *value as f32).collect();
    let mut buffer = Buffer::new((frame.cols, frame.rows), numbers);
    band.write((0, 0), (frame.cols, frame.rows), &mut buffer).map_err(failed)?;
    dataset.close().map_err(failed)
}
