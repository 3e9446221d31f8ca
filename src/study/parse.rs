//! From the text of a study file to a checked study.

use std::ops::Range;
use std::path::{Path, PathBuf};

use toml::Spanned;

use super::schema::{BodyKeys, ConductivityKeys, StudyKeys, TestKeys};
use super::settings::{
    BodyChoice, Conductivity, Deposits, FrameChoice, MappedUnits, Model, Resolution, SliceChoice, Study, TestChoice,
    UnitRole,
};
use crate::coincidence::SMALLEST_P;
use crate::conductor::{Quantity, Threshold};
use crate::error::{Error, Result};
use crate::grid::Source;

/// The seed of a study that names none.
pub const DEFAULT_SEED: u64 = 1;

/// The level of the family when the study names none (common practice, no source).
pub const DEFAULT_LEVEL: f64 = 0.05;

/// Height of upward continuation over depth of a slice, where a field lists no heights: a field continued upward by h shows
/// mostly sources below h / 2 (Jacobsen 1987, Geophysics 52, 1138-1148), but a body that reaches a depth d shows its margin
/// from its top on, so that less than 2 d is wanted; a half is common practice, no source.
pub const DEFAULT_HEIGHT_PER_DEPTH: f64 = 0.5;

impl Study {
    /// Reads and checks a study file. No layer is opened yet.
    ///
    /// # Errors
    /// A file that cannot be read, is not TOML, has an unknown key (the nearest known one is named), lacks one that is
    /// needed, or holds a value out of range; the message names the line.
    pub fn read(path: &Path) -> Result<Self> {
        let text = std::fs::read_to_string(path).map_err(|source| {
            let found = match source.kind() {
                std::io::ErrorKind::NotFound => "nothing at this path",
                std::io::ErrorKind::InvalidData => "bytes that are not UTF-8 text",
                _ => "a file that cannot be read",
            };
            Error::input("the study file")
                .file(path)
                .found(found)
                .wanted("a readable TOML file")
                .mend("check the path, or make one with: salband new")
        })?;
        Self::parse(&text, path)
    }

    /// As [`Study::read`], from text; relative paths start at the folder of `path`.
    ///
    /// # Errors
    /// As [`Study::read`].
    pub fn parse(text: &str, path: &Path) -> Result<Self> {
        let place = Place { text, path };
        let keys: StudyKeys = toml::from_str(text).map_err(|error| place.explain(&error))?;
        place.check(keys)
    }
}

/// The file that is being read, to name lines in messages.
pub(super) struct Place<'a> {
    text: &'a str,
    pub(super) path: &'a Path,
}

impl Place<'_> {
    pub(super) fn error(&self, thing: impl Into<String>) -> Error {
        Error::input(thing).file(self.path)
    }

    pub(super) fn at(&self, thing: impl Into<String>, span: Range<usize>) -> Error {
        self.error(thing).line(self.line(span.start))
    }

    fn line(&self, byte: usize) -> usize {
        1 + self.text.as_bytes()[..byte.min(self.text.len())].iter().filter(|byte| **byte == b'\n').count()
    }

    /// Turns the parser's error into one that names the nearest known key.
    fn explain(&self, error: &toml::de::Error) -> Error {
        let message = error.message();
        let located = |thing: &str| match error.span() {
            Some(span) => self.at(thing, span),
            None => self.error(thing),
        };
        let quoted = |text: &str| text.split('`').nth(1).map(str::to_string);
        if let Some(rest) = message.strip_prefix("unknown field ") {
            let unknown = quoted(rest).unwrap_or_default();
            let known: Vec<&str> = rest.split('`').skip(3).step_by(2).collect();
            let nearest = known
                .iter()
                .max_by(|a, b| strsim::jaro_winkler(a, &unknown).total_cmp(&strsim::jaro_winkler(b, &unknown)));
            let located = located("a key").found(format!("{unknown:?}, which is not known here"));
            return match nearest {
                Some(nearest) => located
                    .wanted(format!("one of: {}", known.join(", ")))
                    .mend(format!("if you meant {nearest:?}, write that; otherwise take the key out")),
                None => located,
            };
        }
        if let Some(rest) = message.strip_prefix("missing field ") {
            let name = quoted(rest).unwrap_or_default();
            return located("a key")
                .found(format!("no {name:?}"))
                .wanted("it, since it has no default")
                .mend(format!("add a line {name} = ... here"));
        }
        located("the study file")
            .found(message.trim().replace('\n', "; "))
            .wanted("a valid value here")
            .mend("mend this line; texts stand in quotes, numbers do not")
    }

    fn check(&self, keys: StudyKeys) -> Result<Study> {
        if let Some(control) = &keys.control {
            return Err(self
                .at("[[control]]", control.span())
                .found("a layer to take out")
                .wanted("none, since this version cannot take controls out and would answer as if they were not there")
                .mend("take [[control]] out and read the answer with the cautions on the page"));
        }
        if keys.title.trim().is_empty() {
            return Err(self.error("title").found("an empty text").wanted("a title for the page"));
        }
        let units = keys.units.into_iter().map(|keys| (keys.name.clone(), self.units(keys)));
        let (unit_names, units): (Vec<_>, Vec<_>) = units.unzip();
        let units = units.into_iter().collect::<Result<Vec<MappedUnits>>>()?;
        let stays = units.iter().any(|units| units.role == UnitRole::Reference);
        if keys.potential.is_empty() && keys.lines.is_empty() && !stays {
            return Err(self
                .error("the study")
                .found("no [[potential]], no [[lines]] and no [[units]] that stay")
                .wanted("at least one reference to test the conductors against")
                .mend("add a [[potential]] with name and path"));
        }
        let mapped: Vec<Spanned<String>> = keys.lines.iter().map(|keys| keys.name.clone()).chain(unit_names).collect();
        let names = keys.potential.iter().map(|keys| keys.name.clone());
        let names: Vec<Spanned<String>> = names.chain(mapped.iter().cloned()).collect();
        let potentials = keys.potential.into_iter().map(|keys| self.potential(keys)).collect::<Result<Vec<_>>>()?;
        let lines = keys.lines.into_iter().map(|keys| self.lines(keys)).collect::<Result<Vec<_>>>()?;
        self.refuse_twins(&names)?;
        self.refuse_taken(&potentials, &mapped)?;
        let test = self.test(&keys.test)?;
        let listed = potentials.iter().find(|field| field.heights.is_some());
        if let (Resolution::Matched, Some(field)) = (test.resolution, listed) {
            return Err(self
                .error(format!("potential {:?}", field.name))
                .found("heights beside test.resolution = \"matched\"")
                .wanted("one of them, since matching finds the height of each slice")
                .mend("take heights out, or write resolution = \"as-is\""));
        }
        let moved = units.iter().find(|units| units.role == UnitRole::Subject);
        if let (Resolution::Matched, Some(units)) = (test.resolution, moved) {
            return Err(self
                .error(format!("units {:?}", units.name))
                .found("units that are moved beside test.resolution = \"matched\"")
                .wanted("one of them, since matched fields belong to slices and units to none")
                .mend("write resolution = \"as-is\", or test the units in a study of their own"));
        }
        let cell = keys.frame.cell.as_ref().map(|cell| self.positive("frame.cell", "metres", cell)).transpose()?;
        Ok(Study {
            path: self.path.to_path_buf(),
            title: keys.title.trim().to_string(),
            seed: self.seed(keys.seed)?,
            frame: FrameChoice { crs: keys.frame.crs.map(Spanned::into_inner), cell },
            conductivity: self.conductivity(keys.conductivity)?,
            potentials,
            lines,
            units,
            deposits: keys.deposits.map(|keys| Deposits {
                path: self.join(&keys.path),
                crs: keys.crs,
                columns: keys.columns.map(|columns| [columns.x, columns.y, columns.name]),
            }),
            test,
        })
    }

    fn conductivity(&self, keys: ConductivityKeys) -> Result<Conductivity> {
        if let Some(table) = keys.table.as_ref().or(keys.columns.as_ref()) {
            return Err(self
                .at("conductivity.table", table.span())
                .found("a model in a table")
                .wanted("slices or a volume, since this version does not grid tables")
                .mend("grid each depth to a raster and list it under slices"));
        }
        let quantity = Quantity::from_name(keys.quantity.get_ref()).ok_or_else(|| {
            self.at("conductivity.quantity", keys.quantity.span())
                .found(format!("{:?}", keys.quantity.get_ref()))
                .wanted(format!("one of: {}", Quantity::names().join(", ")))
        })?;
        let model = match (keys.slices, keys.volume) {
            (Some(slices), None) => {
                if let Some(key) = [
                    keys.variable.as_ref().map(|_| "variable"),
                    keys.depths.as_ref().map(|_| "depths"),
                    keys.crs.as_ref().map(|_| "crs"),
                ]
                .into_iter()
                .flatten()
                .next()
                {
                    return Err(self
                        .error(format!("conductivity.{key}"))
                        .found("it beside slices")
                        .wanted("it beside volume only")
                        .mend(format!("move {key} into each slice, or take it out")));
                }
                Model::Slices(self.slices(slices)?)
            }
            (None, Some(path)) => Model::Volume {
                source: Source { path: self.join(&path), variable: keys.variable, crs: keys.crs },
                depths: keys.depths,
            },
            (found, _) => {
                return Err(self
                    .error("[conductivity]")
                    .found(if found.is_some() { "both slices and volume" } else { "neither slices nor volume" })
                    .wanted("one of them")
                    .mend("list the depth slices under slices, or name one file under volume"));
            }
        };
        let conductors = match keys.conductors {
            Some(keys) => self.bodies("conductors", "below", &keys)?,
            None => BodyChoice { threshold: Threshold::Quantile(0.80), least_area: None },
        };
        let resistors = keys.resistors.map(|keys| self.bodies("resistors", "above", &keys)).transpose()?;
        Ok(Conductivity { quantity, model, conductors, resistors })
    }

    fn slices(&self, keys: Vec<super::schema::SliceKeys>) -> Result<Vec<SliceChoice>> {
        if keys.is_empty() {
            return Err(self.error("conductivity.slices").found("an empty list").wanted("at least one slice"));
        }
        let mut slices: Vec<SliceChoice> = Vec::new();
        for slice in keys {
            let depth = *slice.depth.get_ref();
            if !depth.is_finite() {
                return Err(self.at("depth", slice.depth.span()).found(depth).wanted("metres, positive down"));
            }
            if slices.iter().any(|other| other.depth == depth) {
                return Err(self
                    .at("depth", slice.depth.span())
                    .found(format!("{depth} m a second time"))
                    .wanted("each depth once")
                    .mend("leave one of the two slices out"));
            }
            slices.push(SliceChoice {
                source: Source { path: self.join(&slice.path), variable: slice.variable, crs: slice.crs },
                band: self.band(slice.band)?,
                depth,
            });
        }
        slices.sort_by(|a, b| a.depth.total_cmp(&b.depth));
        Ok(slices)
    }

    /// Any whole number that TOML can hold and give back.
    fn seed(&self, seed: Option<Spanned<u64>>) -> Result<u64> {
        match seed {
            Some(seed) if i64::try_from(*seed.get_ref()).is_err() => Err(self
                .at("seed", seed.span())
                .found(seed.get_ref())
                .wanted(format!("a whole number from 0 to {}", i64::MAX))),
            Some(seed) => Ok(seed.into_inner()),
            None => Ok(DEFAULT_SEED),
        }
    }

    pub(super) fn band(&self, band: Option<usize>) -> Result<usize> {
        match band {
            Some(0) => Err(self.error("band").found("0").wanted("1 for the first band")),
            band => Ok(band.unwrap_or(1)),
        }
    }

    fn bodies(&self, side: &str, absolute: &str, keys: &BodyKeys) -> Result<BodyChoice> {
        let (own, other) = if side == "conductors" { (&keys.below, &keys.above) } else { (&keys.above, &keys.below) };
        if let Some(other) = other {
            let wrong = if absolute == "below" { "above" } else { "below" };
            return Err(self
                .at(format!("conductivity.{side}"), other.span())
                .found(wrong)
                .wanted(absolute)
                .mend(format!("{side} are {absolute} a resistivity in ohm m")));
        }
        let mixture = keys.mixture.as_ref().filter(|mixture| *mixture.get_ref());
        let threshold = match (&keys.quantile, own, mixture) {
            (Some(quantile), None, None) => {
                let value = *quantile.get_ref();
                if !(value > 0.0 && value < 1.0) {
                    return Err(self
                        .at(format!("conductivity.{side}.quantile"), quantile.span())
                        .found(value)
                        .wanted("a number above 0 and below 1, counted from the most resistive cell"));
                }
                Threshold::Quantile(value)
            }
            (None, Some(value), None) => {
                Threshold::Absolute(self.positive(&format!("conductivity.{side}.{absolute}"), "ohm m", value)?)
            }
            (None, None, Some(_)) => Threshold::Mixture,
            _ => {
                return Err(self
                    .error(format!("conductivity.{side}"))
                    .found("no threshold, or more than one")
                    .wanted(format!("one of: quantile, {absolute}, mixture = true")));
            }
        };
        let least_area = match &keys.least_area {
            Some(area) => Some(self.positive(&format!("conductivity.{side}.least_area"), "square metres", area)?),
            None => None,
        };
        Ok(BodyChoice { threshold, least_area })
    }

    fn test(&self, keys: &TestKeys) -> Result<TestChoice> {
        let list = |key: &str, values: &Option<Vec<Spanned<f64>>>| -> Result<Option<Vec<f64>>> {
            let Some(values) = values else { return Ok(None) };
            let mut list: Vec<f64> = Vec::new();
            for value in values {
                let distance = self.positive(&format!("test.{key}"), "metres", value)?;
                if list.contains(&distance) {
                    return Err(self
                        .at(format!("test.{key}"), value.span())
                        .found(format!("{distance} a second time"))
                        .wanted("each distance once"));
                }
                list.push(distance);
            }
            list.sort_by(f64::total_cmp);
            Ok(Some(list))
        };
        let within = list("within", &keys.within)?;
        if within.as_ref().is_some_and(Vec::is_empty) {
            return Err(self.error("test.within").found("an empty list").wanted("at least one distance in metres"));
        }
        if let Some(null) = &keys.null
            && !["default", "shifts"].contains(&null.get_ref().as_str())
        {
            return Err(self
                .at("test.null", null.span())
                .found(format!("{:?}", null.get_ref()))
                .wanted("one of: default, shifts"));
        }
        let level = match &keys.family {
            None => DEFAULT_LEVEL,
            Some(level) if (SMALLEST_P..1.0).contains(level.get_ref()) => *level.get_ref(),
            Some(level) => {
                return Err(self.at("test.family", level.span()).found(level.get_ref()).wanted(format!(
                    "a level from {SMALLEST_P}, the smallest that displacement resolves, to below 1, such as 0.05"
                )));
            }
        };
        Ok(TestChoice {
            within,
            profile: list("profile", &keys.profile)?,
            distance_cap: match &keys.distance_cap {
                Some(cap) => Some(self.positive("test.distance_cap", "metres", cap)?),
                None => None,
            },
            level,
            height_per_depth: match &keys.height_per_depth {
                None => DEFAULT_HEIGHT_PER_DEPTH,
                Some(share) => self.positive("test.height_per_depth", "metres up for a metre of depth", share)?,
            },
            resolution: match &keys.resolution {
                None => Resolution::AsIs,
                Some(choice) => [Resolution::AsIs, Resolution::Matched]
                    .into_iter()
                    .find(|known| known.name() == choice.get_ref())
                    .ok_or_else(|| {
                        self.at("test.resolution", choice.span())
                            .found(format!("{:?}", choice.get_ref()))
                            .wanted("one of: as-is, matched")
                    })?,
            },
        })
    }

    pub(super) fn positive(&self, key: &str, unit: &str, value: &Spanned<f64>) -> Result<f64> {
        let number = *value.get_ref();
        if number.is_finite() && number > 0.0 {
            return Ok(number);
        }
        Err(self.at(key, value.span()).found(number).wanted(format!("a positive number of {unit}")))
    }

    /// Names stand in tables, on the page and in file names, so they are short, single-line texts.
    pub(super) fn name(&self, thing: &str, name: &Spanned<String>) -> Result<String> {
        let text = name.get_ref().trim();
        if text.is_empty() || text.chars().count() > 60 || text.chars().any(char::is_control) {
            return Err(self
                .at(thing, name.span())
                .found(format!("{:?}", name.get_ref()))
                .wanted("1 to 60 characters on one line"));
        }
        Ok(text.to_string())
    }

    pub(super) fn join(&self, path: &Path) -> PathBuf {
        match self.path.parent() {
            Some(folder) => folder.join(path),
            None => path.to_path_buf(),
        }
    }
}
