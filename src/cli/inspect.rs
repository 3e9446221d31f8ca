//! `salband inspect`: what a file holds and how it would be read.

use std::path::Path;

use crate::error::Result;
use crate::grid::{Source, describe_layers};

pub(super) fn print(file: &Path, variable: Option<String>, crs: Option<String>) -> Result<()> {
    let source = Source { path: file.to_path_buf(), variable, crs };
    match source.open() {
        Ok(raster) => {
            println!("{}", raster.describe()?);
            Ok(())
        }
        // Not a raster: perhaps a vector file; if not that either, the raster's error tells more.
        Err(error) => match describe_layers(file) {
            Some(text) => {
                println!("{text}");
                Ok(())
            }
            None => Err(error),
        },
    }
}
