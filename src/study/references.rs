//! The references of a run: contacts at each height, mapped lines, mapped units.

use geo::LineString;
use ndarray::Array2;

use super::contact_details::{ContactDetails, details};
use super::fields::PlacedField;
use super::plan::Plan;
use super::progress::Progress;
use super::run::SubjectFinding;
use super::series::Series;
use crate::coincidence::Reference;
use crate::contact::{Contact, find_contacts_above_noise};
use crate::error::Result;
use crate::grid::{Grid, Mask, Units, distance_to_lines};

/// What came from vector files, in the order of the study.
pub(super) struct Mapped {
    pub lines: Vec<Vec<LineString<f64>>>,
    pub units: Vec<Units>,
}

/// One layer that subjects are tested against.
#[derive(Debug)]
pub struct ReferenceFinding {
    /// Index of the series that it belongs to.
    pub series: usize,
    /// Index of the slice that alone it is compared with; `None` for all.
    pub slice: Option<usize>,
    /// Height of upward continuation, m; `None` for what is mapped.
    pub height: Option<f64>,
    /// Resolving length of the field at that height, m; `None` for what is mapped.
    pub resolving_length: Option<f64>,
    /// Horizontal gradient magnitude, in units of the field per metre; `None` for what is mapped.
    pub strength: Option<Grid>,
    /// The contacts; empty for what is mapped.
    pub contacts: Vec<Contact>,
    /// What more is known of each contact, in their order.
    pub details: Vec<ContactDetails>,
    /// The lines that distances were taken to: contacts, mapped lines, outlines of units.
    pub lines: Vec<LineString<f64>>,
    /// Distance from each cell to the nearest line, m, capped; 0 inside units.
    pub distance: Array2<f64>,
}

/// Finds every layer of every series. `lengths` holds the resolving length of each depth where resolutions are matched.
pub(super) fn find_references(
    plan: &Plan,
    series: &[Series],
    fields: &[PlacedField],
    mapped_layers: &Mapped,
    lengths: Option<&[f64]>,
    progress: &dyn Progress,
) -> Result<Vec<ReferenceFinding>> {
    progress.stage("picking contacts", series.iter().map(|series| plan.layers_of(*series)).sum::<usize>() as u64);
    let mut references = Vec::new();
    for (index, series) in series.iter().enumerate() {
        // Which slice each layer belongs to, and at which height its contacts are picked.
        let layers: Vec<(Option<usize>, f64)> = match *series {
            Series::Height { height, .. } => vec![(None, height)],
            Series::ByDepth { .. } => {
                let tied = |slice| plan.tied_height(slice).map(|height| (Some(slice), height));
                (0..plan.slices.len()).filter_map(tied).collect()
            }
            Series::Matched { potential } => {
                let power = fields[potential].prepared.gradient_power()?;
                let lengths = lengths.unwrap_or_default();
                lengths.iter().enumerate().map(|(slice, length)| (Some(slice), power.height_for(*length))).collect()
            }
            Series::Lines(lines) => {
                let lines = mapped_layers.lines[lines].clone();
                references.push(mapped(index, distances(plan, &lines), lines));
                progress.step();
                Vec::new()
            }
            Series::Units(units) => {
                let found = &mapped_layers.units[units];
                let mut distance = distances(plan, &found.outlines);
                ndarray::Zip::from(&mut distance).and(&found.mask.0).for_each(|distance, &inside| {
                    if inside {
                        *distance = 0.0;
                    }
                });
                references.push(mapped(index, distance, found.outlines.clone()));
                progress.step();
                Vec::new()
            }
        };
        for (slice, height) in layers {
            if let Some(potential) = series.potential() {
                let found = at_height(plan, potential, &fields[potential], height, slice.is_none())
                    .map_err(|error| error.file(&plan.potentials[potential].layer.source.path))?;
                references.push(ReferenceFinding { series: index, slice, ..found });
            }
            progress.step();
        }
    }
    Ok(references)
}

/// The contacts of a field at a height; `ladder` asks to follow them further upward.
fn at_height(
    plan: &Plan,
    potential: usize,
    field: &PlacedField,
    height: f64,
    ladder: bool,
) -> Result<ReferenceFinding> {
    let gradient = field.prepared.gradient(height)?;
    let settings = plan.contact_settings(potential)?;
    let contacts = find_contacts_above_noise(&gradient, &field.gradient_noise(height)?, &settings)?;
    let details = details(plan, potential, field, height, &contacts, ladder)?;
    let lines: Vec<LineString<f64>> = contacts.iter().map(|contact| contact.line.clone()).collect();
    let strength = Grid::new(gradient.frame().clone(), gradient.horizontal())?.trimmed(field.ring)?;
    Ok(ReferenceFinding {
        height: Some(height),
        resolving_length: field.prepared.gradient_power().ok().map(|power| power.resolving_length(height)),
        strength: Some(strength),
        contacts,
        details,
        ..mapped(0, distances(plan, &lines), lines)
    })
}

/// A reference that is not a potential field.
fn mapped(series: usize, distance: Array2<f64>, lines: Vec<LineString<f64>>) -> ReferenceFinding {
    ReferenceFinding {
        series,
        slice: None,
        height: None,
        resolving_length: None,
        strength: None,
        contacts: Vec::new(),
        details: Vec::new(),
        distance,
        lines,
    }
}

fn distances(plan: &Plan, lines: &[LineString<f64>]) -> Array2<f64> {
    distance_to_lines(&plan.frame, lines, plan.farthest())
}

impl ReferenceFinding {
    /// The cells where the reference is known: those of the field, or the whole frame for what is mapped.
    pub fn footprint(&self) -> Mask {
        match &self.strength {
            Some(strength) => strength.footprint(),
            None => Mask::all(self.distance.dim()),
        }
    }

    /// As the comparison takes it, with the subjects that it meets.
    pub(super) fn layer(&self, series: Series, subjects: &[SubjectFinding]) -> Reference {
        let meets = |subject: &SubjectFinding| match *subject {
            SubjectFinding::Bodies { slice, .. } => self.slice.is_none_or(|own| own == slice),
            SubjectFinding::Units(index) => series.meets_units() && series != Series::Units(index),
        };
        let against = subjects.iter().enumerate().filter(|(_, subject)| meets(subject)).map(|(index, _)| index);
        Reference {
            footprint: self.footprint().0,
            area: series.is_area(),
            against: Some(against.collect()),
            distance: Some(self.distance.clone()),
            strength: self.strength.as_ref().map(|strength| strength.values().clone()),
        }
    }
}
