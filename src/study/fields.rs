//! The potential fields of a run: placed beyond the frame, and prepared for transforms.

use super::plan::{Plan, PlannedDirections};
use super::progress::Progress;
use super::run::{FieldFinding, refuse_constant};
use super::settings::Angles;
use crate::error::{Error, Result};
use crate::field::{
    Direction, EdgeNoise, GradientNoise, MagneticDirections, NoiseEstimate, PreparedField, estimate_noise,
};
use crate::grid::{Frame, Grid, Placed, Raster};

/// Density, kg/m3, that stands for 1 A/m of magnetisation in pseudo-gravity; its choice scales the field and moves no contact.
pub(super) const DENSITY_PER_MAGNETISATION: f64 = 1e-3;

/// The white noise of a potential field.
#[derive(Debug, Clone, Copy)]
pub struct FieldNoise {
    /// Standard deviation in one cell of the frame, units of the file; of an estimate, with one standard error on top.
    pub sigma: f64,
    /// The same in one cell of the file: white noise has the same power for the area, so that the deviation goes inversely
    /// as the side of the cell.
    pub in_file: f64,
    /// Where it is known from.
    pub origin: NoiseOrigin,
}

/// Where the noise of a potential field is known from.
#[derive(Debug, Clone, Copy)]
pub enum NoiseOrigin {
    /// The study gives it.
    Study,
    /// From the shortest waves of the layer.
    Estimated(NoiseEstimate),
    /// The layer is too small or too ragged for an estimate, and counts as free of noise.
    Unknown,
}

impl FieldNoise {
    /// Where the number comes from, in words.
    pub(super) fn origin(&self) -> &'static str {
        match self.origin {
            NoiseOrigin::Study => "given by the study",
            NoiseOrigin::Estimated(estimate) if estimate.is_white() => "estimated, one standard error on top",
            NoiseOrigin::Estimated(_) => "estimated, likely wrong: the shortest waves are not white",
            NoiseOrigin::Unknown => "unknown, taken as none: too few cells for an estimate",
        }
    }

    /// True if the chance that noise makes a contact is known: the noise is given, or the layer bears the estimate out.
    pub(super) fn is_known(&self) -> bool {
        match self.origin {
            NoiseOrigin::Study => true,
            NoiseOrigin::Estimated(estimate) => estimate.is_white(),
            NoiseOrigin::Unknown => false,
        }
    }
}

/// A potential field beyond the frame as far as it is known, so that edges fall outside, and made ready.
pub(super) struct PlacedField {
    /// As placed, with the ring.
    pub wide: Placed,
    /// Cells around the frame.
    pub ring: usize,
    /// Gravity, pseudo-gravity or whatever contacts are picked on.
    pub prepared: PreparedField,
    /// Its noise.
    pub noise: FieldNoise,
    /// Directions of field and magnetisation on the frame, for magnetics.
    pub directions: Option<MagneticDirections>,
    /// How the noise of the gradient grows toward the edges.
    edges: EdgeNoise,
}

impl PlacedField {
    /// The noise of the gradient of what contacts are picked on, `height` metres up.
    pub fn gradient_noise(&self, height: f64) -> Result<GradientNoise> {
        let (sigma, cell) = (self.noise.sigma, self.prepared.frame().cell);
        let plain = match self.directions {
            None => GradientNoise::of_field(sigma, cell, height),
            Some(directions) => {
                GradientNoise::of_pseudo_gravity(sigma, cell, height, directions, DENSITY_PER_MAGNETISATION)
            }
        };
        plain?.near_edges(&self.edges)
    }

    /// The noise of the gradient of its first vertical derivative, at the height of the field itself.
    pub fn vertical_noise(&self) -> Result<GradientNoise> {
        let (sigma, cell) = (self.noise.sigma, self.prepared.frame().cell);
        match self.directions {
            None => GradientNoise::of_vertical(sigma, cell, 0.0),
            Some(directions) => {
                GradientNoise::of_vertical_pseudo_gravity(sigma, cell, 0.0, directions, DENSITY_PER_MAGNETISATION)
            }
        }
    }

    /// What a report needs of it.
    pub fn finding(self) -> Result<FieldFinding> {
        let grid = self.wide.grid.trimmed(self.ring)?;
        let resolving_length = self.prepared.gradient_power().map_or(f64::NAN, |power| power.resolving_length(0.0));
        Ok(FieldFinding { placed: Placed { grid, ..self.wide }, noise: self.noise, resolving_length })
    }
}

/// Places and prepares every potential field.
pub(super) fn place_fields(plan: &Plan, progress: &dyn Progress) -> Result<Vec<PlacedField>> {
    progress.stage("preparing the potential fields", plan.study.potentials.len() as u64);
    let fields = plan.study.potentials.iter().zip(&plan.potentials).map(|(field, planned)| {
        let named = |error: Error| error.file(&planned.layer.source.path);
        let raster = planned.layer.source.open()?;
        let wide = raster.place(planned.layer.band, &plan.frame.grown(planned.ring)?, Ok)?;
        refuse_constant(&wide.grid, &format!("the potential field {:?}", field.name)).map_err(named)?;
        let directions = planned.directions.map(|planned| on_frame(planned, plan.true_north)).transpose()?;
        let prepared = prepare(directions, &wide.grid).map_err(named)?;
        let noise = noise(field.noise, &raster, planned.layer.band, &wide, plan.frame.cell);
        let edges = EdgeNoise::new(prepared.frame(), |layer| match directions {
            None => Ok(layer.clone()),
            Some(directions) => layer.to_pseudo_gravity(directions, DENSITY_PER_MAGNETISATION),
        })?;
        progress.step();
        Ok(PlacedField { wide, ring: planned.ring, prepared, noise, directions, edges })
    });
    fields.collect()
}

/// The most cells that a file may have for its noise to be estimated on its own cells.
const MOST_FILE_CELLS: usize = 1 << 24;

/// The noise of a field on the frame, given or estimated; an estimate is made on the file's own cells where that can be,
/// since resampling takes away the waves that it is made from.
fn noise(given: Option<f64>, raster: &Raster, band: usize, wide: &Placed, cell: f64) -> FieldNoise {
    let scale = wide.raster_cell / cell;
    if let Some(sigma) = given {
        return FieldNoise { sigma: sigma * scale, in_file: sigma, origin: NoiseOrigin::Study };
    }
    let (rows, cols) = raster.shape;
    // Neither the system nor the size of a cell matters to the estimate.
    let own = || {
        let values = raster.own_cells(band).ok()?;
        Grid::new(Frame::local(1.0, rows, cols).ok()?, values).ok()
    };
    let own = if rows * cols <= MOST_FILE_CELLS { own() } else { None };
    // What cannot be estimated is no fault of the study: quantiles alone then pick the contacts, and the page says so.
    match own.map(|own| estimate_noise(&own)) {
        Some(Ok(estimate)) => {
            let in_file = estimate.cautious();
            FieldNoise { sigma: in_file * scale, in_file, origin: NoiseOrigin::Estimated(estimate) }
        }
        Some(Err(_)) => FieldNoise { sigma: 0.0, in_file: 0.0, origin: NoiseOrigin::Unknown },
        None => match estimate_noise(&wide.grid) {
            Ok(estimate) => {
                let sigma = estimate.cautious();
                FieldNoise { sigma, in_file: sigma / scale, origin: NoiseOrigin::Estimated(estimate) }
            }
            Err(_) => FieldNoise { sigma: 0.0, in_file: 0.0, origin: NoiseOrigin::Unknown },
        },
    }
}

/// Directions from true north turned to the frame's grid north.
fn on_frame(planned: PlannedDirections, true_north: f64) -> Result<MagneticDirections> {
    let turned = |angles: Angles| Direction::new(angles.inclination, angles.declination + true_north);
    let field = turned(planned.field)?;
    Ok(match planned.magnetisation {
        None => MagneticDirections::induced(field),
        Some(own) => MagneticDirections::with_remanence(field, turned(own)?),
    })
}

fn prepare(directions: Option<MagneticDirections>, grid: &Grid) -> Result<PreparedField> {
    let prepared = PreparedField::new(grid)?;
    match directions {
        None => Ok(prepared),
        Some(directions) => prepared.to_pseudo_gravity(directions, DENSITY_PER_MAGNETISATION),
    }
}
