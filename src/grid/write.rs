//! Writing a grid as a GeoTIFF.

use std::path::Path;

use gdal::raster::{Buffer, RasterCreationOptions};
use gdal::{DriverManager, Metadata};

use super::Grid;
use super::reason::Reason;
use super::source::silence_gdal;
use crate::error::{Error, Result};

/// A level of more than this many ranges takes 64 bits: 32 hold about 1.7e7 steps of it.
const MOST_LEVEL: f64 = 1e4;

/// Writes a grid as a GeoTIFF: one band, tiled, compressed without loss, NaN as no-data; 32-bit floats, or 64-bit where the
/// level is so large against the range that seven digits would not hold the detail.
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
    let wide = grid.range().is_some_and(|(low, high)| low.abs().max(high.abs()) > MOST_LEVEL * (high - low));
    let mut dataset = if wide {
        driver.create_with_band_type_with_options::<f64, _>(path, frame.cols, frame.rows, 1, &options)
    } else {
        driver.create_with_band_type_with_options::<f32, _>(path, frame.cols, frame.rows, 1, &options)
    }
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
    let (size, numbers) = ((frame.cols, frame.rows), grid.values().iter());
    if wide {
        let mut buffer = Buffer::new(size, numbers.copied().collect());
        band.write((0, 0), size, &mut buffer).map_err(failed)?;
    } else {
        // Maps need no more than seven digits; the tables carry full numbers.
        let mut buffer = Buffer::new(size, numbers.map(|value| *value as f32).collect());
        band.write((0, 0), size, &mut buffer).map_err(failed)?;
    }
    dataset.close().map_err(failed)
}
