//! Where a file's cells lie, and how to get from them to the ground in EPSG:32633.

use gdal::errors::Result;
use gdal::spatial_ref::{AxisMappingStrategy, CoordTransform, SpatialRef};

/// EPSG code of the frame in which the ground is defined.
pub const GROUND: u32 = 32633;

/// A north-up raster in some CRS.
#[derive(Debug, Clone)]
pub struct Layout {
    /// EPSG code.
    pub epsg: u32,
    /// Western and northern edge, in the CRS's units.
    pub corner: [f64; 2],
    /// Side of a cell, in the CRS's units.
    pub cell: f64,
    /// Number of rows and columns.
    pub shape: (usize, usize),
}

impl Layout {
    /// The smallest layout of whole cells that holds all the `places` (easting and northing in EPSG:32633).
    /// `phase` shifts the cell edges off the multiples of the cell, as a fraction of a cell.
    pub fn around(places: &[[f64; 2]], epsg: u32, cell: f64, phase: f64) -> Result<Self> {
        let places = transform(places, GROUND, epsg)?;
        let bounds = |axis: usize| {
            let low = places.iter().map(|place| place[axis]).fold(f64::INFINITY, f64::min);
            let high = places.iter().map(|place| place[axis]).fold(f64::NEG_INFINITY, f64::max);
            ((low / cell - phase).floor(), (high / cell - phase).ceil())
        };
        let ((west, east), (south, north)) = (bounds(0), bounds(1));
        let corner = [(west + phase) * cell, (north + phase) * cell];
        Ok(Self { epsg, corner, cell, shape: ((north - south) as usize, (east - west) as usize) })
    }

    /// Centre of a cell in the CRS's own units.
    pub fn centre(&self, row: usize, col: usize) -> [f64; 2] {
        [self.corner[0] + (col as f64 + 0.5) * self.cell, self.corner[1] - (row as f64 + 0.5) * self.cell]
    }

    /// Cell centres on the ground (easting and northing in EPSG:32633), in reading order.
    pub fn places(&self) -> Result<Vec<[f64; 2]>> {
        let (rows, cols) = self.shape;
        let centres: Vec<_> = (0..rows).flat_map(|row| (0..cols).map(move |col| self.centre(row, col))).collect();
        transform(&centres, self.epsg, GROUND)
    }

    /// The left part of the layout up to column `at`, and the rest.
    pub fn split(&self, at: usize) -> [Self; 2] {
        let (rows, cols) = self.shape;
        let east = [self.corner[0] + at as f64 * self.cell, self.corner[1]];
        [Self { shape: (rows, at), ..self.clone() }, Self { corner: east, shape: (rows, cols - at), ..self.clone() }]
    }
}

/// The CRS of an EPSG code, with x (easting or longitude) before y whatever the authority's order.
pub fn crs(epsg: u32) -> Result<SpatialRef> {
    let mut crs = SpatialRef::from_epsg(epsg)?;
    crs.set_axis_mapping_strategy(AxisMappingStrategy::TraditionalGisOrder);
    Ok(crs)
}

/// Transforms places (x, y) from one CRS to another.
pub fn transform(places: &[[f64; 2]], from: u32, to: u32) -> Result<Vec<[f64; 2]>> {
    let (mut x, mut y): (Vec<f64>, Vec<f64>) = places.iter().map(|[x, y]| (*x, *y)).unzip();
    CoordTransform::new(&crs(from)?, &crs(to)?)?.transform_coords(&mut x, &mut y, &mut [])?;
    Ok(x.into_iter().zip(y).map(|(x, y)| [x, y]).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By the definition of UTM zone 33: on the central meridian, 15 degrees east, the easting is 500,000 m.
    #[test]
    fn the_central_meridian_is_found_with_longitude_first() {
        let place = transform(&[[500_000.0, 5_624_000.0]], GROUND, 4326).unwrap()[0];
        assert!((place[0] - 15.0).abs() < 1e-9 && place[1] > 50.0 && place[1] < 51.5, "{place:?}");
        let back = transform(&[place], 4326, GROUND).unwrap()[0];
        assert!((back[0] - 500_000.0).abs() < 1e-3 && (back[1] - 5_624_000.0).abs() < 1e-3);
    }

    #[test]
    fn a_layout_holds_the_places_it_was_made_around() {
        let places = [[470_000.0, 5_600_000.0], [530_000.0, 5_640_000.0]];
        let layout = Layout::around(&places, GROUND, 500.0, 0.25).unwrap();
        assert_eq!(layout.corner, [469_625.0, 5_640_125.0]);
        assert_eq!(layout.shape, (81, 121));
        let [west, east] = layout.split(40);
        assert_eq!(east.centre(3, 5), layout.centre(3, 45));
        assert_eq!(west.shape.1 + east.shape.1, 121);
    }
}
