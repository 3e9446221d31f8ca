//! A named column with its unit and meaning.

use super::number::significant;

/// The values of a column. `None` and NaN are empty cells.
#[derive(Debug, Clone, PartialEq)]
pub enum Values {
    /// Measured or computed numbers.
    Number(Vec<Option<f64>>),
    /// Whole numbers: counts, identifiers.
    Count(Vec<Option<i64>>),
    /// Text; an empty text is an empty cell.
    Text(Vec<String>),
}

impl Values {
    /// Number of cells.
    pub fn len(&self) -> usize {
        match self {
            Self::Number(cells) => cells.len(),
            Self::Count(cells) => cells.len(),
            Self::Text(cells) => cells.len(),
        }
    }

    /// True without cells.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// True for text.
    pub(super) fn is_text(&self) -> bool {
        matches!(self, Self::Text(_))
    }

    /// The cell as people read it: numbers to four significant digits, empty if there is no value or no such row.
    pub(super) fn rounded(&self, row: usize) -> String {
        match self {
            Self::Number(cells) => {
                cells.get(row).copied().flatten().map_or(String::new(), |value| significant(value, 4))
            }
            Self::Count(cells) => cells.get(row).copied().flatten().map_or(String::new(), |value| value.to_string()),
            Self::Text(cells) => cells.get(row).cloned().unwrap_or_default(),
        }
    }
}

/// A column of a table, or a field of a GIS layer.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// The name in the files, in snake case, with the unit at its end where there is one (`depth_m`).
    pub name: String,
    /// The unit for people, such as `m` or `mGal/m`; empty for a ratio, a count or a text.
    pub unit: String,
    /// What the value is, in one sentence.
    pub meaning: String,
    /// The values, one for each row.
    pub values: Values,
}

impl Column {
    /// A column of numbers.
    pub fn number(name: &str, unit: &str, meaning: &str, values: impl IntoIterator<Item = Option<f64>>) -> Self {
        Self::new(name, unit, meaning, Values::Number(values.into_iter().collect()))
    }

    /// A column of whole numbers.
    pub fn count(name: &str, unit: &str, meaning: &str, values: impl IntoIterator<Item = Option<i64>>) -> Self {
        Self::new(name, unit, meaning, Values::Count(values.into_iter().collect()))
    }

    /// A column of texts.
    pub fn text<T: Into<String>>(name: &str, meaning: &str, values: impl IntoIterator<Item = T>) -> Self {
        Self::new(name, "", meaning, Values::Text(values.into_iter().map(Into::into).collect()))
    }

    fn new(name: &str, unit: &str, meaning: &str, values: Values) -> Self {
        Self { name: name.into(), unit: unit.into(), meaning: meaning.into(), values }
    }

    /// The name, with the unit behind it if there is one.
    pub(super) fn heading(&self) -> String {
        if self.unit.is_empty() { self.name.clone() } else { format!("{} ({})", self.name, self.unit) }
    }
}
