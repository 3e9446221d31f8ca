//! A commented study file from the files that a user names.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use crate::error::{Error, Result};
use crate::grid::Source;

/// The files that a new study is made of.
#[derive(Debug, Clone, Default)]
pub struct NamedFiles {
    /// Where the study will stand; paths in it start at this file's folder.
    pub study: PathBuf,
    /// Slices, or one file with a depth axis.
    pub conductivity: Vec<PathBuf>,
    /// Gravity grids.
    pub gravity: Vec<PathBuf>,
    /// Grids of the total-field magnetic anomaly.
    pub magnetic: Vec<PathBuf>,
    /// Vector files with mapped lines.
    pub lines: Vec<PathBuf>,
    /// Vector files with mapped units.
    pub units: Vec<PathBuf>,
    /// A table of known deposits.
    pub deposits: Option<PathBuf>,
}

/// Composes the text of a study. Rasters are opened to guess the quantity and to see that they can be read; what was
/// guessed is marked for checking, and what cannot be guessed is left as `???`, which `salband check` refuses.
///
/// # Errors
/// No reference among the files, a raster that cannot be read, a file with a depth axis beside single slices.
pub fn compose(choice: &NamedFiles) -> Result<String> {
    if [&choice.gravity, &choice.magnetic, &choice.lines, &choice.units].iter().all(|files| files.is_empty()) {
        return Err(Error::input("the files named")
            .found("no gravity, magnetic, line or unit file")
            .wanted("at least one reference to test the conductors against")
            .mend("add --gravity, --magnetic, --lines or --units"));
    }
    let relative = |path: &Path| quoted(&relative_to(path, choice.study.parent().unwrap_or(Path::new(""))));
    let mut text = String::from(
        "# A salband study. Keys that are commented out show their default. Paths start at this file's folder.\n\
         title = \"Untitled study\"      # stands at the top of the page\n\
         seed  = 1\n\n\
         # The frame that everything is placed on. Left out: the system of the first projected layer, and a cell that\n\
         # resolves the finest layer of the coarser side. `salband check` says what was chosen and why.\n\
         # frame = { crs = \"EPSG:...\", cell = 500.0 }\n\n\
         [conductivity]\n",
    );
    let mut slices = Vec::new();
    let mut volume = None;
    let mut range: Option<(f64, f64)> = None;
    for path in &choice.conductivity {
        let raster = Source::file(path).open()?;
        let (low, high) = raster.value_range(1)?;
        range = Some(range.map_or((low, high), |(l, h)| (l.min(low), h.max(high))));
        if raster.depths.iter().any(Option::is_some) {
            volume = Some((path, raster.depths.clone()));
        } else {
            slices.push((depth_in_name(path), path));
        }
    }
    let (low, high) = range.unwrap_or((1.0, 1.0));
    let guess = if low <= 0.0 || high < 8.0 { "log10-resistivity" } else { "resistivity" };
    let _ = writeln!(
        text,
        "# Guessed from values between {low:.3} and {high:.3}; the others are: resistivity (ohm m), conductivity (S/m),\n\
         # log10-resistivity, log10-conductivity.\n\
         quantity = \"{guess}\"             # CHECK THIS"
    );
    match (volume, slices.is_empty()) {
        (Some((path, depths)), true) => {
            let depths: Vec<String> = depths.iter().flatten().map(|depth| format!("{depth}")).collect();
            let _ = writeln!(text, "# Depths in the file, m: {}\nvolume = {}", depths.join(", "), relative(path));
        }
        (Some((path, _)), false) => {
            return Err(Error::input("the conductivity files")
                .file(path)
                .found("a file with a depth axis beside single slices")
                .wanted("one or the other")
                .mend("name only one of them"));
        }
        (None, _) => {
            slices.sort_by(|a, b| a.0.unwrap_or(f64::INFINITY).total_cmp(&b.0.unwrap_or(f64::INFINITY)));
            let _ = writeln!(
                text,
                "# Depth in metres, positive down, taken from the last number in each file name: CHECK.\nslices = ["
            );
            for (index, (depth, path)) in slices.iter().enumerate() {
                let again = index > 0 && depth.is_some() && slices[index - 1].0 == *depth;
                let note = if again { "   # CHECK: the same depth twice" } else { "" };
                let depth = depth.map_or_else(|| "???".into(), |depth| format!("{depth:?}"));
                let _ = writeln!(text, "  {{ path = {}, depth = {depth} }},{note}", relative(path));
            }
            text.push_str("]\n");
        }
    }
    text.push_str(
        "# What counts as a conductor: a quantile of log10 conductivity (0.80 takes the top fifth), or below a resistivity in\n\
         # ohm m ({ below = 30.0 }), or where two normal populations part ({ mixture = true }).\n\
         conductors = { quantile = 0.80 }\n\
         # resistors = { quantile = 0.15 }   # tested too, if given; or { above = 1000.0 }\n",
    );
    for (paths, kind) in [(&choice.gravity, "gravity"), (&choice.magnetic, "magnetic")] {
        for (index, path) in paths.iter().enumerate() {
            Source::file(path).open()?;
            let name = if index == 0 { kind.to_string() } else { format!("{kind} {}", index + 1) };
            let _ = writeln!(
                text,
                "\n[[potential]]\nname = {}\npath = {}\nkind = \"{kind}\"",
                quoted(&name),
                relative(path)
            );
            if kind == "magnetic" {
                text.push_str(
                    "# Needed: the direction of the earth's field for the place and date of the survey, degrees; or its year.\n\
                     # inclination = 0.0               # positive down\n\
                     # declination = 0.0               # positive east of true north\n\
                     # year = 2012.5                   # in place of both: by the reference model, 1900 to 2025\n\
                     # magnetisation = { inclination = 0.0, declination = 0.0 }   # where not along the field\n",
                );
            }
            text.push_str(
                "# heights = [0.0, 1000.0]         # upward continuation before contacts are picked, m; left out: 0 and, for\n\
                 #                                 # each slice, half its depth\n\
                 # noise = 0.05                    # of one cell, in the grid's unit; left out, it is estimated\n\
                 # contacts = { strong = 0.6, weak = 0.3, significance = 0.05 }   # quantiles of crest strength where lines start\n\
                 #                                 # and end; the chance that noise alone gives a layer any\n",
            );
        }
    }
    for (index, path) in choice.lines.iter().enumerate() {
        let name = if index == 0 { "lines".to_string() } else { format!("lines {}", index + 1) };
        let _ = writeln!(text, "\n[[lines]]\nname = {}\npath = {}", quoted(&name), relative(path));
    }
    for (index, path) in choice.units.iter().enumerate() {
        let name = if index == 0 { "units".to_string() } else { format!("units {}", index + 1) };
        let _ = writeln!(
            text,
            "\n[[units]]\nname = {}\npath = {}\n# keep = {{ column = \"...\", is = [\"...\"] }}   # which polygons; salband inspect \
             lists columns and values\n# role = \"reference\"   # or \"subject\": moved over contacts, lines and units that stay",
            quoted(&name),
            relative(path)
        );
    }
    if let Some(path) = &choice.deposits {
        let _ = writeln!(
            text,
            "\n[deposits]\npath = {}\n# crs = \"EPSG:4326\"\n\
             # columns = {{ x = \"longitude\", y = \"latitude\", name = \"name\" }}",
            relative(path)
        );
    }
    text.push_str(
        "\n[test]\n\
         # within = [500.0, 1000.0, 2000.0]   # metres; default: 1, 2 and 4 cells\n\
         # family = 0.05                      # level of the whole family of tests\n\
         # height_per_depth = 0.5             # heights that go with each slice, where a field lists none\n\
         # resolution = \"as-is\"               # or \"matched\": all layers of a depth brought to one resolving length\n",
    );
    Ok(text)
}

/// The last number in a file's name, read as a depth in metres.
fn depth_in_name(path: &Path) -> Option<f64> {
    let stem = path.file_stem()?.to_str()?;
    let digits = stem.split(|c: char| !c.is_ascii_digit()).rfind(|part| !part.is_empty())?;
    digits.parse().ok()
}

/// A path as seen from a folder, where it lies below that folder; absolute otherwise.
fn relative_to(path: &Path, folder: &Path) -> String {
    let absolute = |path: &Path| std::path::absolute(path).unwrap_or_else(|_| PathBuf::from(path));
    let (path, folder) = (absolute(path), absolute(folder));
    path.strip_prefix(&folder).unwrap_or(&path).display().to_string()
}

/// A text as a TOML string.
fn quoted(text: &str) -> String {
    toml::Value::String(text.to_string()).to_string()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn depths_come_from_the_last_number() {
        assert_eq!(depth_in_name(Path::new("block2_rho_1500.tif")), Some(1500.0));
        assert_eq!(depth_in_name(Path::new("rho_0150m.asc")), Some(150.0));
        assert_eq!(depth_in_name(Path::new("rho.tif")), None);
    }

    #[test]
    fn paths_below_the_study_are_relative_and_quoted() {
        assert_eq!(relative_to(Path::new("/data/a/rho.tif"), Path::new("/data")), "a/rho.tif");
        assert_eq!(relative_to(Path::new("/other/rho.tif"), Path::new("/data")), "/other/rho.tif");
        assert_eq!(quoted("a \"b\""), r#"'a "b"'"#);
    }
}
