//! Checks of what the conductors are tested against: potential fields, mapped lines, mapped units.

use toml::Spanned;

use super::parse::Place;
use super::schema::{ContactKeys, KeepKeys, LinesKeys, PotentialKeys, UnitsKeys, ValueKey};
use super::settings::{
    Angles, ContactChoice, FieldDirection, MappedLines, MappedUnits, Potential, PotentialKind, UnitRole,
};
use crate::contact::ContactSettings;
use crate::error::Result;
use crate::evidence::file_stem;
use crate::field::ReferenceField;
use crate::grid::{AttributeFilter, Source, VectorSource};

impl Place<'_> {
    /// Names stand in file names, so two that differ only in signs count as one.
    pub(super) fn refuse_twins(&self, names: &[Spanned<String>]) -> Result<()> {
        for (index, name) in names.iter().enumerate() {
            let stem = file_stem(name.get_ref().trim());
            if names[..index].iter().any(|other| file_stem(other.get_ref().trim()) == stem) {
                return Err(self
                    .at("a name", name.span())
                    .found(format!("{:?} a second time", name.get_ref()))
                    .wanted("names that differ in more than signs, since they stand in file names")
                    .mend("give one of them another name"));
            }
        }
        Ok(())
    }

    /// Mapped lines and units may not be called what bodies, contacts and their files are called already.
    pub(super) fn refuse_taken(&self, fields: &[Potential], mapped: &[Spanned<String>]) -> Result<()> {
        for name in mapped {
            let stem = file_stem(name.get_ref().trim());
            let of_field = |field: &Potential| {
                let own = file_stem(&field.name);
                stem.starts_with(&format!("{own}_")) || stem.starts_with(&format!("{own}-contacts"))
            };
            if ["conductors", "resistors"].contains(&stem.as_str()) || fields.iter().any(of_field) {
                return Err(self
                    .at("a name", name.span())
                    .found(format!("{:?}, which bodies or contacts of a field are called", name.get_ref()))
                    .wanted("a name of its own, since it stands in tables and file names")
                    .mend("give it another name"));
            }
        }
        Ok(())
    }

    pub(super) fn potential(&self, keys: PotentialKeys) -> Result<Potential> {
        let name = self.name("the name of a [[potential]]", &keys.name)?;
        Ok(Potential {
            kind: self.kind(&name, &keys)?,
            heights: self.heights(keys.heights)?,
            noise: match &keys.noise {
                Some(noise) => Some(self.positive("noise", "the field's unit", noise)?),
                None => None,
            },
            contacts: self.contacts(&keys.contacts)?,
            source: Source { path: self.join(&keys.path), variable: keys.variable, crs: keys.crs },
            band: self.band(keys.band)?,
            name,
        })
    }

    fn kind(&self, name: &str, keys: &PotentialKeys) -> Result<PotentialKind> {
        let kind = keys.kind.as_ref().map_or("gravity", |kind| kind.get_ref());
        let known = ["gravity", "magnetic", "other"];
        if !known.contains(&kind) {
            let error = match &keys.kind {
                Some(kind) => self.at("kind", kind.span()),
                None => self.error("kind"),
            };
            return Err(error.found(format!("{kind:?}")).wanted(format!("one of: {}", known.join(", "))));
        }
        if kind != "magnetic" {
            let magnetisation = keys.magnetisation.as_ref().map(|keys| ("magnetisation", keys.inclination.span()));
            let year = keys.year.as_ref().map(|year| ("year", year.span()));
            if let Some((key, span)) = magnetisation.or(year) {
                return Err(self
                    .at(key, span)
                    .found(format!("it in a field of kind {kind:?}"))
                    .wanted("it in a magnetic field only")
                    .mend("take it out, or set kind = \"magnetic\""));
            }
            return Ok(if kind == "gravity" { PotentialKind::Gravity } else { PotentialKind::Other });
        }
        let field = match (&keys.inclination, &keys.declination, &keys.year) {
            (Some(inclination), Some(declination), None) => {
                FieldDirection::Given(self.angles("", inclination, declination)?)
            }
            (None, None, Some(year)) => {
                let (first, last) = ReferenceField::YEARS;
                if !(first..=last).contains(year.get_ref()) {
                    return Err(self
                        .at("year", year.span())
                        .found(year.get_ref())
                        .wanted(format!("a year from {first} to {last}, which {} covers", ReferenceField::MODEL))
                        .mend("give inclination and declination from a model that covers the survey"));
                }
                FieldDirection::Year(*year.get_ref())
            }
            (inclination, declination, year) => {
                let found = match (inclination, declination, year) {
                    (_, _, Some(_)) => "year beside inclination or declination",
                    (None, _, None) => "no inclination",
                    (Some(_), _, None) => "no declination",
                };
                return Err(self
                    .at(format!("potential {name:?}"), keys.name.span())
                    .found(found)
                    .wanted(
                        "inclination and declination in degrees, or the year of the survey, since contacts are picked on \
                         pseudo-gravity",
                    )
                    .mend(match year {
                        Some(_) => "keep one of the two",
                        None => "add inclination = ... and declination = ..., or year = ... such as 2012.5",
                    }));
            }
        };
        let magnetisation = match &keys.magnetisation {
            None => None,
            Some(keys) => Some(self.angles("magnetisation.", &keys.inclination, &keys.declination)?),
        };
        Ok(PotentialKind::Magnetic { field, magnetisation })
    }

    /// A direction; `of` stands before the names of its keys in messages.
    fn angles(&self, of: &str, inclination: &Spanned<f64>, declination: &Spanned<f64>) -> Result<Angles> {
        let checked = |key: &str, angle: &Spanned<f64>, most: f64| {
            if (-most..=most).contains(angle.get_ref()) {
                return Ok(*angle.get_ref());
            }
            Err(self
                .at(format!("{of}{key}"), angle.span())
                .found(angle.get_ref())
                .wanted(format!("degrees from -{most} to {most}")))
        };
        Ok(Angles {
            inclination: checked("inclination", inclination, 90.0)?,
            // The frame's own north comes later and is small; 180 keeps the sum inside what the transform takes.
            declination: checked("declination", declination, 180.0)?,
        })
    }

    /// Heights as listed; `None` where the study leaves them to the depths of the slices.
    fn heights(&self, keys: Option<Vec<Spanned<f64>>>) -> Result<Option<Vec<f64>>> {
        let Some(keys) = keys else { return Ok(None) };
        let mut heights: Vec<f64> = Vec::new();
        for height in keys {
            let value = *height.get_ref();
            if !(value.is_finite() && value >= 0.0) || heights.contains(&value) {
                return Err(self
                    .at("heights", height.span())
                    .found(value)
                    .wanted("each height once, in metres, zero or more: continuation goes upward"));
            }
            heights.push(value);
        }
        if heights.is_empty() {
            return Err(self
                .error("heights")
                .found("an empty list")
                .wanted("at least one height in metres")
                .mend("take the key out to have heights tied to the depths of the slices"));
        }
        Ok(Some(heights))
    }

    /// The strengths at which contacts start and end; their least length needs the frame and is set later.
    fn contacts(&self, keys: &ContactKeys) -> Result<ContactChoice> {
        let default = ContactSettings::default();
        let share = |key: &str, value: &Option<Spanned<f64>>, default: f64| match value {
            None => Ok(default),
            Some(value) if (0.0..=1.0).contains(value.get_ref()) => Ok(*value.get_ref()),
            Some(value) => Err(self
                .at(format!("contacts.{key}"), value.span())
                .found(value.get_ref())
                .wanted("a share of the crests' strengths, from 0 to 1")),
        };
        let strong = share("strong", &keys.strong, default.strong())?;
        let weak = share("weak", &keys.weak, default.weak().min(strong))?;
        if weak > strong {
            return Err(self
                .error("contacts")
                .found(format!("weak = {weak} above strong = {strong}"))
                .wanted("weak no larger than strong"));
        }
        let significance = match &keys.significance {
            None => default.significance(),
            Some(level) if *level.get_ref() > 0.0 && *level.get_ref() <= 0.5 => *level.get_ref(),
            Some(level) => {
                return Err(self.at("contacts.significance", level.span()).found(level.get_ref()).wanted(
                    "a number above 0 and at most 0.5: the chance that noise alone gives a layer any contact",
                ));
            }
        };
        let least_length = match &keys.least_length {
            Some(length) => Some(self.positive("contacts.least_length", "metres", length)?),
            None => None,
        };
        Ok(ContactChoice { quantiles: (strong, weak), significance, least_length })
    }

    pub(super) fn lines(&self, keys: LinesKeys) -> Result<MappedLines> {
        let name = self.name("the name of a [[lines]]", &keys.name)?;
        let filter = keys.keep.map(|keep| self.filter(keep)).transpose()?;
        Ok(MappedLines {
            source: VectorSource { path: self.join(&keys.path), layer: keys.layer, crs: keys.crs, filter },
            name,
        })
    }

    pub(super) fn units(&self, keys: UnitsKeys) -> Result<MappedUnits> {
        let name = self.name("the name of a [[units]]", &keys.name)?;
        let filter = keys.keep.map(|keep| self.filter(keep)).transpose()?;
        let role = match &keys.role {
            None => UnitRole::Reference,
            Some(role) => [UnitRole::Reference, UnitRole::Subject]
                .into_iter()
                .find(|known| known.name() == role.get_ref())
                .ok_or_else(|| {
                    self.at("role", role.span())
                        .found(format!("{:?}", role.get_ref()))
                        .wanted("one of: reference, subject")
                })?,
        };
        Ok(MappedUnits {
            source: VectorSource { path: self.join(&keys.path), layer: keys.layer, crs: keys.crs, filter },
            role,
            name,
        })
    }

    fn filter(&self, keep: Spanned<KeepKeys>) -> Result<AttributeFilter> {
        let span = keep.span();
        let KeepKeys { column, is, not } = keep.into_inner();
        if is.is_empty() && not.is_empty() {
            return Err(self
                .at("keep", span)
                .found("neither is nor not")
                .wanted("values to keep or to leave out")
                .mend("write keep = { column = \"...\", is = [\"...\"] }"));
        }
        let texts = |values: Vec<ValueKey>| values.into_iter().map(ValueKey::text).collect();
        Ok(AttributeFilter { column, is: texts(is), not: texts(not) })
    }
}

impl ValueKey {
    /// The value as the text that it is compared by.
    fn text(self) -> String {
        match self {
            Self::Text(text) => text,
            Self::Whole(number) => number.to_string(),
            Self::Number(number) => number.to_string(),
            Self::Truth(truth) => truth.to_string(),
        }
    }
}
