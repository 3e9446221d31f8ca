//! `salband inspect`: what a file holds and how it would be read.

use std::path::Path;

use super::commands::say;
use crate::error::Result;
use crate::study::inspect;

pub(super) fn print(file: &Path, variable: Option<String>, crs: Option<String>) -> Result<()> {
    say(&inspect(file, variable, crs)?)
}
