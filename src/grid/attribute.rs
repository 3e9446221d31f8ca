//! Which features of a vector layer to keep, by the value of one column.

use std::collections::BTreeSet;

use gdal::vector::{Feature, Layer, LayerAccess, OGRFieldType};

use super::reason::Reason;
use crate::error::{Error, Result};

/// How many values an error lists.
const LISTED: usize = 10;
/// How many different values are remembered for an error; more would only cost memory.
const REMEMBERED: usize = 1000;

/// A choice of features by the value of one column.
///
/// A feature is kept when its value is among `is` (if that list is not empty) and not among `not`. Text is compared
/// exactly, without the blanks around it. In a column of numbers, `3`, `3.0` and `3e0` are one value, and so are `true`
/// and 1, `false` and 0, since files keep truth values as numbers. A feature without a value counts as one with empty text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct AttributeFilter {
    /// Name of the column, as the file spells it.
    pub column: String,
    /// Values to keep; empty keeps all.
    pub is: Vec<String>,
    /// Values to leave out.
    pub not: Vec<String>,
}

/// What kind of values a column holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum ColumnKind {
    Text,
    WholeNumber,
    Number,
    Time,
    Other,
}

impl ColumnKind {
    pub(super) fn of(kind: OGRFieldType::Type) -> Self {
        match kind {
            OGRFieldType::OFTString => Self::Text,
            OGRFieldType::OFTInteger | OGRFieldType::OFTInteger64 => Self::WholeNumber,
            OGRFieldType::OFTReal => Self::Number,
            OGRFieldType::OFTDate | OGRFieldType::OFTTime | OGRFieldType::OFTDateTime => Self::Time,
            _ => Self::Other,
        }
    }

    pub(super) fn word(self) -> &'static str {
        match self {
            Self::Text => "text",
            Self::WholeNumber => "whole number",
            Self::Number => "number",
            Self::Time => "date or time",
            Self::Other => "list or bytes",
        }
    }

    fn numeric(self) -> bool {
        matches!(self, Self::WholeNumber | Self::Number)
    }
}

/// A filter bound to the column of an open layer; it remembers the values that it has met.
pub(super) struct ColumnTest<'a> {
    filter: &'a AttributeFilter,
    index: usize,
    kind: ColumnKind,
    met: BTreeSet<String>,
    seen: usize,
}

impl AttributeFilter {
    /// Finds the column in a layer.
    pub(super) fn bind(&self, layer: &Layer<'_>) -> Result<ColumnTest<'_>> {
        if self.is.is_empty() && self.not.is_empty() {
            return Err(Error::input("the filter")
                .found("no value under is and none under not")
                .wanted("at least one value to keep or to leave out")
                .mend("list values under is or not, or take the filter out"));
        }
        let columns: Vec<(String, ColumnKind)> =
            layer.defn().fields().map(|field| (field.name(), ColumnKind::of(field.field_type()))).collect();
        let Some(index) = columns.iter().position(|(name, _)| *name == self.column) else {
            return Err(self.no_column(&layer.name(), &columns));
        };
        let kind = columns[index].1;
        if kind == ColumnKind::Other {
            return Err(Error::input("the filter's column")
                .found(format!("{:?}, which holds lists or bytes", self.column))
                .wanted("a column of text, numbers, dates or truth values")
                .mend("choose another column"));
        }
        Ok(ColumnTest { filter: self, index, kind, met: BTreeSet::new(), seen: 0 })
    }

    fn no_column(&self, layer: &str, columns: &[(String, ColumnKind)]) -> Error {
        let error = Error::input("the filter's column")
            .found(format!("{:?}, which the layer {layer:?} does not have", self.column));
        let likeness = |name: &str| strsim::jaro_winkler(&name.to_lowercase(), &self.column.to_lowercase());
        let nearest = columns.iter().max_by(|a, b| likeness(&a.0).total_cmp(&likeness(&b.0)));
        match nearest {
            Some((nearest, _)) => error
                .wanted(format!("one of: {}", list(columns.iter().map(|(name, _)| name.as_str()), columns.len())))
                .mend(format!("if you meant {nearest:?}, write that")),
            None => error.wanted("a layer with columns").mend("take the filter out"),
        }
    }

    fn keeps(&self, text: &str, kind: ColumnKind) -> bool {
        let among = |values: &[String]| values.iter().any(|value| same(value.trim(), text, kind));
        (self.is.is_empty() || among(&self.is)) && !among(&self.not)
    }
}

impl ColumnTest<'_> {
    /// True if the feature is to be kept.
    pub(super) fn keeps(&mut self, feature: &Feature<'_>) -> Result<bool> {
        let text = value_text(feature, self.index)?.unwrap_or_default();
        let kept = self.filter.keeps(&text, self.kind);
        self.seen += 1;
        if self.met.len() < REMEMBERED {
            self.met.insert(text);
        }
        Ok(kept)
    }

    /// The error for a filter that has kept nothing.
    pub(super) fn nothing_left(&self) -> Error {
        let column = &self.filter.column;
        let part = |word: &str, values: &[String]| {
            let values: Vec<String> = values.iter().map(|value| format!("{value:?}")).collect();
            (!values.is_empty()).then(|| format!("{word} {}", list(values.iter().map(String::as_str), LISTED)))
        };
        let asked: Vec<String> =
            [part("is", &self.filter.is), part("not", &self.filter.not)].into_iter().flatten().collect();
        let error = Error::input(format!("the filter on {column:?}")).found(format!(
            "none of {} features left by {}",
            self.seen,
            asked.join(" and ")
        ));
        if self.met.is_empty() {
            return error.wanted("a layer with features").mend("choose another layer");
        }
        let met: Vec<String> = self.met.iter().map(|value| format!("{value:?}")).collect();
        error
            .wanted(format!("values that the file has: {}", list(met.iter().map(String::as_str), LISTED)))
            .mend("check the spelling, capitals included")
    }

    /// The values under `is` and `not` that no feature has.
    pub(super) fn unmet(&self) -> Vec<String> {
        let met = |value: &&String| !self.met.iter().any(|text| same(value.trim(), text, self.kind));
        if self.met.len() == REMEMBERED {
            Vec::new()
        } else {
            self.filter.is.iter().chain(&self.filter.not).filter(met).cloned().collect()
        }
    }
}

/// The value of a column as text without the blanks around it; `None` where there is none.
pub(super) fn value_text(feature: &Feature<'_>, index: usize) -> Result<Option<String>> {
    let text = feature
        .field_as_string(index)
        .map_err(|source| Error::input(format!("column {} of a feature", index + 1)).because(Reason(source)))?;
    Ok(text.map(|text| text.trim().to_string()))
}

/// True if a wanted value and the text of a stored one are the same.
fn same(wanted: &str, text: &str, kind: ColumnKind) -> bool {
    if wanted == text {
        return true;
    }
    if !kind.numeric() {
        return false;
    }
    let wanted = match wanted.to_lowercase().as_str() {
        "true" => "1",
        "false" => "0",
        _ => wanted,
    };
    // Whole numbers first: those above 2^53 are not told apart as floating-point numbers.
    match (wanted.parse::<i64>(), text.parse::<i64>()) {
        (Ok(wanted), Ok(stored)) => wanted == stored,
        _ => matches!((wanted.parse::<f64>(), text.parse::<f64>()), (Ok(wanted), Ok(stored)) if wanted == stored),
    }
}

/// The first `most` names with commas between them, and a word if there are more.
fn list<'a>(names: impl ExactSizeIterator<Item = &'a str>, most: usize) -> String {
    let more = names.len() > most;
    let mut listed: Vec<&str> = names.take(most).collect();
    if more {
        listed.push("and more");
    }
    listed.join(", ")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_compared_as_numbers_and_text_as_text() {
        for wanted in ["3", "3.0", "3e0", "+3"] {
            assert!(same(wanted, "3", ColumnKind::WholeNumber), "{wanted}");
            assert!(same(wanted, "3.00", ColumnKind::Number), "{wanted}");
        }
        assert!(!same("3.0", "3", ColumnKind::Text));
        assert!(same("True", "1", ColumnKind::WholeNumber) && same("false", "0", ColumnKind::WholeNumber));
        assert!(!same("true", "1", ColumnKind::Text) && !same("true", "2", ColumnKind::WholeNumber));
        // 2^53 + 1 and 2^53 are one floating-point number (IEEE 754).
        assert!(!same("9007199254740993", "9007199254740992", ColumnKind::WholeNumber));
        assert!(!same("nan", "0", ColumnKind::Number));
    }

    #[test]
    fn a_feature_must_be_wanted_and_not_unwanted() {
        let texts = |values: &[&str]| values.iter().map(|value| value.to_string()).collect::<Vec<_>>();
        let filter =
            |is: &[&str], not: &[&str]| AttributeFilter { column: "kind".into(), is: texts(is), not: texts(not) };
        let kept = |filter: AttributeFilter| ["dyke", "fault", ""].map(|text| filter.keeps(text, ColumnKind::Text));
        assert_eq!(kept(filter(&[" dyke "], &[])), [true, false, false]);
        assert_eq!(kept(filter(&[], &["dyke"])), [false, true, true]);
        assert_eq!(kept(filter(&["dyke", "fault"], &["fault"])), [true, false, false]);
        assert_eq!(kept(filter(&[], &[""])), [true, true, false]);
    }
}
