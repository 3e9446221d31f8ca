//! What limits the answer because of the layers themselves: thresholds, contacts, cells, footprint.

use super::answer::list;
use super::run::Findings;
use crate::coincidence::Test;
use crate::conductor::Threshold;
use crate::evidence::{depth_label, distance_label, significant};

/// A footprint that fills less of its box than this, or is this many times longer than wide, counts as odd-shaped.
const FULL: f64 = 0.9;
const LONG: f64 = 3.0;

impl Findings {
    /// Cautions that follow from the layers of this study, with their numbers.
    pub(super) fn limits_of_layers(&self) -> Vec<String> {
        [self.threshold_limit(), self.contact_limit(), self.cell_limit(), self.footprint_limit(), self.lines_limit()]
            .into_iter()
            .flatten()
            .collect()
    }

    /// True if a distance is no finer than the cells of both files that a test compares.
    pub(super) fn resolved(&self, test: &Test) -> bool {
        test.measure.within().is_none_or(|within| within >= 0.99 * self.coarser_cell(test))
    }

    /// The larger cell, m, of the two files behind a test.
    fn coarser_cell(&self, test: &Test) -> f64 {
        let slice = self.slices[self.subjects[test.subject].0].placed.raster_cell;
        let field = self.references[test.reference].potential.map_or(0.0, |index| self.potentials[index].raster_cell);
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

    fn contact_limit(&self) -> Option<String> {
        let first = self.references.iter().find(|reference| !reference.contacts.is_empty())?;
        let field = &self.plan.study.potentials[first.potential?];
        let strengths = || first.contacts.iter().map(|contact| 1000.0 * contact.mean_strength);
        Some(format!(
            "Contacts are picked by quantiles of crest strength, so some are always found, and weak ones may be no margin: in \
             {} their mean gradient runs from {} to {} {}/km (table contacts).",
            field.name,
            significant(strengths().fold(f64::INFINITY, f64::min), 2),
            significant(strengths().fold(0.0, f64::max), 2),
            field.kind.unit()
        ))
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
            depth_label(self.depth(worst)),
            self.references[worst.reference].name,
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
