//! The common raster that everything is compared on.

use crate::error::{Error, Result};

/// A coordinate reference system, reduced to what the comparison needs to know of it.
#[derive(Debug, Clone, PartialEq)]
pub struct Crs {
    /// A short name for people and for the study file, such as `EPSG:32633`.
    pub name: String,
    /// The full definition (WKT), as written to output files.
    pub wkt: String,
    /// True for longitude and latitude in degrees.
    pub geographic: bool,
    /// Metres in one unit of its axes; 1 for almost every projected system. Not meaningful for a geographic one.
    pub metres_per_unit: f64,
}

impl Crs {
    /// A local metric system without a definition: for arrays that never came from a map.
    pub fn local() -> Self {
        Self { name: "local".into(), wkt: String::new(), geographic: false, metres_per_unit: 1.0 }
    }
}

/// A north-up raster of square cells: CRS, origin, cell size and shape.
///
/// Rows run north to south and columns west to east; values belong to cell centres; lengths are metres.
#[derive(Debug, Clone, PartialEq)]
pub struct Frame {
    /// The coordinate reference system of the frame.
    pub crs: Crs,
    /// Easting of the western edge, m.
    pub west: f64,
    /// Northing of the northern edge, m.
    pub north: f64,
    /// Side of a cell, m.
    pub cell: f64,
    /// Number of rows.
    pub rows: usize,
    /// Number of columns.
    pub cols: usize,
}

impl Frame {
    /// The largest number of cells that a frame may have: 2^28, about 2 GB for one layer of doubles.
    pub const MOST_CELLS: usize = 1 << 28;

    /// Makes a frame after checking each number.
    ///
    /// # Errors
    /// A geographic or non-metric CRS, a cell that is not positive and finite, an origin that is not finite, an empty
    /// shape, or more than [`Frame::MOST_CELLS`] cells.
    pub fn new(crs: Crs, west: f64, north: f64, cell: f64, rows: usize, cols: usize) -> Result<Self> {
        if crs.geographic {
            return Err(Error::input("the frame's coordinate system")
                .found(format!("{}, which is in degrees", crs.name))
                .wanted("a projected system in metres, because distances and derivatives are taken on the frame")
                .mend("set frame.crs to a projected system that suits the area, such as its UTM zone"));
        }
        if (crs.metres_per_unit - 1.0).abs() > 1e-9 {
            return Err(Error::input("the frame's coordinate system")
                .found(format!("{}, whose unit is {} m", crs.name, crs.metres_per_unit))
                .wanted("a projected system in metres")
                .mend("set frame.crs to a metric system; layers in other units are placed onto it"));
        }
        if !(cell.is_finite() && cell > 0.0) {
            return Err(Error::input("the frame's cell size")
                .found(cell)
                .wanted("a positive number of metres")
                .mend("set frame.cell"));
        }
        if !(west.is_finite() && north.is_finite()) {
            return Err(Error::input("the frame's origin")
                .found(format!("{west}, {north}"))
                .wanted("finite coordinates")
                .mend("check the extent of the layers"));
        }
        if rows == 0 || cols == 0 {
            return Err(Error::input("the frame's shape")
                .found(format!("{rows} rows x {cols} columns"))
                .wanted("at least one cell")
                .mend("choose a smaller frame.cell or check that the layers overlap"));
        }
        if rows.checked_mul(cols).is_none_or(|cells| cells > Self::MOST_CELLS) {
            return Err(Error::input("the frame's shape")
                .found(format!("{rows} rows x {cols} columns"))
                .wanted(format!("at most {} cells", Self::MOST_CELLS))
                .mend("choose a larger frame.cell"));
        }
        Ok(Self { crs, west, north, cell, rows, cols })
    }

    /// A frame of a local metric system with its south-west corner at (0, 0): for arrays that never came from a map.
    ///
    /// # Errors
    /// As [`Frame::new`].
    pub fn local(cell: f64, rows: usize, cols: usize) -> Result<Self> {
        Self::new(Crs::local(), 0.0, cell * rows as f64, cell, rows, cols)
    }

    /// (rows, columns).
    pub fn shape(&self) -> (usize, usize) {
        (self.rows, self.cols)
    }

    /// Easting of the eastern edge, m.
    pub fn east(&self) -> f64 {
        self.west + self.cols as f64 * self.cell
    }

    /// Northing of the southern edge, m.
    pub fn south(&self) -> f64 {
        self.north - self.rows as f64 * self.cell
    }

    /// Area of one cell, m2.
    pub fn cell_area(&self) -> f64 {
        self.cell * self.cell
    }

    /// Easting and northing of a place given in fractional (row, column), where whole numbers are cell centres.
    pub fn position(&self, row: f64, col: f64) -> (f64, f64) {
        (self.west + (col + 0.5) * self.cell, self.north - (row + 0.5) * self.cell)
    }

    /// Fractional (row, column) of an easting and northing; whole numbers are cell centres.
    pub fn row_col(&self, x: f64, y: f64) -> (f64, f64) {
        ((self.north - y) / self.cell - 0.5, (x - self.west) / self.cell - 0.5)
    }

    /// The cell that holds an easting and northing, or `None` outside the frame.
    pub fn cell_at(&self, x: f64, y: f64) -> Option<(usize, usize)> {
        let row = ((self.north - y) / self.cell).floor();
        let col = ((x - self.west) / self.cell).floor();
        let inside = row >= 0.0 && col >= 0.0 && row < self.rows as f64 && col < self.cols as f64;
        inside.then_some((row as usize, col as usize))
    }

    /// The frame with `ring` more cells on each side.
    ///
    /// # Errors
    /// As [`Frame::new`], when the result is too large.
    pub fn grown(&self, ring: usize) -> Result<Self> {
        let by = ring as f64 * self.cell;
        Self::new(
            self.crs.clone(),
            self.west - by,
            self.north + by,
            self.cell,
            self.rows + 2 * ring,
            self.cols + 2 * ring,
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn places_and_cells_are_inverse() {
        let frame = Frame::new(Crs::local(), 1000.0, 9000.0, 250.0, 7, 11).unwrap();
        let (x, y) = frame.position(2.0, 5.0);
        assert_eq!((x, y), (1000.0 + 5.5 * 250.0, 9000.0 - 2.5 * 250.0));
        assert_eq!(frame.row_col(x, y), (2.0, 5.0));
        assert_eq!(frame.cell_at(x, y), Some((2, 5)));
        assert_eq!(frame.cell_at(999.9, y), None);
        assert_eq!(frame.cell_at(x, 9000.1), None);
        assert_eq!((frame.east(), frame.south()), (3750.0, 7250.0));
    }

    #[test]
    fn each_bad_number_is_refused() {
        let degrees = Crs { name: "EPSG:4326".into(), geographic: true, ..Crs::local() };
        assert!(Frame::new(degrees, 0.0, 0.0, 1.0, 2, 2).unwrap_err().to_string().contains("in degrees"));
        let feet = Crs { metres_per_unit: 0.3048, ..Crs::local() };
        assert!(Frame::new(feet, 0.0, 0.0, 1.0, 2, 2).unwrap_err().to_string().contains("0.3048 m"));
        for cell in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(Frame::local(cell, 2, 2).unwrap_err().to_string().contains("cell size"));
        }
        assert!(Frame::new(Crs::local(), f64::NAN, 0.0, 1.0, 2, 2).unwrap_err().to_string().contains("origin"));
        assert!(Frame::local(1.0, 0, 2).unwrap_err().to_string().contains("0 rows"));
        assert!(Frame::local(1.0, usize::MAX, 2).unwrap_err().to_string().contains("at most"));
    }

    #[test]
    fn growing_keeps_the_cells_in_place() {
        let frame = Frame::local(10.0, 4, 6).unwrap();
        let grown = frame.grown(3).unwrap();
        assert_eq!(grown.shape(), (10, 12));
        assert_eq!(grown.position(3.0, 3.0), frame.position(0.0, 0.0));
    }
}
