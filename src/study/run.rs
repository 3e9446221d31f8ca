//! The run: every layer is placed, bodies and contacts are found, and the comparison is made.

use super::deposits::{Deposit, read_deposits};
use super::fields::{FieldNoise, PlacedField, place_fields};
use super::plan::Plan;
use super::progress::Progress;
use super::references::{Mapped, ReferenceFinding, find_references};
use super::series::Series;
use super::settings::{Resolution, UnitRole};
use super::slices::{PlacedSlice, SliceFinding, find_bodies_of, place_slices};
use crate::coincidence::{Comparison, Reference, Settings, Subject, compare};
use crate::conductor::Side;
use crate::error::{Error, Result};
use crate::grid::{Grid, Mask, Placed, Units, read_lines, read_units};

/// All that a run has found.
#[derive(Debug)]
pub struct Findings {
    /// What was planned.
    pub plan: Plan,
    /// The slices, from the shallowest down.
    pub slices: Vec<SliceFinding>,
    /// The potential fields, in the order of the study.
    pub potentials: Vec<FieldFinding>,
    /// The mapped units, in the order of the study.
    pub units: Vec<Units>,
    /// The references as the reader knows them: curves over depth.
    pub series: Vec<Series>,
    /// What the subjects were tested against: the layers of each series.
    pub references: Vec<ReferenceFinding>,
    /// What each subject of the comparison is.
    pub subjects: Vec<SubjectFinding>,
    /// The tests.
    pub comparison: Comparison,
    /// Known deposits.
    pub deposits: Vec<Deposit>,
}

/// A potential field as it was used.
#[derive(Debug)]
pub struct FieldFinding {
    /// The field on the frame, and how it came there.
    pub placed: Placed,
    /// Its noise.
    pub noise: FieldNoise,
    /// Resolving length of what contacts are picked on, m.
    pub resolving_length: f64,
}

/// What a subject of the comparison is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SubjectFinding {
    /// The bodies of one side in a slice.
    Bodies {
        /// Index of the slice.
        slice: usize,
        /// Conductors or resistors.
        side: Side,
    },
    /// Mapped units, by index.
    Units(usize),
}

/// Carries out a plan.
///
/// # Errors
/// Layers that cannot be read, placed or transformed, and settings that leave nothing to compare. What the data cannot
/// tell is no error but a verdict of the test concerned.
pub fn run(plan: Plan, progress: &dyn Progress) -> Result<Findings> {
    // Small files first, so that what is wrong with them is told before the long work.
    let (mapped, deposits) = plan.read_small_files()?;
    let placed = place_slices(&plan, progress)?;
    let fields = place_fields(&plan, progress)?;
    let (placed, lengths) = match plan.study.test.resolution {
        Resolution::AsIs => (placed, None),
        Resolution::Matched => {
            let (placed, lengths) = match_resolution(&plan, placed, &fields)?;
            (placed, Some(lengths))
        }
    };
    let slices = find_bodies_of(&plan, placed)?;
    let series = plan.series();
    let references = find_references(&plan, &series, &fields, &mapped, lengths.as_deref(), progress)?;
    let units = mapped.units;
    progress.stage("testing every shift", 1);
    let (subjects, layers) = subjects(&plan, &slices, &units);
    let fixed: Vec<Reference> = references.iter().map(|found| found.layer(series[found.series], &subjects)).collect();
    let comparison = compare(&layers, &fixed, &settings(&plan))?;
    progress.step();
    let potentials = fields.into_iter().map(|field| field.finding()).collect::<Result<_>>()?;
    Ok(Findings { slices, potentials, units, series, references, subjects, comparison, deposits, plan })
}

impl Plan {
    /// Mapped lines, mapped units and deposits, as they come onto the frame.
    ///
    /// # Errors
    /// What their readers refuse.
    pub(super) fn read_small_files(&self) -> Result<(Mapped, Vec<Deposit>)> {
        let lines = self.study.lines.iter().map(|lines| read_lines(&lines.source, &self.frame, self.farthest()));
        let units = self.study.units.iter().map(|units| read_units(&units.source, &self.frame));
        let mapped = Mapped { lines: lines.collect::<Result<_>>()?, units: units.collect::<Result<_>>()? };
        let deposits = self.study.deposits.as_ref().map(|choice| read_deposits(choice, &self.frame)).transpose()?;
        Ok((mapped, deposits.unwrap_or_default()))
    }
}

/// The settings of the comparison.
fn settings(plan: &Plan) -> Settings {
    Settings {
        within: plan.within.clone(),
        profile: plan.profile.clone(),
        distance_cap: plan.distance_cap,
        level: plan.study.test.level,
    }
}

/// Smooths each slice to the resolving length of the coarsest layer at its depth, which is returned for each: the slice
/// itself, or a potential field where it is coarser.
fn match_resolution(
    plan: &Plan,
    slices: Vec<PlacedSlice>,
    fields: &[PlacedField],
) -> Result<(Vec<PlacedSlice>, Vec<f64>)> {
    let fields = fields.iter().zip(&plan.potentials).map(|(field, planned)| {
        let power = field.prepared.gradient_power().map_err(|error| error.file(&planned.layer.source.path))?;
        Ok(power.resolving_length(0.0))
    });
    let coarsest = fields.collect::<Result<Vec<f64>>>()?.into_iter().fold(0.0, f64::max);
    let matched = slices.into_iter().map(|slice| {
        let length = coarsest.max(slice.resolving_length);
        Ok((slice.smoothed_to(length)?, length))
    });
    Ok(matched.collect::<Result<Vec<_>>>()?.into_iter().unzip())
}

/// The subjects: conductors of each depth with log10 conductivity, then, if tested, resistors of each depth; then the
/// mapped units that are moved.
fn subjects(plan: &Plan, slices: &[SliceFinding], units: &[Units]) -> (Vec<SubjectFinding>, Vec<Subject>) {
    let mut subjects = Vec::new();
    let mut layers = Vec::new();
    for (slice, found) in slices.iter().enumerate() {
        let footprint = found.placed.grid.footprint().0;
        subjects.push(SubjectFinding::Bodies { slice, side: Side::Conductor });
        layers.push(Subject {
            members: Some(found.conductors.mask.0.clone()),
            // Conductivity, so that a positive coefficient means conductive along strong gradients.
            strength: Some(found.placed.grid.values().mapv(|value| -value)),
            footprint: footprint.clone(),
        });
        if let Some(bodies) = &found.resistors {
            subjects.push(SubjectFinding::Bodies { slice, side: Side::Resistor });
            layers.push(Subject { members: Some(bodies.mask.0.clone()), strength: None, footprint });
        }
    }
    for (index, (choice, found)) in plan.study.units.iter().zip(units).enumerate() {
        if choice.role == UnitRole::Subject {
            subjects.push(SubjectFinding::Units(index));
            let footprint = Mask::all(plan.frame.shape()).0;
            layers.push(Subject { members: Some(found.mask.0.clone()), strength: None, footprint });
        }
    }
    (subjects, layers)
}

/// A layer that holds fewer distinct values than two cannot be compared.
const LEAST_SPREAD: f64 = 1e-12;

/// A constant layer is a mistake in the file, not a result.
pub(super) fn refuse_constant(grid: &Grid, thing: &str) -> Result<()> {
    match grid.range() {
        Some((low, high)) if high - low <= LEAST_SPREAD * low.abs().max(high.abs()) => Err(Error::input(thing)
            .found(format!("the value {low} in every cell that the frame covers"))
            .wanted("a layer that varies")
            .mend("check the file and the band")),
        _ => Ok(()),
    }
}
