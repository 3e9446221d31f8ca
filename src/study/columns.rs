//! Columns made from lists of anything.

use crate::evidence::Column;

/// A number, or an empty cell where it is not one.
pub(super) fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

/// A column of numbers from a list of anything.
pub(super) fn number<T>(
    name: &str,
    unit: &str,
    meaning: &str,
    rows: &[T],
    value: impl Fn(&T) -> Option<f64>,
) -> Column {
    Column::number(name, unit, meaning, rows.iter().map(value))
}

pub(super) fn count<T>(name: &str, unit: &str, meaning: &str, rows: &[T], value: impl Fn(&T) -> usize) -> Column {
    Column::count(name, unit, meaning, rows.iter().map(|row| i64::try_from(value(row)).ok()))
}

pub(super) fn text<T>(name: &str, meaning: &str, rows: &[T], value: impl Fn(&T) -> String) -> Column {
    Column::text(name, meaning, rows.iter().map(value))
}
