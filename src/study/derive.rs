//! One transform of one raster, from file to file.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use super::frame_choice::refuse_distortion;
use crate::error::{Error, Result};
use crate::evidence::significant;
use crate::field::{LEAST_SIDE, Transform, derive};
use crate::grid::{Crs, Frame, Raster, Source, true_north, write_raster};

/// Parameters that are azimuths from true north, as reference models give them.
const AZIMUTHS: [&str; 2] = ["declination", "magnetisation-declination"];

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
    refuse_place(&choice.out)?;
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
    let real = |path: &Path| std::fs::canonicalize(path).ok();
    if raster.files().iter().chain([&choice.path]).any(|read| real(read).is_some() && real(read) == real(&choice.out)) {
        return Err(Error::input("the file to write")
            .file(&choice.out)
            .found("a file that the raster is read from")
            .wanted("another path, since the raster would be lost")
            .mend("choose another name"));
    }
    if choice.band == 0 || choice.band > raster.bands {
        return Err(Error::input("the band")
            .file(raster.path())
            .found(format!("band {} asked for, {} in the file", choice.band, raster.bands))
            .wanted(format!("a band from 1 to {}", raster.bands))
            .mend("set --band"));
    }
    let at_raster = |error: Error| error.file(raster.path());
    let frame = frame_of(&raster, choice).map_err(at_raster)?;
    // Before the raster is read: a huge cell would ask for as much memory around it.
    if frame.rows.min(frame.cols) < LEAST_SIDE {
        return Err(at_raster(
            Error::input("the frame's shape")
                .found(format!("{} rows x {} columns", frame.rows, frame.cols))
                .wanted(format!("at least {LEAST_SIDE} rows and {LEAST_SIDE} columns"))
                .mend("choose a smaller --cell or a larger raster"),
        ));
    }
    let another = "name a system made for the area with --onto EPSG:CODE";
    refuse_distortion(&frame).map_err(|error| at_raster(error).mend(another))?;
    let longest = frame.rows.max(frame.cols) as f64 * frame.cell;
    if let Some(height) = choice.parameters.get("height").filter(|height| **height > longest) {
        return Err(at_raster(
            Error::input("the height")
                .found(format!("{height} m"))
                .wanted(format!(
                    "at most the raster's longer side, {longest} m: nothing of the field is left higher up"
                ))
                .mend("check that it is in metres"),
        ));
    }
    let transform = Transform::named(&choice.transform, &from_grid_north(&choice.parameters, &frame)?)?;
    let placed = raster.place(choice.band, &frame, Ok)?;
    let product = derive(&placed.grid, &transform).map_err(at_raster)?;
    let known = choice.unit.as_deref().unwrap_or(&raster.unit);
    // A unit made from one that is not known would claim a pure number.
    let made_from_it = transform.product_unit("U") != transform.product_unit("V");
    let unit = if known.is_empty() && made_from_it { String::new() } else { transform.product_unit(known) };
    let given: Vec<String> = choice.parameters.iter().map(|(name, value)| format!("{name} {value}")).collect();
    let title = [vec![choice.transform.clone()], given].concat().join(", ");
    whole(&choice.out, |path| write_raster(path, &product, &title, &unit))?;
    let range = match product.range() {
        Some((low, high)) => format!("{} to {}", significant(low, 5), significant(high, 5)),
        None => "no number".into(),
    };
    let unit = if unit.is_empty() { "in a unit that is not known: state it with --unit".into() } else { unit };
    Ok(format!(
        "Wrote {}: {title}, of band {}; {} rows x {} columns of {} m in {}; {range} {unit}",
        choice.out.display(),
        choice.band,
        frame.rows,
        frame.cols,
        significant(frame.cell, 6),
        frame.crs.name
    ))
}

/// The parameters with azimuths turned from true north to the frame's grid north.
fn from_grid_north(parameters: &BTreeMap<String, f64>, frame: &Frame) -> Result<BTreeMap<String, f64>> {
    let mut turned = parameters.clone();
    for name in AZIMUTHS {
        if let Some(azimuth) = turned.get_mut(name)
            && (-360.0..=360.0).contains(azimuth)
        {
            // Brought to [-180, 180), so that the turn does not lead out of what a direction takes.
            *azimuth = (*azimuth + true_north(frame)? + 180.0).rem_euclid(360.0) - 180.0;
        }
    }
    Ok(turned)
}

/// The frame on which a raster is transformed.
fn frame_of(raster: &Raster, choice: &Derivation) -> Result<Frame> {
    if choice.onto.is_none()
        && choice.cell.is_none()
        && let Some(frame) = raster.own_frame()
    {
        return Ok(frame);
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

/// Refuses a path that no file can be written at.
fn refuse_place(path: &Path) -> Result<()> {
    let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let found = if path.is_dir() {
        "a folder at this path"
    } else if !folder.is_dir() {
        "no such folder"
    } else {
        return Ok(());
    };
    Err(Error::input("the file to write")
        .file(path)
        .found(found)
        .wanted("the path of a GeoTIFF in a folder that exists")
        .mend("choose another path, or make the folder first"))
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
    let mut text = String::from(
        "Transforms of a raster; declinations are clockwise from true north here, other directions from grid north:\n",
    );
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
