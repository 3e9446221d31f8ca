//! What limits the answer because of the layers themselves: thresholds, contacts, cells, footprint.

use super::answer::{capital, list};
use super::references::ReferenceFinding;
use super::run::{Findings, SubjectFinding};
use super::settings::{Angles, MappedUnits, UnitRole};
use crate::coincidence::Test;
use crate::conductor::Threshold;
use crate::evidence::{depth_label, distance_label, significant};
use crate::field::LEAST_EXACT_INCLINATION;
use crate::grid::Units;

/// A footprint that fills less of its box than this, or is this many times longer than wide, counts as odd-shaped.
const FULL: f64 = 0.9;
const LONG: f64 = 3.0;

impl Findings {
    /// Cautions that follow from the layers of this study, with their numbers.
    pub(super) fn limits_of_layers(&self) -> Vec<String> {
        self.threshold_limit()
            .into_iter()
            .chain(self.contact_limits())
            .chain([self.cell_limit(), self.footprint_limit(), self.lines_limit()].into_iter().flatten())
            .chain(self.units_limits())
            .collect()
    }

    /// True if a distance is no finer than the cells of both files that a test compares.
    pub(super) fn resolved(&self, test: &Test) -> bool {
        test.measure.within().is_none_or(|within| within >= 0.99 * self.coarser_cell(test))
    }

    /// The larger cell, m, of the two files behind a test.
    fn coarser_cell(&self, test: &Test) -> f64 {
        let slice = match self.subjects[test.subject] {
            SubjectFinding::Bodies { slice, .. } => self.slices[slice].placed.raster_cell,
            SubjectFinding::Units(_) => 0.0,
        };
        let potential = self.series_of(test).potential();
        let field = potential.map_or(0.0, |index| self.potentials[index].placed.raster_cell);
        slice.max(field)
    }

    fn threshold_limit(&self) -> Option<String> {
        let Threshold::Quantile(quantile) = self.plan.study.conductivity.conductors.threshold else { return None };
        let thresholds = || self.slices.iter().map(|slice| 10f64.powf(slice.conductors.threshold_log10));
        let (low, high) = (thresholds().fold(f64::INFINITY, f64::min), thresholds().fold(0.0, f64::max));
        Some(format!(
            "Conductors are the most conductive {} % of each slice, whatever its resistivity: the threshold runs from {} to \
             {} \u{3a9} m.",
            significant(100.0 * (1.0 - quantile), 3),
            significant(low, 3),
            significant(high, 3)
        ))
    }

    /// What the contacts of each field rest on: its noise, and how weak they are.
    fn contact_limits(&self) -> Vec<String> {
        let mut limits = Vec::new();
        for (index, (field, found)) in self.plan.study.potentials.iter().zip(&self.potentials).enumerate() {
            let of_field = |reference: &&ReferenceFinding| self.series[reference.series].potential() == Some(index);
            let Some(first) = self.references.iter().filter(of_field).find(|found| !found.contacts.is_empty()) else {
                continue;
            };
            let strengths = || first.contacts.iter().map(|contact| 1000.0 * contact.mean_strength);
            let noise = format!("{} {} a cell", significant(found.noise.sigma, 2), field.kind.file_unit());
            let known = if found.noise.is_known() {
                format!(
                    "Contacts of {} stand above its noise ({noise}, {}): white noise of that size gives a layer any with a \
                     chance of at most {}. Noise is not all: texture of the ground or of the gridding makes weak contacts that \
                     are no margin.",
                    field.name,
                    found.noise.origin(),
                    field.contacts.significance
                )
            } else {
                format!(
                    "The noise of {} is not known ({noise}, {}), so how many of its contacts are noise cannot be told: quantiles \
                     pick them, and those always find some. Give noise in the study.",
                    field.name,
                    found.noise.origin()
                )
            };
            limits.push(format!(
                "{known} {} their mean gradient runs from {} to {} {}/km (table contacts).",
                match first.height {
                    Some(height) if height > 0.0 => format!("Continued up {},", distance_label(height.round())),
                    _ => "In the field as it is".into(),
                },
                significant(strengths().fold(f64::INFINITY, f64::min), 2),
                significant(strengths().fold(0.0, f64::max), 2),
                field.kind.unit()
            ));
            if let Some(Angles { inclination, .. }) = self.plan.potentials[index].shallow_direction() {
                limits.push(format!(
                    "At an inclination of {}\u{b0} the pseudo-gravity of {} is damped (guard at {LEAST_EXACT_INCLINATION}\u{b0}) in \
                     waves whose crests run along the declination; margins that run that way are less certain.",
                    significant(inclination, 3),
                    field.name
                ));
            }
        }
        limits
    }

    fn cell_limit(&self) -> Option<String> {
        let finest = self.plan.within.first()?;
        let too_fine = |test: &&Test| test.tested && test.measure.within() == Some(*finest) && !self.resolved(test);
        let worst = self
            .comparison
            .tests
            .iter()
            .filter(too_fine)
            .max_by(|a, b| self.coarser_cell(a).total_cmp(&self.coarser_cell(b)))?;
        Some(format!(
            "Within {} is finer than the cells of some files: at {} against {} they measure up to {}.",
            distance_label(*finest),
            self.depth(worst).map_or_else(|| "the surface".into(), depth_label),
            self.plan.series_label(self.series_of(worst)),
            distance_label(self.coarser_cell(worst).round())
        ))
    }

    fn lines_limit(&self) -> Option<String> {
        let names: Vec<String> = self.plan.study.lines.iter().map(|lines| lines.name.clone()).collect();
        (!names.is_empty()).then(|| {
            format!(
                "The lines of {} are taken as mapped over the whole frame; ground that nobody mapped counts as far from them.",
                list(&names)
            )
        })
    }

    /// What was odd about the mapped units, as their reader told it, and what their drawing implies.
    fn units_limits(&self) -> Vec<String> {
        let mut limits = Vec::new();
        if !self.units.is_empty() {
            let names: Vec<String> = self.plan.study.units.iter().map(|units| units.name.clone()).collect();
            limits.push(format!(
                "{}: taken as mapped over the whole frame, so that ground that nobody mapped counts as outside.",
                capital(&list(&names))
            ));
        }
        let moved = self.plan.study.units.iter().any(|units| units.role == UnitRole::Subject);
        if moved && self.plan.study.units.len() + self.plan.study.lines.len() > 1 {
            limits.push(
                "Units and lines of one map touch or exclude each other by the way they are drawn; nearness between them is no \
                 evidence."
                    .into(),
            );
        }
        let told = |(choice, found): (&MappedUnits, &Units)| {
            found.notes.iter().map(|note| format!("{}: {note}.", choice.name)).collect::<Vec<_>>()
        };
        limits.extend(self.plan.study.units.iter().zip(&self.units).flat_map(told));
        limits
    }

    fn footprint_limit(&self) -> Option<String> {
        let footprint = self.slices.first()?.placed.grid.footprint();
        let ((top, left), (bottom, right)) = footprint.bounds()?;
        let (rows, cols) = ((bottom - top + 1) as f64, (right - left + 1) as f64);
        let odd = (footprint.count() as f64) < FULL * rows * cols || rows.max(cols) > LONG * rows.min(cols);
        odd.then(|| {
            "The footprint is ragged or a strip. On such footprints, with patterns only a few cells wide, the family-wise rate of \
             false findings was measured at up to .09 instead of .05."
                .into()
        })
    }
}
