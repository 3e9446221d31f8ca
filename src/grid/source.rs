//! A raster file: opened, described, and read where a frame needs it.

use std::path::{Path, PathBuf};

use gdal::{Dataset, Metadata};
use ndarray::Array2;

use super::files::files_of;
use super::reason::Reason;
use super::{Crs, Frame};
use crate::error::{Error, Result};

/// Sides of a cell that differ by less than this share count as equal.
const SQUARE: f64 = 1e-6;

/// Compressed data seldom shrink more than this: deflate's own limit is 1032 to 1 (RFC 1951 allows 258 bytes in 2 bits).
const MOST_COMPRESSION: u64 = 1100;

/// Which raster to read, as the user names it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Source {
    /// Path of the file; any raster that GDAL opens.
    pub path: PathBuf,
    /// The variable, for files that hold several, such as NetCDF.
    pub variable: Option<String>,
    /// The coordinate system, stated by the user; it takes the place of the file's own.
    pub crs: Option<String>,
}

/// An open raster file and what it says of itself.
pub struct Raster {
    path: PathBuf,
    dataset: Dataset,
    /// Name of the format's driver.
    pub format: String,
    /// (rows, columns).
    pub shape: (usize, usize),
    /// Number of bands.
    pub bands: usize,
    /// Name of the numbers' type in the file.
    pub data_type: String,
    /// The coordinate system.
    pub crs: Crs,
    /// True if the user stated the system, false if the file did.
    pub crs_stated: bool,
    /// GDAL's six numbers: x of the corner, column step in x and y, y of the corner, row step in x and y, in GDAL's order.
    pub transform: [f64; 6],
    /// The value that means "no data", if the file names one.
    pub no_data: Option<f64>,
    /// Factor and offset that turn stored numbers into values.
    pub scaling: (f64, f64),
    /// Unit of the values, as the file states it; may be empty.
    pub unit: String,
    /// Depth of each band in metres, where the file has a depth axis.
    pub depths: Vec<Option<f64>>,
}

/// A rectangle of cells: first row and column, and how many of each.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Window {
    pub row: usize,
    pub col: usize,
    pub rows: usize,
    pub cols: usize,
}

/// A box in map coordinates.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extent {
    /// Smallest x.
    pub west: f64,
    /// Smallest y.
    pub south: f64,
    /// Largest x.
    pub east: f64,
    /// Largest y.
    pub north: f64,
}

impl Extent {
    /// The part that both cover, or `None`.
    pub fn and(self, other: Self) -> Option<Self> {
        let both = Self {
            west: self.west.max(other.west),
            south: self.south.max(other.south),
            east: self.east.min(other.east),
            north: self.north.min(other.north),
        };
        (both.west < both.east && both.south < both.north).then_some(both)
    }

    /// The box around both.
    pub fn or(self, other: Self) -> Self {
        Self {
            west: self.west.min(other.west),
            south: self.south.min(other.south),
            east: self.east.max(other.east),
            north: self.north.max(other.north),
        }
    }

    /// The box moved eastward.
    pub(super) fn moved(self, by: f64) -> Self {
        Self { west: self.west + by, east: self.east + by, ..self }
    }

    /// The box of a frame.
    pub fn of(frame: &Frame) -> Self {
        Self { west: frame.west, south: frame.south(), east: frame.east(), north: frame.north }
    }

    /// The box in another system; its edges are followed closely, since straight lines may bend.
    ///
    /// # Errors
    /// When the box cannot be carried over.
    pub fn carried(self, from: &Crs, into: &Crs) -> Result<Self> {
        if from.wkt == into.wkt {
            return Ok(self);
        }
        let bounds = [self.west, self.south, self.east, self.north];
        let carried = from.transform_to(into)?.transform_bounds(&bounds, 21).map_err(|source| {
            Error::input("the extent")
                .found(format!("{bounds:?} in {}, which has no place in {}", from.name, into.name))
                .wanted("an area that both systems cover")
                .mend("check the coordinate system of the layer and of the frame")
                .because(Reason(source))
        })?;
        if carried.iter().any(|bound| !bound.is_finite()) {
            return Err(Error::input("the extent")
                .found(format!("{bounds:?} in {}, which has no place in {}", from.name, into.name))
                .wanted("an area that both systems cover")
                .mend("check the coordinate system of the layer and of the frame"));
        }
        let [west, south, mut east, north] = carried;
        // Across the antimeridian the eastern edge comes back as the smaller longitude.
        if into.geographic && east < west {
            east += 360.0;
        }
        Ok(Self { west, south, east, north })
    }
}

impl Source {
    /// Names a file and nothing else.
    pub fn file(path: impl Into<PathBuf>) -> Self {
        Self { path: path.into(), variable: None, crs: None }
    }

    /// Opens the raster and reads what it says of itself, but no cell.
    ///
    /// # Errors
    /// A file that is not there, is not a raster, has no coordinate system, no position, or claims more cells than it
    /// could hold.
    pub fn open(&self) -> Result<Raster> {
        self.open_at(None).map_err(|error| error.file(&self.path))
    }

    fn open_at(&self, inner: Option<&str>) -> Result<Raster> {
        silence_gdal();
        if !self.path.exists() {
            return Err(Error::input("the file")
                .found("nothing at this path")
                .wanted("a raster file")
                .mend("check the path; a relative one starts at the folder of the study file"));
        }
        let opened = match inner {
            Some(name) => Dataset::open(name),
            None => Dataset::open(&self.path),
        };
        let dataset = opened.map_err(|source| {
            Error::input("the file")
                .found("something that GDAL cannot open as a raster")
                .wanted("a raster such as GeoTIFF, ESRI ASCII grid, VRT or NetCDF")
                .mend("check that the file is whole and of a raster format")
                .because(Reason(source))
        })?;
        if dataset.raster_count() == 0 {
            return match inner {
                None => self.open_at(Some(&self.choose_variable(&dataset)?)),
                Some(_) => Err(Error::input("the variable").found("no grid").wanted("rows and columns of numbers")),
            };
        }
        self.describe(dataset)
    }

    /// The name under which GDAL opens the wanted variable of a file that holds several.
    fn choose_variable(&self, dataset: &Dataset) -> Result<String> {
        let entries = dataset.metadata_domain("SUBDATASETS").unwrap_or_default();
        let names: Vec<&str> =
            entries.iter().filter_map(|entry| entry.split_once("_NAME=").map(|(_, name)| name)).collect();
        let variable = |name: &str| name.rsplit(':').next().unwrap_or_default().to_string();
        let listed = || names.iter().map(|name| variable(name)).collect::<Vec<_>>().join(", ");
        match (&self.variable, names.as_slice()) {
            (_, []) => Err(Error::input("the file").found("no raster band").wanted("a grid of numbers")),
            (None, [only]) => Ok((*only).to_string()),
            (None, _) => Err(Error::input("the file")
                .found(format!("several variables: {}", listed()))
                .wanted("one of them")
                .mend("name it in the study as variable = \"...\"")),
            (Some(wanted), _) => {
                names.iter().find(|name| variable(name) == *wanted).map(|name| (*name).to_string()).ok_or_else(|| {
                    Error::input("the variable")
                        .found(format!("no {wanted:?} among {}", listed()))
                        .wanted("the name of one that the file holds")
                })
            }
        }
    }

    fn describe(&self, dataset: Dataset) -> Result<Raster> {
        let (cols, rows) = dataset.raster_size();
        let first = dataset.rasterband(1).map_err(|source| Error::input("the first band").because(Reason(source)))?;
        let transform = dataset.geo_transform().unwrap_or([0.0, 1.0, 0.0, 0.0, 0.0, 1.0]);
        let determinant = transform[1] * transform[5] - transform[2] * transform[4];
        let unplaced = transform == [0.0, 1.0, 0.0, 0.0, 0.0, 1.0];
        if unplaced || !determinant.is_finite() || determinant == 0.0 {
            return Err(Error::input("the raster's position")
                .found("none that can be used")
                .wanted("an origin and a cell size that are not zero")
                .mend("give the file its georeferencing"));
        }
        let crs = match (&self.crs, dataset.spatial_ref()) {
            (Some(stated), _) => Crs::from_definition(stated)?,
            (None, Ok(reference)) => Crs::from_reference(&reference)?,
            (None, Err(_)) => {
                return Err(Error::input("the coordinate system")
                    .found("none in the file")
                    .wanted("one that places the grid on the earth")
                    .mend("state crs = \"EPSG:...\" beside the path in the study, if you know it"));
            }
        };
        let bands = dataset.raster_count();
        let raster = Raster {
            format: dataset.driver().short_name(),
            shape: (rows, cols),
            bands,
            data_type: first.band_type().name().to_string(),
            crs,
            crs_stated: self.crs.is_some(),
            transform,
            no_data: first.no_data_value(),
            scaling: (first.scale().unwrap_or(1.0), first.offset().unwrap_or(0.0)),
            unit: match first.unit() {
                // Our own GeoTIFFs carry it as an item, as others do.
                unit if unit.is_empty() => first.metadata_item("units", "").unwrap_or_default(),
                unit => unit,
            },
            depths: (1..=bands).map(|band| band_depth(&dataset, band)).collect(),
            path: self.path.clone(),
            dataset,
        };
        raster.check_size()?;
        Ok(raster)
    }
}

impl Raster {
    /// Path of the file.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Every file that the raster is read from: the file itself first, then what it points to or is accompanied by.
    pub fn files(&self) -> Vec<PathBuf> {
        let others = files_of(&self.dataset).into_iter().filter(|file| *file != self.path && file.is_file());
        std::iter::once(self.path.clone()).chain(others).collect()
    }

    /// One band (counted from 1) on the raster's own cells, whatever its system: scaled, NaN where there is no data.
    ///
    /// # Errors
    /// Data that cannot be read.
    pub fn own_cells(&self, band: usize) -> Result<Array2<f64>> {
        let (rows, cols) = self.shape;
        self.read(band, Window { row: 0, col: 0, rows, cols })
    }

    /// The raster's own cells as a frame; `None` unless it is north-up, of square cells, in a projected system in metres.
    pub fn own_frame(&self) -> Option<Frame> {
        let [west, across, turn_x, north, turn_y, down] = self.transform;
        let straight = turn_x == 0.0 && turn_y == 0.0 && across > 0.0 && (across + down).abs() <= SQUARE * across;
        let (rows, cols) = self.shape;
        if straight { Frame::new(self.crs.clone(), west, north, across, rows, cols).ok() } else { None }
    }

    /// The box that the raster covers, in its own system.
    pub fn extent(&self) -> Extent {
        let (rows, cols) = (self.shape.0 as f64, self.shape.1 as f64);
        let corners = [(0.0, 0.0), (0.0, cols), (rows, 0.0), (rows, cols)].map(|(row, col)| self.position(row, col));
        corners.iter().fold(
            Extent { west: f64::INFINITY, south: f64::INFINITY, east: f64::NEG_INFINITY, north: f64::NEG_INFINITY },
            |extent, &(x, y)| extent.or(Extent { west: x, south: y, east: x, north: y }),
        )
    }

    /// The box that the raster covers, in another system.
    ///
    /// # Errors
    /// When it cannot be carried over.
    pub fn extent_in(&self, crs: &Crs) -> Result<Extent> {
        self.extent().carried(&self.crs, crs).map_err(|error| error.file(&self.path))
    }

    /// Side of a cell in metres, measured in a projected system at the middle of the raster: the mean of both sides.
    ///
    /// # Errors
    /// When the middle has no place in that system.
    pub fn cell_in(&self, crs: &Crs) -> Result<f64> {
        let (row, col) = (self.shape.0 as f64 / 2.0, self.shape.1 as f64 / 2.0);
        let here = [(row, col), (row + 1.0, col), (row, col + 1.0)].map(|(row, col)| self.position(row, col));
        let there = super::carry(&here, &self.crs, crs).map_err(|error| error.file(&self.path))?;
        let side = |to: usize| (there[to].0 - there[0].0).hypot(there[to].1 - there[0].1);
        let cell = (side(1) + side(2)) / 2.0 * crs.metres_per_unit;
        if cell.is_finite() && cell > 0.0 {
            return Ok(cell);
        }
        Err(Error::input("the raster's position")
            .file(&self.path)
            .found(format!("a middle that has no place in {}", crs.name))
            .wanted("an area that both systems cover")
            .mend("check the coordinate system of the layer and of the frame"))
    }

    /// Map coordinates of a corner given in rows and columns from the first cell's outer corner.
    fn position(&self, row: f64, col: f64) -> (f64, f64) {
        let t = &self.transform;
        (t[0] + col * t[1] + row * t[2], t[3] + col * t[4] + row * t[5])
    }

    /// The cells that a box in the raster's own system touches, with a margin, or `None` outside.
    pub(super) fn window(&self, extent: Extent, margin: f64) -> Option<Window> {
        let t = &self.transform;
        let determinant = t[1] * t[5] - t[2] * t[4];
        let cell = |x: f64, y: f64| {
            let (dx, dy) = (x - t[0], y - t[3]);
            ((dy * t[1] - dx * t[4]) / determinant, (dx * t[5] - dy * t[2]) / determinant)
        };
        let corners = [
            cell(extent.west, extent.south),
            cell(extent.west, extent.north),
            cell(extent.east, extent.south),
            cell(extent.east, extent.north),
        ];
        let span = |part: fn(&(f64, f64)) -> f64, most: usize| {
            let low = corners.iter().map(part).fold(f64::INFINITY, f64::min) - margin;
            let high = corners.iter().map(part).fold(f64::NEG_INFINITY, f64::max) + margin;
            let (low, high) = (low.floor().max(0.0), high.ceil().min(most as f64));
            (low < high).then_some((low as usize, (high - low) as usize))
        };
        let (row, rows) = span(|corner| corner.0, self.shape.0)?;
        let (col, cols) = span(|corner| corner.1, self.shape.1)?;
        Some(Window { row, col, rows, cols })
    }

    /// The position of a window's first cell, in GDAL's order, when `pad` cells are set around it.
    pub(super) fn window_transform(&self, window: Window, pad: usize) -> [f64; 6] {
        let (x, y) = self.position(window.row as f64 - pad as f64, window.col as f64 - pad as f64);
        let t = &self.transform;
        [x, t[1], t[2], y, t[4], t[5]]
    }

    /// Reads the values of a window of one band (counted from 1): scaled, NaN where the file has no data.
    pub(super) fn read(&self, band: usize, window: Window) -> Result<Array2<f64>> {
        let failed = |source: gdal::errors::GdalError| {
            Error::input(format!("reading band {band}"))
                .file(&self.path)
                .found("data that cannot be read")
                .wanted("a whole file")
                .mend("copy or write the file again; it may be cut short")
                .because(Reason(source))
        };
        if band == 0 || band > self.bands {
            return Err(Error::input("the band")
                .file(&self.path)
                .found(format!("band {band} asked for, {} in the file", self.bands))
                .wanted(format!("a band from 1 to {}", self.bands))
                .mend("set band"));
        }
        if window.rows.saturating_mul(window.cols) > Frame::MOST_CELLS {
            return Err(Error::input("the part of the raster that the frame covers")
                .file(&self.path)
                .found(format!("{} x {} cells", window.rows, window.cols))
                .wanted(format!("at most {}", Frame::MOST_CELLS))
                .mend("make the frame smaller, or thin the raster out beforehand"));
        }
        let opened = self.dataset.rasterband(band).map_err(failed)?;
        let (at, size) = ((window.col as isize, window.row as isize), (window.cols, window.rows));
        let numbers = opened.read_as::<f64>(at, size, size, None).map_err(failed)?;
        let present =
            opened.open_mask_band().and_then(|mask| mask.read_as::<u8>(at, size, size, None)).map_err(failed)?;
        let (scale, offset) = (opened.scale().unwrap_or(1.0), opened.offset().unwrap_or(0.0));
        let mut infinite = 0usize;
        let values: Vec<f64> = numbers
            .data()
            .iter()
            .zip(present.data())
            .map(|(number, present)| {
                let value = if *present == 0 { f64::NAN } else { number * scale + offset };
                infinite += usize::from(value.is_infinite());
                value
            })
            .collect();
        if infinite > 0 {
            return Err(Error::input(format!("band {band}"))
                .file(&self.path)
                .found(format!("{infinite} infinite values"))
                .wanted("finite numbers, or no data")
                .mend("mark those cells as no data"));
        }
        Array2::from_shape_vec((window.rows, window.cols), values)
            .map_err(|source| Error::ours("shaping what was read").file(&self.path).because(source))
    }

    /// Refuses a header that claims far more cells than its files could hold, before memory is taken.
    fn check_size(&self) -> Result<()> {
        let (rows, cols) = (self.shape.0 as u64, self.shape.1 as u64);
        // A virtual raster holds no cells of its own; the files that it points to are checked by reading.
        if self.format == "VRT" || self.format == "MEM" {
            return Ok(());
        }
        // Some formats keep a small header beside the data, others are folders.
        if self.path.is_dir() {
            return Ok(());
        }
        let held: u64 =
            self.files().iter().filter_map(|file| std::fs::metadata(file).ok()).map(|data| data.len()).sum();
        let claimed = rows.saturating_mul(cols).saturating_mul(self.bands as u64);
        if claimed / MOST_COMPRESSION > held {
            return Err(Error::input("the raster's header")
                .found(format!(
                    "{rows} x {cols} cells in each of {} bands, claimed by a file of {held} bytes",
                    self.bands
                ))
                .wanted("no more cells than the file could hold")
                .mend("write the file again; its header is wrong or it is cut short"));
        }
        Ok(())
    }
}

/// Depth of a band in metres, positive down, from a CF axis that GDAL reports as band metadata.
fn band_depth(dataset: &Dataset, band: usize) -> Option<f64> {
    let entries = dataset.rasterband(band).ok()?.metadata_domain("")?;
    let (axis, value) = entries.iter().find_map(|entry| entry.strip_prefix("NETCDF_DIM_")?.split_once('='))?;
    let value: f64 = value.trim().parse().ok()?;
    let attribute = |name: &str| dataset.metadata_item(&format!("{axis}#{name}"), "").unwrap_or_default();
    let scale = match attribute("units").as_str() {
        "km" | "kilometer" | "kilometers" | "kilometre" | "kilometres" => 1000.0,
        _ => 1.0,
    };
    let sign = if attribute("positive").eq_ignore_ascii_case("up") { -1.0 } else { 1.0 };
    Some(value * scale * sign)
}

/// GDAL would print its own messages; salband hands them on inside its errors instead.
pub(super) fn silence_gdal() {
    static ONCE: std::sync::Once = std::sync::Once::new();
    ONCE.call_once(|| {
        gdal::config::set_error_handler(|_, _, _| {});
        // ASCII grids are read in single precision otherwise, which a level of 980,000 mGal does not survive. A setting
        // that GDAL does not take leaves things as they were.
        let _ = gdal::config::set_config_option("AAIGRID_DATATYPE", "Float64");
    });
}
