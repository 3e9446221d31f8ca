//! Tables of evidence: the same rows as CSV, Parquet and Markdown.

use std::fs::{self, File};
use std::io::{BufWriter, Write};
use std::path::Path;

use polars::prelude as pl;
use polars::prelude::{CsvWriter, DataFrame, IntoColumn, NamedFrom, ParquetWriter, SerWriter, Series};

use super::column::{Column, Values};
use super::delimited::neutralised;
use super::markdown::markdown;
use crate::error::{Error, Result};

/// A table: a name for its files, a caption for people, and columns of one length.
#[derive(Debug, Clone, PartialEq)]
pub struct Table {
    /// The name of the files, without extension.
    pub name: String,
    /// What the table shows, in one sentence.
    pub caption: String,
    /// The columns, each with one value for each row.
    pub columns: Vec<Column>,
}

impl Table {
    /// Number of rows: the length of the first column.
    pub fn rows(&self) -> usize {
        self.columns.first().map_or(0, |column| column.values.len())
    }

    /// The table as a data frame; with `for_csv`, texts and names are made safe for a spreadsheet.
    fn frame(&self, for_csv: bool) -> Result<DataFrame> {
        let spoken = |text: &str| if for_csv { neutralised(text).into_owned() } else { text.to_owned() };
        let columns = self.columns.iter().map(|column| {
            let name = spoken(&column.name).into();
            let series = match &column.values {
                Values::Number(cells) => {
                    let finite: Vec<Option<f64>> = cells.iter().map(|cell| cell.filter(|x| x.is_finite())).collect();
                    Series::new(name, finite)
                }
                Values::Count(cells) => Series::new(name, cells),
                Values::Text(cells) => {
                    let cells: Vec<Option<String>> =
                        cells.iter().map(|cell| (!cell.is_empty()).then(|| spoken(cell))).collect();
                    Series::new(name, cells)
                }
            };
            series.into_column()
        });
        DataFrame::new(self.rows(), columns.collect())
            .map_err(|error| Error::ours(format!("building the table {}", self.name)).because(error))
    }

    /// Writes `NAME.csv`, `NAME.parquet` and `NAME.md` into a folder. The bytes depend on the table alone.
    ///
    /// CSV and Parquet hold the numbers in full, Markdown to four significant digits. In CSV, a text that a spreadsheet
    /// would take for a formula gets a leading apostrophe.
    ///
    /// # Errors
    /// Columns of different lengths, a repeated column name, or a file that cannot be written.
    pub fn write(&self, folder: &Path) -> Result<()> {
        let stem = file_stem(&self.name);
        let failed = |path: &Path, error: &dyn std::fmt::Display| {
            Error::ours("writing a table").file(path).because(error.to_string())
        };

        let path = folder.join(format!("{stem}.csv"));
        let mut file = BufWriter::new(create(&path)?);
        CsvWriter::new(&mut file)
            .include_header(true)
            .n_threads(1)
            .finish(&mut self.frame(true)?)
            .map_err(|error| failed(&path, &error))?;
        file.flush().map_err(|error| failed(&path, &error))?;

        let path = folder.join(format!("{stem}.parquet"));
        let mut file = BufWriter::new(create(&path)?);
        ParquetWriter::new(&mut file)
            .with_compression(pl::ParquetCompression::Zstd(None))
            .set_parallel(false)
            .finish(&mut self.frame(false)?)
            .map_err(|error| failed(&path, &error))?;
        file.flush().map_err(|error| failed(&path, &error))?;

        let path = folder.join(format!("{stem}.md"));
        create(&path)?.write_all(markdown(self).as_bytes()).map_err(|error| failed(&path, &error))
    }
}

/// Creates a file that must not be there yet, so that two tables or figures can never overwrite each other.
pub(super) fn create(path: &Path) -> Result<File> {
    File::create_new(path).map_err(|error| Error::ours("creating an output file").file(path).because(error))
}

/// A name reduced to what every file system takes: letters and digits in lower case, `-`, `_` and `.`; any other run of
/// characters becomes one `-`. Never empty, never hidden, at most 60 characters.
pub fn file_stem(name: &str) -> String {
    let mut stem = String::new();
    for letter in name.chars() {
        if letter.is_alphanumeric() || matches!(letter, '_' | '.') {
            stem.extend(letter.to_lowercase());
        } else if !stem.ends_with('-') {
            stem.push('-');
        }
    }
    let stem = stem.trim_matches(['-', '.']);
    if stem.is_empty() { "unnamed".into() } else { stem.chars().take(60).collect() }
}

/// A table of all columns of all tables: table, column, unit, meaning.
pub fn dictionary(tables: &[Table]) -> Table {
    let rows: Vec<(&Table, &Column)> =
        tables.iter().flat_map(|table| table.columns.iter().map(move |column| (table, column))).collect();
    let texts = |pick: fn(&(&Table, &Column)) -> String| -> Vec<String> { rows.iter().map(pick).collect() };
    Table {
        name: "dictionary".into(),
        caption: "What each column of each table means, and its unit".into(),
        columns: vec![
            Column::text("table", "Name of the table", texts(|(table, _)| table.name.clone())),
            Column::text("column", "Name of the column", texts(|(_, column)| column.name.clone())),
            Column::text(
                "unit",
                "Unit of the values; empty for a ratio, a count or a text",
                texts(|(_, column)| column.unit.clone()),
            ),
            Column::text("meaning", "What the values are", texts(|(_, column)| column.meaning.clone())),
        ],
    }
}

/// Writes every table, and the dictionary of them all, into `folder/tables`.
///
/// # Errors
/// As [`Table::write`]; also when two tables have one name.
pub fn write_tables(folder: &Path, tables: &[Table]) -> Result<()> {
    let folder = folder.join("tables");
    fs::create_dir_all(&folder).map_err(|error| Error::ours("creating a folder").file(&folder).because(error))?;
    for table in tables {
        table.write(&folder)?;
    }
    dictionary(tables).write(&folder)
}

#[cfg(test)]
mod tests {
    use super::*;
    use polars::prelude::{ParquetReader, SerReader};

    fn sample() -> Table {
        Table {
            name: "sample".into(),
            caption: "A sample".into(),
            columns: vec![
                Column::number("depth_m", "m", "Depth", [Some(500.0), Some(0.1 + 0.2), None, Some(f64::NAN)]),
                Column::count("cells", "", "Cells", [Some(-3), None, Some(i64::MAX), Some(0)]),
                Column::text("name", "Name", ["=cmd()", "a \"b\", c", "two\nlines", ""]),
            ],
        }
    }

    #[test]
    fn csv_is_full_quoted_and_harmless() {
        let folder = tempfile::tempdir().unwrap();
        sample().write(folder.path()).unwrap();
        let text = fs::read_to_string(folder.path().join("sample.csv")).unwrap();
        // 0.1 + 0.2 in IEEE 754 doubles prints as 0.30000000000000004 (shortest text that reads back the same);
        // quoting as in RFC 4180.
        assert_eq!(
            text,
            "depth_m,cells,name\n500.0,-3,'=cmd()\n0.30000000000000004,,\"a \"\"b\"\", c\"\n,9223372036854775807,\"two\nlines\"\n,0,\n"
        );
    }

    #[test]
    fn parquet_reads_back_equal() {
        let folder = tempfile::tempdir().unwrap();
        sample().write(folder.path()).unwrap();
        let file = File::open(folder.path().join("sample.parquet")).unwrap();
        let read = ParquetReader::new(file).finish().unwrap();
        assert_eq!(read.shape(), (4, 3));
        let depths: Vec<Option<f64>> = read.column("depth_m").unwrap().f64().unwrap().iter().collect();
        assert_eq!(depths, [Some(500.0), Some(0.1 + 0.2), None, None]);
        let cells: Vec<Option<i64>> = read.column("cells").unwrap().i64().unwrap().iter().collect();
        assert_eq!(cells, [Some(-3), None, Some(i64::MAX), Some(0)]);
        let names: Vec<Option<&str>> = read.column("name").unwrap().str().unwrap().iter().collect();
        assert_eq!(names, [Some("=cmd()"), Some("a \"b\", c"), Some("two\nlines"), None]);
    }

    #[test]
    fn two_writes_give_equal_bytes() {
        let (one, two) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
        write_tables(one.path(), &[sample()]).unwrap();
        std::thread::sleep(std::time::Duration::from_millis(1100));
        write_tables(two.path(), &[sample()]).unwrap();
        for name in ["sample.csv", "sample.parquet", "sample.md", "dictionary.csv", "dictionary.parquet"] {
            let read = |folder: &tempfile::TempDir| fs::read(folder.path().join("tables").join(name)).unwrap();
            assert_eq!(read(&one), read(&two), "{name}");
        }
    }

    #[test]
    fn a_ragged_table_and_a_repeated_name_are_refused() {
        let folder = tempfile::tempdir().unwrap();
        let mut ragged = sample();
        ragged.columns.push(Column::count("more", "", "", [Some(1)]));
        assert!(ragged.write(folder.path()).unwrap_err().to_string().contains("sample"));
        let twice = write_tables(folder.path(), &[sample(), sample()]).unwrap_err();
        assert!(twice.to_string().contains("sample.csv"));
    }

    #[test]
    fn an_empty_table_is_written() {
        let folder = tempfile::tempdir().unwrap();
        let empty = Table { columns: vec![Column::number("x", "", "", [])], ..sample() };
        empty.write(folder.path()).unwrap();
        assert_eq!(fs::read_to_string(folder.path().join("sample.csv")).unwrap(), "x\n");
    }

    #[test]
    fn the_dictionary_has_every_column() {
        let dictionary = dictionary(&[sample(), sample()]);
        assert_eq!(dictionary.rows(), 6);
        assert_eq!(dictionary.columns[1].values.rounded(0), "depth_m");
        assert_eq!(dictionary.columns[2].values.rounded(0), "m");
    }

    #[test]
    fn names_become_safe_file_names() {
        assert_eq!(file_stem("../../etc/Passwd"), "etc-passwd");
        assert_eq!(file_stem("gravity 1,000 m"), "gravity-1-000-m");
        assert_eq!(file_stem("\u{1f5fa}"), "unnamed");
        assert_eq!(file_stem(&"x".repeat(400)).len(), 60);
    }
}
