//! The run: every layer is placed, bodies and contacts are found, and the comparison is made.

use geo::LineString;
use ndarray::Array2;
use rayon::prelude::*;

use super::deposits::{Deposit, read_deposits};
use super::plan::{Plan, PlannedPotential};
use super::progress::Progress;
use super::settings::{BodyChoice, Potential, PotentialKind};
use crate::coincidence::{Comparison, Reference, Settings, Subject, compare};
use crate::conductor::{Bodies, Side, find_bodies};
use crate::contact::{Contact, ContactSettings, find_contacts};
use crate::error::{Error, Result};
use crate::field::{InducingField, PreparedField};
use crate::grid::{Grid, Mask, Placed, distance_to_lines, read_lines};

/// Density, kg/m3, that stands for 1 A/m of magnetisation in pseudo-gravity; its choice scales the field and moves no contact.
pub(super) const DENSITY_PER_MAGNETISATION: f64 = 1e-3;

/// A layer that holds fewer distinct values than two cannot be compared.
const LEAST_SPREAD: f64 = 1e-12;

/// All that a run has found.
#[derive(Debug)]
pub struct Findings {
    /// What was planned.
    pub plan: Plan,
    /// The slices, from the shallowest down.
    pub slices: Vec<SliceFinding>,
    /// The potential fields as placed, in the order of the study.
    pub potentials: Vec<Placed>,
    /// What the conductors were tested against: each potential field at each height, then each line set.
    pub references: Vec<ReferenceFinding>,
    /// Which slice and side each subject of the comparison is.
    pub subjects: Vec<(usize, Side)>,
    /// The tests.
    pub comparison: Comparison,
    /// Known deposits.
    pub deposits: Vec<Deposit>,
}

/// One depth.
#[derive(Debug)]
pub struct SliceFinding {
    /// Depth in metres.
    pub depth: f64,
    /// log10 resistivity on the frame, and how it came there.
    pub placed: Placed,
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

/// One reference.
#[derive(Debug)]
pub struct ReferenceFinding {
    /// Name of the potential field or of the line set.
    pub name: String,
    /// Index of the potential field, or `None` for mapped lines.
    pub potential: Option<usize>,
    /// Height of upward continuation, m; `None` for mapped lines.
    pub height: Option<f64>,
    /// Horizontal gradient magnitude, in units of the field per metre; `None` for mapped lines.
    pub strength: Option<Grid>,
    /// The contacts; empty for mapped lines.
    pub contacts: Vec<Contact>,
    /// The lines that distances were taken to.
    pub lines: Vec<LineString<f64>>,
    /// Distance from each cell to the nearest line, m, capped.
    pub distance: Array2<f64>,
}

/// Carries out a plan.
///
/// # Errors
/// Layers that cannot be read, placed or transformed, and settings that leave nothing to compare. What the data cannot
/// tell is no error but a verdict of the test concerned.
pub fn run(plan: Plan, progress: &dyn Progress) -> Result<Findings> {
    let slices = place_slices(&plan, progress)?;
    let (potentials, mut references) = find_references(&plan, progress)?;
    references.extend(mapped_references(&plan)?);
    let deposits = match &plan.study.deposits {
        Some(choice) => read_deposits(choice, &plan.frame)?,
        None => Vec::new(),
    };
    progress.stage("testing every shift", 1);
    let (subjects, layers) = subjects(&slices);
    let fixed: Vec<Reference> = references.iter().map(ReferenceFinding::layer).collect();
    let comparison = compare(&layers, &fixed, &settings(&plan))?;
    progress.step();
    Ok(Findings { slices, potentials, references, subjects, comparison, deposits, plan })
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

fn place_slices(plan: &Plan, progress: &dyn Progress) -> Result<Vec<SliceFinding>> {
    progress.stage("placing the resistivity slices", plan.slices.len() as u64);
    let study = &plan.study;
    let place = |index: usize| {
        let slice = &plan.slices[index];
        let path = &slice.layer.source.path;
        let raster = slice.layer.source.open()?;
        let quantity = study.conductivity.quantity;
        let placed = raster
            .place(slice.layer.band, &plan.frame, |values| quantity.to_log10_resistivity(values))?
            .within_range_read();
        refuse_constant(&placed.grid, &format!("the slice at {} m, in log10 ohm m", slice.depth))
            .map_err(|error| error.file(path))?;
        let find = |choice: &BodyChoice, side, area| {
            find_bodies(&placed.grid, side, choice.threshold, area, study.seed).map_err(|error| error.file(path))
        };
        let conductors = find(&study.conductivity.conductors, Side::Conductor, plan.conductor_area)?;
        let resistors = match &study.conductivity.resistors {
            Some(choice) => Some(find(choice, Side::Resistor, plan.resistor_area)?),
            None => None,
        };
        progress.step();
        Ok(SliceFinding { depth: slice.depth, placed, conductors, resistors })
    };
    // All are collected before the first error is taken, so that the same one is told whichever thread is faster.
    let placed: Vec<Result<SliceFinding>> = if plan.slices.iter().any(|slice| slice.layer.format == "netCDF") {
        // The HDF5 library below NetCDF is silenced on the thread that loads it only, and prints on every other.
        (0..plan.slices.len()).map(place).collect()
    } else {
        (0..plan.slices.len()).into_par_iter().map(place).collect()
    };
    let slices: Vec<SliceFinding> = placed.into_iter().collect::<Result<_>>()?;
    if slices.iter().all(|slice| slice.conductors.bodies.is_empty()) {
        return Err(Error::input("the conductors")
            .file(&study.path)
            .found("no cell of any slice beyond the threshold in a body of the least area")
            .wanted("at least one conductor")
            .mend("check conductivity.quantity, or change the threshold or least_area of conductors"));
    }
    Ok(slices)
}

/// A constant layer is a mistake in the file, not a result.
fn refuse_constant(grid: &Grid, thing: &str) -> Result<()> {
    match grid.range() {
        Some((low, high)) if high - low <= LEAST_SPREAD * low.abs().max(high.abs()).max(1.0) => {
            Err(Error::input(thing)
                .found(format!("the value {low} in every cell that the frame covers"))
                .wanted("a layer that varies")
                .mend("check the file and the band"))
        }
        _ => Ok(()),
    }
}

fn find_references(plan: &Plan, progress: &dyn Progress) -> Result<(Vec<Placed>, Vec<ReferenceFinding>)> {
    let steps = plan.study.potentials.iter().map(|field| field.heights.len()).sum::<usize>();
    progress.stage("picking contacts", steps as u64);
    let (mut placed, mut references) = (Vec::new(), Vec::new());
    for (index, (field, planned)) in plan.study.potentials.iter().zip(&plan.potentials).enumerate() {
        let path = &planned.layer.source.path;
        let named = |error: Error| error.file(path);
        let raster = planned.layer.source.open()?;
        // Transforms see the field beyond the frame where it is known, so that edges fall outside.
        let wide = raster.place(planned.layer.band, &plan.frame.grown(planned.ring)?, Ok)?;
        refuse_constant(&wide.grid, &format!("the potential field {:?}", field.name)).map_err(named)?;
        let prepared = prepare(field, &wide.grid, plan.true_north).map_err(named)?;
        for height in &field.heights {
            let found = find_at_height(plan, field, planned, &prepared, *height).map_err(named)?;
            references.push(ReferenceFinding { potential: Some(index), ..found });
            progress.step();
        }
        let grid = wide.grid.trimmed(planned.ring)?;
        placed.push(Placed { grid, ..wide });
    }
    Ok((placed, references))
}

fn prepare(field: &Potential, grid: &Grid, true_north: f64) -> Result<PreparedField> {
    let prepared = PreparedField::new(grid)?;
    match field.kind {
        PotentialKind::Gravity | PotentialKind::Other => Ok(prepared),
        PotentialKind::Magnetic { inclination, declination } => prepared
            .to_pseudo_gravity(InducingField::new(inclination, declination + true_north)?, DENSITY_PER_MAGNETISATION),
    }
}

fn find_at_height(
    plan: &Plan,
    field: &Potential,
    planned: &PlannedPotential,
    prepared: &PreparedField,
    height: f64,
) -> Result<ReferenceFinding> {
    let gradient = prepared.gradient(height)?;
    let (strong, weak) = field.contacts;
    let contacts = find_contacts(&gradient, &ContactSettings::new(strong, weak, planned.least_length)?)?;
    let lines: Vec<LineString<f64>> = contacts.iter().map(|contact| contact.line.clone()).collect();
    let strength = Grid::new(gradient.frame().clone(), gradient.horizontal())?.trimmed(planned.ring)?;
    Ok(ReferenceFinding {
        name: field.name.clone(),
        potential: None,
        height: Some(height),
        strength: Some(strength),
        distance: distances(plan, &lines),
        contacts,
        lines,
    })
}

fn mapped_references(plan: &Plan) -> Result<Vec<ReferenceFinding>> {
    let read = |mapped: &super::settings::MappedLines| {
        let lines = read_lines(&mapped.source, &plan.frame, plan.farthest())?;
        Ok(ReferenceFinding {
            name: mapped.name.clone(),
            potential: None,
            height: None,
            strength: None,
            contacts: Vec::new(),
            distance: distances(plan, &lines),
            lines,
        })
    };
    plan.study.lines.iter().map(read).collect()
}

fn distances(plan: &Plan, lines: &[LineString<f64>]) -> Array2<f64> {
    distance_to_lines(&plan.frame, lines, plan.farthest())
}

impl ReferenceFinding {
    /// The cells where the reference is known: those of the field, or the whole frame for mapped lines.
    pub fn footprint(&self) -> Mask {
        match &self.strength {
            Some(strength) => strength.footprint(),
            None => Mask::all(self.distance.dim()),
        }
    }

    fn layer(&self) -> Reference {
        Reference {
            footprint: self.footprint().0,
            distance: Some(self.distance.clone()),
            strength: self.strength.as_ref().map(|strength| strength.values().clone()),
        }
    }
}

/// The subjects: conductors of each depth with log10 conductivity, then, if tested, resistors of each depth.
fn subjects(slices: &[SliceFinding]) -> (Vec<(usize, Side)>, Vec<Subject>) {
    let mut places = Vec::new();
    let mut layers = Vec::new();
    for (index, slice) in slices.iter().enumerate() {
        let footprint = slice.placed.grid.footprint().0;
        places.push((index, Side::Conductor));
        layers.push(Subject {
            members: Some(slice.conductors.mask.0.clone()),
            // Conductivity, so that a positive coefficient means conductive along strong gradients.
            strength: Some(slice.placed.grid.values().mapv(|value| -value)),
            footprint: footprint.clone(),
        });
        if let Some(bodies) = &slice.resistors {
            places.push((index, Side::Resistor));
            layers.push(Subject { members: Some(bodies.mask.0.clone()), strength: None, footprint });
        }
    }
    (places, layers)
}
