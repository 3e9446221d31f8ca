//! The one door to GDAL's warper: the safe bindings know only bilinear resampling without options.

use std::ffi::{CStr, c_int};
use std::ptr;

use gdal::Dataset;
use gdal::cpl::CslStringList;

use super::Resampler;
use crate::error::{Error, Result};

/// Resamples the first band of `source` onto the grid of `target`, both of doubles with NaN as no-data.
///
/// Cells of the target that no source cell reaches become NaN. Coordinates are transformed exactly for every cell.
///
/// # Errors
/// When GDAL refuses the options or the warp fails; its own message is handed on.
pub(super) fn warp(source: &Dataset, target: &mut Dataset, resampler: Resampler) -> Result<()> {
    let failed = |message: String| Error::ours("placing a raster on the frame").because(message);
    let mut arguments = CslStringList::new();
    let common = [
        "-r",
        resampler.name(),
        "-srcnodata",
        "nan",
        "-dstnodata",
        "nan",
        "-wt",
        "Float64",
        "-et",
        "0",
        "-wo",
        "INIT_DEST=NO_DATA",
        "-wo",
        "SAMPLE_GRID=YES",
        "-wo",
        "NUM_THREADS=1",
    ];
    // Left to itself, GDAL stretches the cubic kernel for every small coarsening, and a stretched kernel no longer
    // reproduces a sloping plane: at a ratio of 1.8 it was wrong by 1 % of a cell.
    let unstretched = match resampler {
        Resampler::Cubic => ["-wo", "XSCALE=1", "-wo", "YSCALE=1"].as_slice(),
        Resampler::Average => &[],
    };
    for option in common.iter().chain(unstretched) {
        arguments.add_string(option).map_err(|source| failed(source.to_string()))?;
    }
    // SAFETY: `arguments` owns a null-terminated list of strings that outlives the call, which copies what it keeps;
    // the second argument may be null (gdal_utils.h).
    let prepared = unsafe { gdal_sys::GDALWarpAppOptionsNew(arguments.as_ptr(), ptr::null_mut()) };
    if prepared.is_null() {
        return Err(failed(last_message()));
    }
    let mut sources = [source.c_dataset()];
    let mut misused: c_int = 0;
    // SAFETY: both dataset handles come from live `Dataset`s borrowed for the whole call, the target exclusively;
    // `sources` holds exactly the one handle announced; `prepared` is not null; with a target handle given, the name
    // may be null, and the handle returned is the target itself, which stays owned by `target`.
    let warped = unsafe {
        gdal_sys::CPLErrorReset();
        gdal_sys::GDALWarp(ptr::null(), target.c_dataset(), 1, sources.as_mut_ptr(), prepared, &mut misused)
    };
    // SAFETY: `prepared` came from GDALWarpAppOptionsNew, is not null and is freed only here.
    unsafe { gdal_sys::GDALWarpAppOptionsFree(prepared) };
    if warped.is_null() || misused != 0 {
        return Err(failed(last_message()));
    }
    Ok(())
}

/// What GDAL last said on this thread.
fn last_message() -> String {
    // SAFETY: GDAL returns a pointer to a null-terminated string of this thread (never null), valid until the next
    // error on it; the text is copied before anything else is called.
    let message = unsafe { CStr::from_ptr(gdal_sys::CPLGetLastErrorMsg()) }.to_string_lossy().into_owned();
    if message.is_empty() { "GDAL gave no reason".into() } else { message }
}
