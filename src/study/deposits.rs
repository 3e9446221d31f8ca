//! Known deposits from a table, carried onto the frame.

use std::path::Path;

use polars::prelude::{CsvReadOptions, DataType, SerReader};

use super::settings::Deposits;
use crate::error::{Error, Result};
use crate::grid::{Crs, Frame, carry};

/// A known deposit.
#[derive(Debug, Clone, PartialEq)]
pub struct Deposit {
    /// Its name.
    pub name: String,
    /// Easting in the frame's system, m.
    pub x: f64,
    /// Northing in the frame's system, m.
    pub y: f64,
    /// The cell of the frame that it falls into, or `None` outside.
    pub cell: Option<(usize, usize)>,
}

/// The columns and the system that a table has when the study names none: longitude and latitude of WGS 84.
const DEFAULT_COLUMNS: [&str; 3] = ["longitude", "latitude", "name"];
const DEFAULT_CRS: &str = "EPSG:4326";

/// Reads the deposits; those outside the frame are kept and marked, none is dropped.
///
/// # Errors
/// A table that cannot be read, lacks a column, or has a row without a position.
pub fn read_deposits(choice: &Deposits, frame: &Frame) -> Result<Vec<Deposit>> {
    read(choice, frame).map_err(|error| error.file(&choice.path))
}

fn read(choice: &Deposits, frame: &Frame) -> Result<Vec<Deposit>> {
    let columns = choice.columns.clone().unwrap_or(DEFAULT_COLUMNS.map(str::to_string));
    let crs = Crs::from_definition(choice.crs.as_deref().unwrap_or(DEFAULT_CRS))?;
    let table = read_csv(&choice.path)?;
    let column = |name: &str| {
        table.column(name).map_err(|_| {
            let known: Vec<String> = table.get_column_names().iter().map(|name| name.to_string()).collect();
            Error::input("the table's columns")
                .found(format!("no {name:?} among {}", known.join(", ")))
                .wanted("columns for x, y and name")
                .mend("set deposits.columns = { x = \"...\", y = \"...\", name = \"...\" }")
        })
    };
    let numbers = |name: &str| -> Result<Vec<f64>> {
        let texts = column(name)?.cast(&DataType::String).map_err(|source| Error::input(name).because(source))?;
        let texts = texts.str().map_err(|source| Error::input(name).because(source))?;
        let number = |(row, text): (usize, Option<&str>)| {
            text.and_then(|text| text.trim().parse::<f64>().ok()).filter(|value| value.is_finite()).ok_or_else(|| {
                Error::input(format!("column {name:?}"))
                    // The first line holds the names, and lines count from 1.
                    .line(row + 2)
                    .found(text.map_or("an empty cell".into(), |text| format!("{text:?}")))
                    .wanted("a number")
            })
        };
        texts.iter().enumerate().map(number).collect()
    };
    let (x, y) = (numbers(&columns[0])?, numbers(&columns[1])?);
    let names = column(&columns[2])?.cast(&DataType::String).map_err(|source| Error::input("names").because(source))?;
    let names = names.str().map_err(|source| Error::input("names").because(source))?;
    let points: Vec<(f64, f64)> = x.into_iter().zip(y).collect();
    let carried = carry(&points, &crs, &frame.crs)?;
    if let Some(row) = carried.iter().position(|(x, y)| !(x.is_finite() && y.is_finite())) {
        return Err(Error::input("a deposit's position")
            .line(row + 2)
            .found(format!("{:?} in {}", points[row], crs.name))
            .wanted("a place that the frame's system covers")
            .mend("check deposits.crs and the order of the columns x and y"));
    }
    let deposit = |((x, y), name): ((f64, f64), Option<&str>)| Deposit {
        name: name.unwrap_or("unnamed").trim().to_string(),
        x,
        y,
        cell: frame.cell_at(x, y),
    };
    Ok(carried.into_iter().zip(names.iter()).map(deposit).collect())
}

fn read_csv(path: &Path) -> Result<polars::frame::DataFrame> {
    if !path.exists() {
        return Err(Error::input("the file")
            .found("nothing at this path")
            .wanted("a table of deposits (CSV)")
            .mend("check the path; a relative one starts at the folder of the study file"));
    }
    CsvReadOptions::default()
        .with_has_header(true)
        // As text first: numbers are read below with the line named where one is not a number.
        .with_infer_schema_length(Some(0))
        .try_into_reader_with_file_path(Some(path.to_path_buf()))
        .and_then(|reader| reader.finish())
        .map_err(|source| {
            Error::input("the table")
                .found("text that is not a table")
                .wanted("CSV with a line of names")
                .because(source)
        })
}
