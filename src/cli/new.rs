//! `salband new`: writes a commented study file from the files named.

use super::arguments::NewStudy;
use super::commands::say;
use crate::error::{Error, Result};
use crate::study::{NamedFiles, compose};

pub(super) fn write(choice: &NewStudy) -> Result<()> {
    if choice.study.exists() && !choice.replace {
        return Err(Error::input("the study file")
            .file(&choice.study)
            .found("a file at this path already")
            .wanted("a new path")
            .mend("choose another name, or add --replace"));
    }
    let text = compose(&NamedFiles {
        study: choice.study.clone(),
        conductivity: choice.conductivity.clone(),
        gravity: choice.gravity.clone(),
        magnetic: choice.magnetic.clone(),
        lines: choice.lines.clone(),
        units: choice.units.clone(),
        deposits: choice.deposits.clone(),
    })?;
    std::fs::write(&choice.study, text).map_err(|source| {
        Error::input("the study file")
            .file(&choice.study)
            .found("a path that cannot be written")
            .wanted("a writable folder")
            .because(source)
    })?;
    say(&format!("Wrote {}. Read it through, then: salband check {0}", choice.study.display()))
}
