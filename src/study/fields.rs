//! The potential fields of a run: placed beyond the frame, and prepared for transforms.

use super::plan::{Plan, PlannedDirections};
use super::progress::Progress;
use super::run::{FieldFinding, refuse_constant};
use super::settings::Angles;
use crate::error::{Error, Result};
use crate::field::{
    Direction, EdgeNoise, GradientNoise, MagneticDirections, NoiseEstimate, PreparedField, estimate_noise,
};
use crate::grid::{Grid, Placed};

/// Density, kg/m3, that stands for 1 A/m of magnetisation in pseudo-gravity; its choice scales the field and moves no contact.
pub(super) const DENSITY_PER_MAGNETISATION: f64 = 1e-3;

/// The white noise of a potential field.
#[derive(Debug, Clone, Copy)]
pub struct FieldNoise {
    /// Standard deviation in one cell, units of the file.
    pub sigma: f64,
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
            NoiseOrigin::Study => "study",
            NoiseOrigin::Estimated(estimate) if estimate.is_white() => "estimated",
            NoiseOrigin::Estimated(_) => "estimated, likely too low: the shortest waves are not white",
            NoiseOrigin::Unknown => "unknown, taken as none: the layer is too small for an estimate",
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
    /// Directions of field and magnetisation on the frame, and how noise grows toward the edges, for magnetics.
    pub magnetic: Option<(MagneticDirections, EdgeNoise)>,
}

impl PlacedField {
    /// The noise of the gradient of what contacts are picked on, `height` metres up.
    pub fn gradient_noise(&self, height: f64) -> Result<GradientNoise> {
        let cell = self.prepared.frame().cell;
        match &self.magnetic {
            None => GradientNoise::of_field(self.noise.sigma, cell, height),
            Some((directions, edges)) => {
                let ratio = DENSITY_PER_MAGNETISATION;
                GradientNoise::of_pseudo_gravity(self.noise.sigma, cell, height, *directions, ratio)?.near_edges(edges)
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
        let noise = match field.noise {
            Some(sigma) => FieldNoise { sigma, origin: NoiseOrigin::Study },
            // What cannot be estimated is no fault of the study: quantiles alone then pick the contacts, and the page says so.
            None => match estimate_noise(&wide.grid) {
                Ok(estimate) => FieldNoise { sigma: estimate.cautious(), origin: NoiseOrigin::Estimated(estimate) },
                Err(_) => FieldNoise { sigma: 0.0, origin: NoiseOrigin::Unknown },
            },
        };
        progress.step();
        let edges = |directions| {
            let product = |layer: &PreparedField| layer.to_pseudo_gravity(directions, DENSITY_PER_MAGNETISATION);
            Ok((directions, EdgeNoise::new(prepared.frame(), product)?))
        };
        let magnetic = directions.map(edges).transpose()?;
        Ok(PlacedField { wide, ring: planned.ring, prepared, noise, magnetic })
    });
    fields.collect()
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
