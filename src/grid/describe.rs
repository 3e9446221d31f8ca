//! What a raster holds, in words: for a person who wonders how it would be read.

use std::fmt::Write as _;

use super::source::{Raster, Window};
use crate::error::{Error, Result};

impl Raster {
    /// Smallest and largest value of a band (counted from 1), scaled and without no-data.
    ///
    /// # Errors
    /// Data that cannot be read, or no data at all.
    pub fn value_range(&self, band: usize) -> Result<(f64, f64)> {
        let (low, high, _) = self.survey(band)?;
        Ok((low, high))
    }

    /// Smallest and largest value, and the share of cells with data, read in strips so that memory stays small.
    fn survey(&self, band: usize) -> Result<(f64, f64, f64)> {
        let (mut low, mut high, mut count) = (f64::INFINITY, f64::NEG_INFINITY, 0usize);
        let (rows, cols) = self.shape;
        let strip = (4_000_000 / cols.max(1)).clamp(1, rows.max(1));
        for row in (0..rows).step_by(strip) {
            let window = Window { row, col: 0, rows: strip.min(rows - row), cols };
            for value in self.read(band, window)?.iter().filter(|value| value.is_finite()) {
                low = low.min(*value);
                high = high.max(*value);
                count += 1;
            }
        }
        if count == 0 {
            return Err(Error::input(format!("band {band}"))
                .file(self.path())
                .found("no data in any cell")
                .wanted("numbers")
                .mend("check the no-data value"));
        }
        Ok((low, high, count as f64 / (rows * cols) as f64))
    }

    /// Everything that matters for reading the raster, a line for each thing.
    ///
    /// # Errors
    /// Data that cannot be read.
    pub fn describe(&self) -> Result<String> {
        let mut text = String::new();
        let extent = self.extent();
        let unit = if self.crs.geographic { "degrees" } else { "units of the system" };
        // Writing to a String cannot fail.
        let _ = writeln!(text, "{}: raster ({}, {})", self.path().display(), self.format, self.data_type);
        let _ = writeln!(text, "  cells      {} rows x {} columns, {} bands", self.shape.0, self.shape.1, self.bands);
        let _ = writeln!(
            text,
            "  system     {}{}",
            self.crs.name,
            if self.crs.geographic { " (degrees: it will be placed on a projected frame)" } else { "" }
        );
        let _ = writeln!(
            text,
            "  extent     {} to {} east, {} to {} north, in {unit}",
            extent.west, extent.east, extent.south, extent.north
        );
        let turned = self.transform[2] != 0.0 || self.transform[4] != 0.0;
        let order = match (turned, self.transform[5] > 0.0) {
            (true, _) => "turned against the system's axes",
            (false, true) => "southern row first",
            (false, false) => "northern row first",
        };
        let side = |a: f64, b: f64| a.hypot(b);
        let _ = writeln!(
            text,
            "  cell       {} x {} {unit}, {order}",
            side(self.transform[1], self.transform[4]),
            side(self.transform[2], self.transform[5])
        );
        let _ = writeln!(text, "  no data    {}", self.no_data.map_or("not named".into(), |value| value.to_string()));
        if self.scaling != (1.0, 0.0) {
            let _ = writeln!(text, "  scaling    value = {} x stored + {}", self.scaling.0, self.scaling.1);
        }
        if !self.unit.is_empty() {
            let _ = writeln!(text, "  unit       {}", self.unit);
        }
        for band in 1..=self.bands.min(50) {
            let depth = self.depths[band - 1].map_or(String::new(), |depth| format!(" at depth {depth} m"));
            match self.survey(band) {
                Ok((low, high, share)) => {
                    let _ = writeln!(
                        text,
                        "  band {band:<6}{low} to {high}, {:.1} % of cells with data{depth}",
                        100.0 * share
                    );
                }
                Err(error) => {
                    let _ = writeln!(text, "  band {band:<6}{error}");
                }
            }
        }
        Ok(text.trim_end().to_string())
    }
}
