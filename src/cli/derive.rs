//! `salband derive`: one transform of one raster.

use std::collections::BTreeMap;

use super::arguments::Derive;
use super::commands::say;
use crate::error::{Error, Result};
use crate::study::{Derivation, derive_raster, describe_transforms};

pub(super) fn run(choice: Derive) -> Result<()> {
    let (Some(transform), Some(raster), Some(out)) = (choice.transform, choice.raster, choice.out) else {
        return say(&describe_transforms());
    };
    say(&derive_raster(&Derivation {
        transform,
        parameters: parameters(&choice.with)?,
        path: raster,
        variable: choice.variable,
        crs: choice.crs,
        band: choice.band,
        unit: choice.unit,
        onto: choice.onto,
        cell: choice.cell,
        out,
        replace: choice.replace,
    })?)
}

/// Parameters from texts such as `height=500`.
fn parameters(texts: &[String]) -> Result<BTreeMap<String, f64>> {
    let mut parameters = BTreeMap::new();
    for text in texts {
        let refused = |found: String| {
            Error::input("--with").found(found).wanted("NAME=NUMBER, each name once").mend("write --with height=1000")
        };
        let (name, number) = text.split_once('=').ok_or_else(|| refused(format!("{text:?}")))?;
        let number: f64 = number.trim().parse().map_err(|_| refused(format!("{text:?}")))?;
        if parameters.insert(name.trim().to_string(), number).is_some() {
            return Err(refused(format!("{:?} a second time", name.trim())));
        }
    }
    Ok(parameters)
}
