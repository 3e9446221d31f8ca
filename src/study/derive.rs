//! One transform of one raster, from file to file.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::error::{Error, Result};
use crate::field::{Transform, derive};
use crate::grid::{Crs, Frame, Raster, Source, true_north, write_raster};

/// Parameters that are azimuths from true north, as reference models give them.
const AZIMUTHS: [&str; 2] = ["declination", "magnetisation-declination"];

/// A cell whose sides differ by less than this share is square.
const SQUARE: f64 = 1e-6;

/// What to derive, from what, to where.
#[derive(Debug, Clone)]
pub struct Derivation {
    /// Name of the transform, one of [`Transform::names`].
    pub transform: String,
    /// Its parameters by name; declinations from true north.
    pub parameters: BTreeMap<String, f64>,
    /// The raster's file.
    pub path: PathBuf,
    /// The variable, for files that hold several.
    pub variable: Option<String>,
    /// The coordinate system, if the file has none.
    pub crs: Option<String>,
    /// The band, counted from 1.
    pub band: usize,
    /// Unit of the raster's values; `None` takes the one that the file states.
    pub unit: Option<String>,
    /// A projected system to place the raster on; `None` keeps its own.
    pub onto: Option<String>,
    /// Side of a cell of that frame, m; `None` keeps the raster's own.
    pub cell: Option<f64>,
    /// The GeoTIFF to write.
    pub out: PathBuf,
    /// Replace the file if it exists.
    pub replace: bool,
}

/// Derives one product of a raster and writes it as a GeoTIFF, whole or not at all; returns what was done in words.
///
/// A north-up raster of square cells in a projected system in metres keeps its cells; any other is placed on such a frame
/// first, as a study would place it.
///
/// # Errors
/// A transform or parameter that is not known, a raster that cannot be read or is in degrees, a layer that cannot be
/// transformed, a file that exists already or cannot be written.
pub fn derive_raster(choice: &Derivation) -> Result<String> {
    if choice.out.exists() && !choice.replace {
        return Err(Error::input("the file to write")
            .file(&choice.out)
            .found("a file at this path already")
            .wanted("a new path")
            .mend("choose another name, or add --replace"));
    }
    // Before any file is read, so that a wrong name or parameter is told at once.
    Transform::named(&choice.transform, &choice.parameters)?;
    let source = Source { path: choice.path.clone(), variable: choice.variable.clone(), crs: choice.crs.clone() };
    let raster = source.open()?;
    if choice.band == 0 || choice.band > raster.bands {
        return Err(Error::input("the band")
            .file(raster.path())
            .found(format!("band {} asked for, {} in the file", choice.band, raster.bands))
            .wanted(format!("a band from 1 to {}", raster.bands))
            .mend("set --band"));
    }
    let at_raster = |error: Error| error.file(raster.path());
    let frame = frame_of(&raster, choice).map_err(at_raster)?;
    let transform = Transform::named(&choice.transform, &from_grid_north(&choice.parameters, &frame)?)?;
    let placed = raster.place(choice.band, &frame, Ok)?;
    let product = derive(&placed.grid, &transform).map_err(at_raster)?;
    let unit = transform.product_unit(choice.unit.as_deref().unwrap_or(&raster.unit));
    let given: Vec<String> = choice.parameters.iter().map(|(name, value)| format!("{name} {value}")).collect();
    let title = [vec![choice.transform.clone()], given].concat().join(", ");
    whole(&choice.out, |path| write_raster(path, &product, &title, &unit))?;
    let range = match product.range() {
        Some((low, high)) => format!("{low:.6} to {high:.6}"),
        None => "no number".into(),
    };
    Ok(format!(
        "Wrote {}: {title}; {} rows x {} columns of {} m in {}; {range} {unit}",
        choice.out.display(),
        frame.rows,
        frame.cols,
        frame.cell,
        frame.crs.name
    ))
}

/// The parameters with azimuths turned from true north to the frame's grid north.
fn from_grid_north(parameters: &BTreeMap<String, f64>, frame: &Frame) -> Result<BTreeMap<String, f64>> {
    let mut turned = parameters.clone();
    for name in AZIMUTHS {
        if let Some(azimuth) = turned.get_mut(name) {
            *azimuth += true_north(frame)?;
        }
    }
    Ok(turned)
}

/// The frame on which a raster is transformed.
fn frame_of(raster: &Raster, choice: &Derivation) -> Result<Frame> {
    let [west, across, turn_x, north, turn_y, down] = raster.transform;
    let straight = turn_x == 0.0 && turn_y == 0.0 && across > 0.0 && (across + down).abs() <= SQUARE * across;
    if choice.onto.is_none() && choice.cell.is_none() && straight {
        let (rows, cols) = raster.shape;
        return Frame::new(raster.crs.clone(), west, north, across, rows, cols)
            .map_err(|error| error.mend("name a projected system in metres with --onto EPSG:..."));
    }
    let crs = match &choice.onto {
        Some(definition) => Crs::from_definition(definition)?,
        None => raster.crs.clone(),
    };
    if crs.geographic {
        // The refusal in words is the frame's own.
        return Frame::new(crs, 0.0, 0.0, 1.0, 1, 1)
            .map_err(|error| error.mend("name a projected system in metres with --onto EPSG:..."));
    }
    let extent = raster.extent_in(&crs)?;
    let cell = match choice.cell {
        Some(cell) if cell.is_finite() && cell > 0.0 => cell,
        Some(cell) => {
            return Err(Error::input("the frame's cell size")
                .found(cell)
                .wanted("a positive number of metres")
                .mend("set --cell"));
        }
        None => raster.cell_in(&crs)?,
    };
    let count = |length: f64| ((length / cell - 1e-6).ceil().max(1.0)) as usize;
    Frame::new(
        crs,
        extent.west,
        extent.north,
        cell,
        count(extent.north - extent.south),
        count(extent.east - extent.west),
    )
}

/// Writes a file beside its place and renames it there, so that it is whole or not there at all.
fn whole(path: &Path, write: impl Fn(&Path) -> Result<()>) -> Result<()> {
    let name = path.file_name().map_or_else(|| "raster".into(), |name| name.to_string_lossy().into_owned());
    let partial = path.with_file_name(format!(".{name}.{}.partial.tif", std::process::id()));
    let done = write(&partial).map_err(|error| error.file(path)).and_then(|()| {
        std::fs::rename(&partial, path).map_err(|source| {
            Error::input("the file to write")
                .file(path)
                .found("a path that cannot be written")
                .wanted("a writable folder")
                .because(source)
        })
    });
    if done.is_err() {
        // What is left of a failed write is of no use; that it may be gone already is no error.
        let _ = std::fs::remove_file(&partial);
    }
    done
}

/// Every transform with its parameters, in words.
pub fn describe_transforms() -> String {
    let mut text = String::from("Transforms of a raster; azimuths are clockwise from true north:\n");
    for entry in Transform::list() {
        text.push_str(&format!("\n  {:<22} {}\n", entry.name, entry.gives));
        for parameter in entry.parameters {
            let needed = if parameter.needed { "" } else { ", may be left out" };
            text.push_str(&format!("    {:<26} {}; {}{needed}\n", parameter.name, parameter.unit, parameter.purpose));
        }
    }
    text.push_str("\nFor example: salband derive upward bouguer.tif --with height=1000 --out up.tif\n");
    text
}
