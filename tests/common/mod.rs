//! Small surveys on disk for tests that run the program.

#![allow(dead_code, reason = "each test file uses its own part")]

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use gdal::DriverManager;
use gdal::raster::Buffer;
use gdal::spatial_ref::SpatialRef;

/// A folder with a small survey in it; removed when dropped.
pub struct Survey {
    folder: tempfile::TempDir,
}

/// Cells on each side of the small survey, and their size in metres.
pub const SIDE: usize = 80;
pub const CELL: f64 = 500.0;
pub const WEST: f64 = 500_000.0;
pub const NORTH: f64 = 5_600_000.0;

/// How a raster of the small survey is written.
pub struct Raster<'a> {
    pub crs: Option<u32>,
    pub origin: (f64, f64),
    pub cell: f64,
    pub no_data: Option<f64>,
    pub value: &'a dyn Fn(usize, usize) -> f64,
}

impl<'a> Raster<'a> {
    pub fn of(value: &'a dyn Fn(usize, usize) -> f64) -> Self {
        Self { crs: Some(32633), origin: (WEST, NORTH), cell: CELL, no_data: Some(-9999.0), value }
    }
}

/// A smooth, aperiodic, repeatable surface with bumps a few cells wide: a sum of plane waves of unrelated directions.
pub fn bumps(row: usize, col: usize, seed: f64) -> f64 {
    (0..40).map(|k| f64::from(k) + seed).fold(0.0, |sum, k| {
        let (angle, phase) = (2.399_963 * k, 7.3 * k * k);
        let wave = 0.12 + 0.35 * (0.618_034 * k).fract();
        sum + (wave * (row as f64 * angle.sin() + col as f64 * angle.cos()) + phase).cos()
    })
}

/// Gravity over three dense bodies with steep sides: plateaus with smooth rims.
pub fn gravity(row: usize, col: usize) -> f64 {
    let plateau = |r: f64, c: f64, a: f64, b: f64| {
        let rim = |distance: f64| 1.0 / (1.0 + (distance / 1.2).exp());
        rim((row as f64 - r).abs() - a) * rim((col as f64 - c).abs() - b)
    };
    12.0 * plateau(20.0, 22.0, 9.0, 12.0)
        + 9.0 * plateau(55.0, 52.0, 14.0, 8.0)
        + 7.0 * plateau(24.0, 62.0, 7.0, 9.0)
        + 0.05 * bumps(row, col, 3.0)
}

pub fn resistivity(row: usize, col: usize) -> f64 {
    10f64.powf(2.5 + 0.12 * bumps(row, col, 11.0))
}

pub const STUDY: &str = r#"title = "A small survey"
seed = 7
frame = { crs = "EPSG:32633", cell = 500.0 }

[conductivity]
quantity = "resistivity"
slices = [
  { path = "rho_1000.tif", depth = 1000.0 },
  { path = "rho_3000.tif", depth = 3000.0 },
]
conductors = { quantile = 0.80 }

[[potential]]
name = "gravity"
path = "gravity.tif"
kind = "gravity"

[test]
within = [500.0, 1500.0]
"#;

impl Survey {
    /// Two slices, gravity and a study that runs.
    pub fn new() -> Self {
        let survey = Self { folder: tempfile::tempdir().unwrap() };
        survey.raster("rho_1000.tif", &Raster::of(&resistivity));
        survey.raster("rho_3000.tif", &Raster::of(&|row, col| resistivity(col, row)));
        survey.raster("gravity.tif", &Raster::of(&gravity));
        survey.file("study.toml", STUDY);
        survey
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn file(&self, name: &str, text: &str) {
        std::fs::write(self.path(name), text).unwrap();
    }

    /// Writes the study with one piece of text replaced; the piece must be there.
    pub fn study(&self, from: &str, to: &str) {
        assert!(STUDY.contains(from), "{from}");
        self.file("study.toml", &STUDY.replace(from, to));
    }

    pub fn raster(&self, name: &str, raster: &Raster<'_>) {
        self.shaped_raster(name, (SIDE, SIDE), raster);
    }

    pub fn shaped_raster(&self, name: &str, (rows, cols): (usize, usize), raster: &Raster<'_>) {
        let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
        let mut dataset = driver.create_with_band_type::<f64, _>(self.path(name), cols, rows, 1).unwrap();
        let (west, north) = raster.origin;
        dataset.set_geo_transform(&[west, raster.cell, 0.0, north, 0.0, -raster.cell]).unwrap();
        if let Some(code) = raster.crs {
            dataset.set_spatial_ref(&SpatialRef::from_epsg(code).unwrap()).unwrap();
        }
        let mut band = dataset.rasterband(1).unwrap();
        band.set_no_data_value(raster.no_data).unwrap();
        let numbers = (0..rows * cols).map(|at| (raster.value)(at / cols, at % cols)).collect();
        band.write((0, 0), (cols, rows), &mut Buffer::new((cols, rows), numbers)).unwrap();
    }

    /// Runs the program in the survey's folder.
    pub fn salband(&self, arguments: &[&str]) -> Output {
        salband_in(self.folder.path(), arguments)
    }
}

pub fn salband_in(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_salband")).current_dir(folder).args(arguments).output().unwrap()
}

pub fn stderr(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

pub fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}
