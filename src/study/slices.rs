//! The slices of a run: placed on the frame, then searched for bodies.

use rayon::prelude::*;

use super::plan::Plan;
use super::progress::Progress;
use super::run::refuse_constant;
use super::settings::BodyChoice;
use crate::conductor::{Bodies, Side, find_bodies};
use crate::error::{Error, Result};
use crate::field::PreparedField;
use crate::grid::Placed;

/// A slice on the frame, not yet searched for bodies.
pub(super) struct PlacedSlice {
    pub placed: Placed,
    /// Resolving length, m, as placed or, where it was smoothed, as smoothed.
    pub resolving_length: f64,
    /// Standard deviation of the Gaussian that it was smoothed by, m.
    pub smoothed_by: f64,
}

/// One depth.
#[derive(Debug)]
pub struct SliceFinding {
    /// Depth in metres.
    pub depth: f64,
    /// log10 resistivity on the frame, and how it came there; smoothed where resolutions were matched.
    pub placed: Placed,
    /// Its resolving length, m.
    pub resolving_length: f64,
    /// Standard deviation of the Gaussian that it was smoothed by to match the fields, m; 0 where it was not.
    pub smoothed_by: f64,
    /// Its conductors.
    pub conductors: Bodies,
    /// Its resistors, if they are tested.
    pub resistors: Option<Bodies>,
}

impl SliceFinding {
    /// The bodies of one side, if they were looked for.
    pub fn side(&self, side: Side) -> Option<&Bodies> {
        match side {
            Side::Conductor => Some(&self.conductors),
            Side::Resistor => self.resistors.as_ref(),
        }
    }
}

impl PlacedSlice {
    /// The slice smoothed until its resolving length is at least `length` metres.
    pub fn smoothed_to(self, length: f64) -> Result<Self> {
        if length <= self.resolving_length {
            return Ok(self);
        }
        let prepared = PreparedField::new(&self.placed.grid)?;
        let power = prepared.gradient_power()?;
        let sigma = power.sigma_for(length);
        let grid = prepared.smoothed(sigma)?;
        let placed = Placed { grid, ..self.placed };
        Ok(Self { placed, resolving_length: power.smoothed_length(sigma), smoothed_by: sigma })
    }
}

/// Places every slice on the frame, from the shallowest down.
pub(super) fn place_slices(plan: &Plan, progress: &dyn Progress) -> Result<Vec<PlacedSlice>> {
    progress.stage("placing the resistivity slices", plan.slices.len() as u64);
    let place = |index: usize| {
        let slice = &plan.slices[index];
        let named = |error: Error| error.file(&slice.layer.source.path);
        let raster = slice.layer.source.open()?;
        let quantity = plan.study.conductivity.quantity;
        let placed = raster
            .place(slice.layer.band, &plan.frame, |values| quantity.to_log10_resistivity(values))?
            .within_range_read();
        refuse_constant(&placed.grid, &format!("the slice at {} m, in log10 ohm m", slice.depth)).map_err(named)?;
        progress.step();
        // A slice that is too small for a transform, or a plane, has no resolving length, which is no fault of its own.
        let power = PreparedField::new(&placed.grid).and_then(|prepared| prepared.gradient_power());
        let resolving_length = power.map_or(f64::NAN, |power| power.resolving_length(0.0));
        Ok(PlacedSlice { placed, resolving_length, smoothed_by: 0.0 })
    };
    // All are collected before the first error is taken, so that the same one is told whichever thread is faster.
    let placed: Vec<Result<PlacedSlice>> = if plan.slices.iter().any(|slice| slice.layer.format == "netCDF") {
        // The HDF5 library below NetCDF is silenced on the thread that loads it only, and prints on every other.
        (0..plan.slices.len()).map(place).collect()
    } else {
        (0..plan.slices.len()).into_par_iter().map(place).collect()
    };
    placed.into_iter().collect()
}

/// Finds the conductors, and the resistors if they are tested, of each slice.
pub(super) fn find_bodies_of(plan: &Plan, placed: Vec<PlacedSlice>) -> Result<Vec<SliceFinding>> {
    let study = &plan.study;
    let search = |(placed, slice): (PlacedSlice, &super::plan::PlannedSlice)| {
        let find = |choice: &BodyChoice, side, area| {
            find_bodies(&placed.placed.grid, side, choice.threshold, area, study.seed)
                .map_err(|error| error.file(&slice.layer.source.path))
        };
        let conductors = find(&study.conductivity.conductors, Side::Conductor, plan.conductor_area)?;
        let resistors = match &study.conductivity.resistors {
            Some(choice) => Some(find(choice, Side::Resistor, plan.resistor_area)?),
            None => None,
        };
        let PlacedSlice { placed, resolving_length, smoothed_by } = placed;
        Ok(SliceFinding { depth: slice.depth, placed, resolving_length, smoothed_by, conductors, resistors })
    };
    let found: Vec<Result<SliceFinding>> = placed.into_par_iter().zip(plan.slices.par_iter()).map(search).collect();
    let slices: Vec<SliceFinding> = found.into_iter().collect::<Result<_>>()?;
    if slices.iter().all(|slice| slice.conductors.bodies.is_empty()) {
        return Err(Error::input("the conductors")
            .file(&study.path)
            .found("no cell of any slice beyond the threshold in a body of the least area")
            .wanted("at least one conductor")
            .mend("check conductivity.quantity, or change the threshold or least_area of conductors"));
    }
    Ok(slices)
}
