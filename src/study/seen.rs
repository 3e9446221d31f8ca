//! The rasters of a study, opened to see what they say of themselves.

use super::plan::PlannedLayer;
use super::settings::{Model, Study};
use crate::error::{Error, Result};
use crate::grid::{Frame, Raster, Resampler, Source};

/// A raster that has been opened to see what it says of itself.
pub(super) struct Seen {
    pub source: Source,
    pub band: usize,
    pub raster: Raster,
}

impl Seen {
    pub fn open(source: &Source, band: usize) -> Result<Self> {
        let raster = source.open()?;
        if band > raster.bands {
            return Err(Error::input("the band")
                .file(&source.path)
                .found(format!("band {band} asked for, {} in the file", raster.bands))
                .wanted(format!("a band from 1 to {}", raster.bands))
                .mend("set band"));
        }
        Ok(Self { source: source.clone(), band, raster })
    }

    /// How the raster will be read and placed on a frame.
    pub fn planned(&self, frame: &Frame) -> Result<PlannedLayer> {
        let raster_cell = self.raster.cell_in(&frame.crs)?;
        Ok(PlannedLayer {
            source: self.source.clone(),
            band: self.band,
            format: self.raster.format.clone(),
            shape: self.raster.shape,
            crs: self.raster.crs.name.clone(),
            crs_stated: self.raster.crs_stated,
            raster_cell,
            resampler: Resampler::fit_for(raster_cell, frame.cell),
            files: self.raster.files(),
        })
    }
}

/// Opens every slice of the model, from the shallowest down.
pub(super) fn see_slices(study: &Study) -> Result<Vec<(f64, Seen)>> {
    match &study.conductivity.model {
        Model::Slices(slices) => {
            slices.iter().map(|slice| Ok((slice.depth, Seen::open(&slice.source, slice.band)?))).collect()
        }
        Model::Volume { source, depths } => {
            let bands = source.open()?.depths;
            if let Some(depths) = depths
                && depths.len() != bands.len()
            {
                return Err(Error::input("conductivity.depths")
                    .file(&study.path)
                    .found(format!("{} depths for {} bands", depths.len(), bands.len()))
                    .wanted("one for each band of the volume"));
            }
            let depth = |band: usize| {
                depths.as_ref().and_then(|depths| depths.get(band).copied()).or(bands[band]).filter(|d| d.is_finite())
            };
            let mut slices = Vec::new();
            for band in 0..bands.len() {
                let depth = depth(band).ok_or_else(|| {
                    Error::input("the depths of the volume")
                        .file(&source.path)
                        .found(format!("none for band {}", band + 1))
                        .wanted("a depth axis in the file, or depths in the study")
                        .mend("add depths = [...] under [conductivity], one for each band, in metres")
                })?;
                if slices.iter().any(|(other, _)| *other == depth) {
                    return Err(Error::input("the depths of the volume")
                        .file(&source.path)
                        .found(format!("{depth} m twice"))
                        .wanted("each depth once"));
                }
                slices.push((depth, Seen::open(source, band + 1)?));
            }
            slices.sort_by(|a, b| a.0.total_cmp(&b.0));
            Ok(slices)
        }
    }
}
