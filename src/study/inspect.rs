//! What a file holds and how it would be read, in words.

use std::path::Path;

use crate::error::Result;
use crate::grid::{Source, describe_layers};

/// Describes a raster, or a vector file where it is none.
///
/// # Errors
/// A file that is neither, or a raster that cannot be read.
pub fn inspect(file: &Path, variable: Option<String>, crs: Option<String>) -> Result<String> {
    let source = Source { path: file.to_path_buf(), variable, crs };
    match source.open() {
        Ok(raster) => raster.describe(),
        // If it is not a vector file either, the raster's error tells more.
        Err(error) => describe_layers(file).ok_or(error),
    }
}
