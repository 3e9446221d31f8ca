//! `salband inspect`: what a file holds and how it would be read.

use std::path::Path;

use super::commands::say;
use crate::error::Result;
use crate::grid::{Source, describe_layers};

pub(super) fn print(file: &Path, variable: Option<String>, crs: Option<String>) -> Result<()> {
    let source = Source { path: file.to_path_buf(), variable, crs };
    match source.open() {
        Ok(raster) => say(&raster.describe()?),
        // Not a raster: perhaps a vector file; if not that either, the raster's error tells more.
        Err(error) => match describe_layers(file) {
            Some(text) => say(&text),
            None => Err(error),
        },
    }
}
