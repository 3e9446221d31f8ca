//! Placing a raster on a frame, with a resampler fit for the change of cell size.

use gdal::raster::Buffer;
use gdal::{Dataset, DriverManager};
use ndarray::{Array2, Zip, s};

use super::reason::Reason;
use super::source::{Extent, Raster, Window};
use super::warp::warp;
use super::{Crs, Frame, Grid};
use crate::error::{Error, Result};

/// Coarsening by more than this ratio of cell sizes averages; anything else interpolates.
const COARSENING: f64 = 1.5;

/// A coarser cell needs this share of its area covered by data.
const LEAST_COVER: f64 = 0.5;

/// How values move from the raster's cells to the frame's.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Resampler {
    /// The mean of all cells that fall into a cell of the frame, weighted by area: for coarsening.
    Average,
    /// Cubic convolution, bilinear beside gaps: for refining and for about equal cells.
    Cubic,
}

impl Resampler {
    /// The resampler for a raster's cell and a frame's cell, both in metres.
    pub fn fit_for(raster_cell: f64, frame_cell: f64) -> Self {
        if frame_cell > COARSENING * raster_cell { Self::Average } else { Self::Cubic }
    }

    /// Name in tables, which is also GDAL's.
    pub fn name(self) -> &'static str {
        match self {
            Self::Average => "average",
            Self::Cubic => "cubic",
        }
    }
}

/// A layer on the frame, and how it came there.
#[derive(Debug, Clone)]
pub struct Placed {
    /// The layer.
    pub grid: Grid,
    /// The resampler used.
    pub resampler: Resampler,
    /// Side of the raster's own cells, m.
    pub raster_cell: f64,
    /// Cells of the raster that were read.
    pub cells_read: usize,
    /// Those among them that held a number.
    pub cells_with_data: usize,
    /// The smallest and the largest of those numbers.
    pub range_read: (f64, f64),
}

impl Placed {
    /// The layer with no value outside the range of what was read: cubic convolution overshoots beside steep changes, and
    /// no resistivity may come out that no cell of the model holds. A potential field is left as it is, for its derivatives.
    pub fn within_range_read(self) -> Self {
        let (low, high) = self.range_read;
        Self { grid: self.grid.map(|value| value.clamp(low, high)), ..self }
    }
}

impl Raster {
    /// Reads one band (counted from 1), changes its values, and places them on a frame.
    ///
    /// 1. The window of the raster that the frame needs is read; no-data, masks, scale and offset are honoured.
    /// 2. `change` turns it into what is to be resampled, log10 resistivity for example.
    /// 3. GDAL's warper resamples it: area-weighted average when the frame's cells are more than 1.5 times as large,
    ///    cubic convolution otherwise. When averaging, a cell with less than half its area covered is missing.
    ///
    /// # Errors
    /// No overlap with the frame, nothing but no-data in it, data that cannot be read or changed.
    pub fn place(
        &self,
        band: usize,
        frame: &Frame,
        change: impl Fn(Array2<f64>) -> Result<Array2<f64>>,
    ) -> Result<Placed> {
        let here = |error: Error| error.file(self.path());
        let raster_cell = self.cell_in(&frame.crs)?;
        let resampler = Resampler::fit_for(raster_cell, frame.cell);
        let margin = 4.0 + 2.0 * (frame.cell / raster_cell).ceil();
        let extent = Extent::of(frame).carried(&frame.crs, &self.crs).map_err(here)?;
        // Longitudes repeat after a turn: a raster may run from 0 to 360 degrees, or across the antimeridian.
        let turns: &[f64] = if self.crs.geographic { &[0.0, 360.0, -360.0] } else { &[0.0] };
        let windows = turns.iter().filter_map(|turn| self.window(extent.moved(*turn), margin));
        let window = windows.max_by_key(|window| window.rows * window.cols).ok_or_else(|| here(apart(frame, self)))?;
        let raw = self.read(band, window)?;
        let cells_read = raw.len();
        let changed = change(raw).map_err(here)?;
        let finite = || changed.iter().copied().filter(|value| value.is_finite());
        let cells_with_data = finite().count();
        let range_read = (finite().fold(f64::INFINITY, f64::min), finite().fold(f64::NEG_INFINITY, f64::max));
        if cells_with_data == 0 {
            return Err(here(
                Error::input(format!("band {band}"))
                    .found("no data in any cell that the frame covers")
                    .wanted("numbers")
                    .mend("check the no-data value and the extent"),
            ));
        }
        // A ring without data around the window keeps the average honest where the raster ends inside a cell.
        let pad = 1 + (frame.cell / raster_cell).ceil() as usize;
        let placed = self.warp_array(&changed, f64::NAN, window, pad, frame, resampler).map_err(here)?;
        let values = match resampler {
            Resampler::Cubic => placed,
            Resampler::Average => {
                let covered = changed.mapv(|value| f64::from(u8::from(value.is_finite())));
                let cover = self.warp_array(&covered, 0.0, window, pad, frame, resampler).map_err(here)?;
                let mut values = placed;
                Zip::from(&mut values).and(&cover).for_each(|value, &cover| {
                    // Also false where the cover is NaN.
                    let enough = cover >= LEAST_COVER - 1e-9;
                    if !enough {
                        *value = f64::NAN;
                    }
                });
                values
            }
        };
        let grid = Grid::new(frame.clone(), values)?;
        if grid.footprint().is_empty() {
            return Err(here(apart(frame, self)));
        }
        Ok(Placed { grid, resampler, raster_cell, cells_read, cells_with_data, range_read })
    }

    fn warp_array(
        &self,
        values: &Array2<f64>,
        around: f64,
        window: Window,
        pad: usize,
        frame: &Frame,
        resampler: Resampler,
    ) -> Result<Array2<f64>> {
        let mut padded = Array2::from_elem((window.rows + 2 * pad, window.cols + 2 * pad), around);
        padded.slice_mut(s![pad..pad + window.rows, pad..pad + window.cols]).assign(values);
        let source = in_memory(padded, self.window_transform(window, pad), &self.crs)?;
        let position = [frame.west, frame.cell, 0.0, frame.north, 0.0, -frame.cell];
        let mut target = in_memory(Array2::from_elem(frame.shape(), f64::NAN), position, &frame.crs)?;
        warp(&source, &mut target, resampler)?;
        let failed = |source: gdal::errors::GdalError| Error::ours("reading what was placed").because(Reason(source));
        let size = (frame.cols, frame.rows);
        let band = target.rasterband(1).map_err(failed)?;
        let buffer = band.read_as::<f64>((0, 0), size, size, None).map_err(failed)?;
        Array2::from_shape_vec(frame.shape(), buffer.into_shape_and_vec().1)
            .map_err(|source| Error::ours("shaping what was placed").because(source))
    }
}

/// A raster in memory that holds an array, with NaN as no-data.
fn in_memory(values: Array2<f64>, transform: [f64; 6], crs: &Crs) -> Result<Dataset> {
    let failed = |source: gdal::errors::GdalError| Error::ours("holding a raster in memory").because(Reason(source));
    let (rows, cols) = values.dim();
    let driver = DriverManager::get_driver_by_name("MEM").map_err(failed)?;
    let mut dataset = driver.create_with_band_type::<f64, _>("", cols, rows, 1).map_err(failed)?;
    dataset.set_geo_transform(&transform).map_err(failed)?;
    dataset.set_spatial_ref(&crs.reference()?).map_err(failed)?;
    let mut band = dataset.rasterband(1).map_err(failed)?;
    band.set_no_data_value(Some(f64::NAN)).map_err(failed)?;
    let mut buffer = Buffer::new((cols, rows), values.into_iter().collect());
    band.write((0, 0), (cols, rows), &mut buffer).map_err(failed)?;
    Ok(dataset)
}

fn apart(frame: &Frame, raster: &Raster) -> Error {
    let own = raster.extent();
    Error::input("the extent")
        .found(format!(
            "{:.0} to {:.0} east, {:.0} to {:.0} north in {}, which does not meet the frame",
            own.west, own.east, own.south, own.north, raster.crs.name
        ))
        .wanted(format!(
            "some part of {:.0} to {:.0} east, {:.0} to {:.0} north in {}",
            frame.west,
            frame.east(),
            frame.south(),
            frame.north,
            frame.crs.name
        ))
        .mend("check the coordinate systems, or leave the layer out")
}
