//! The tables of tests: one row for each, and the distance profile.

use super::columns::{count, finite, number, text};
use super::run::{Findings, SubjectFinding};
use super::tables::side_name;
use crate::coincidence::{Measure, Test};
use crate::evidence::{Column, Table};

/// Name of the null in tables.
const NULL_NAME: &str = "shifts without wrapping";

impl Findings {
    /// What a test's subject is called: for the correlation it is the conductivity itself.
    fn subject_name(&self, test: &Test) -> String {
        match (test.measure, self.subjects[test.subject]) {
            (Measure::Correlation, _) => "log10 conductivity".into(),
            (_, SubjectFinding::Bodies { side, .. }) => side_name(side).into(),
            (_, SubjectFinding::Units(index)) => self.plan.study.units[index].name.clone(),
        }
    }

    fn reference_name(&self, test: &Test) -> String {
        let series = self.series_of(test);
        match (test.measure, series.potential()) {
            (Measure::Correlation, Some(index)) => format!("{} gradient", self.plan.study.potentials[index].name),
            (_, Some(index)) => format!("{} contacts", self.plan.study.potentials[index].name),
            (_, None) => self.plan.series_label(series),
        }
    }

    /// Resolving length of a test's subject, m; `None` for mapped units.
    fn subject_length(&self, test: &Test) -> Option<f64> {
        match self.subjects[test.subject] {
            SubjectFinding::Bodies { slice, .. } => finite(self.slices[slice].resolving_length),
            SubjectFinding::Units(_) => None,
        }
    }

    /// Which subject at which depth is told of, against which reference: the first columns of every table of tests.
    fn place_columns(&self, rows: &[&Test]) -> Vec<Column> {
        vec![
            number("depth_m", "m", "Depth of the slice, positive down; empty for mapped units", rows, |t| {
                self.depth(t)
            }),
            text("subject", "The pattern that is moved under the null", rows, |t| self.subject_name(t)),
            text("reference", "The pattern that stays in place", rows, |t| self.reference_name(t)),
            number(
                "height_m",
                "m",
                "Height of upward continuation before contacts are picked; empty for what is mapped",
                rows,
                |t| self.references[t.reference].height,
            ),
        ]
    }

    pub(super) fn coincidence_table(&self) -> Table {
        let rows: Vec<&Test> = self.comparison.tests.iter().filter(|test| test.tested).collect();
        let rows = rows.as_slice();
        Table {
            name: "coincidence".into(),
            caption: "One row for each test of a subject against a reference.".into(),
            columns: [self.place_columns(rows), vec![
                text(
                    "measure",
                    "enrichment: share of the subject within the distance over the share of all cells within it; \
                     mean_distance: mean capped distance of the subject to the nearest line, m; \
                     correlation: Pearson's coefficient, a plane taken out of both",
                    rows,
                    |t| t.measure.name().into(),
                ),
                number("within_m", "m", "The distance of the enrichment; 0 means inside mapped units", rows, |t| {
                    t.measure.within()
                }),
                number("observed", "own scale", "The measure as observed: ratio, metres or coefficient", rows, |t| {
                    finite(t.observed)
                }),
                number("expected", "own scale", "Its mean over all admissible shifts", rows, |t| finite(t.expected)),
                number(
                    "effect",
                    "own scale",
                    "Observed over expected for enrichment, observed less expected otherwise",
                    rows,
                    |t| finite(t.effect),
                ),
                number("null_low", "own scale", "2.5 % point of the measure over the shifts", rows, |t| finite(t.low)),
                number("null_high", "own scale", "97.5 % point of the measure over the shifts", rows, |t| {
                    finite(t.high)
                }),
                number(
                    "p",
                    "",
                    "One-sided p-value of this test alone, not below smallest_p; empty where the data cannot tell",
                    rows,
                    |t| t.p,
                ),
                number(
                    "p_family",
                    "",
                    "p-value with the whole family counted; empty where the data cannot tell or the measure is outside it",
                    rows,
                    |t| t.p_family,
                ),
                text(
                    "p_at_bound",
                    "Whether p_family stands at the smallest value told, so that the true one may be smaller",
                    rows,
                    |t| match t.p_family {
                        Some(p) if p <= t.family_smallest_p => "yes".into(),
                        Some(_) => "no".into(),
                        None => String::new(),
                    },
                ),
                text("verdict", "What may be said", rows, |t| t.verdict.to_string()),
                number(
                    "independent_shifts",
                    "",
                    "Effectively independent shifts among the admissible ones",
                    rows,
                    |t| (t.shifts > 0).then_some(t.independent_shifts),
                ),
                number("smallest_p", "", "Smallest p-value that this footprint resolves", rows, |t| {
                    (t.shifts > 0).then_some(t.smallest_p)
                }),
                count("shifts", "", "Admissible shifts where the measure is defined", rows, |t| t.shifts),
                number("subject_share", "", "Share of the subject's cells within the distance", rows, |t| {
                    finite(t.subject_share)
                }),
                number("ground_share", "", "Share of all cells within the distance", rows, |t| finite(t.ground_share)),
                count(
                    "subject_cells",
                    "cells",
                    "Cells of the subject where the reference has data; for the correlation, all cells",
                    rows,
                    |t| t.subject_cells,
                ),
                count("footprint_cells", "cells", "Cells where both have data", rows, |t| t.footprint_cells),
                number(
                    "subject_resolves_m",
                    "m",
                    "Resolving length of the slice as compared: half the wavelength beyond which nine tenths of its gradient's power lie",
                    rows,
                    |t| self.subject_length(t),
                ),
                number(
                    "reference_resolves_m",
                    "m",
                    "Resolving length of the potential field at height_m; empty for what is mapped",
                    rows,
                    |t| self.references[t.reference].resolving_length,
                ),
                text("null", "How the subject was displaced", rows, |_| NULL_NAME.into()),
                text("control", "Layers taken out beforehand", rows, |_| "none".into()),
            ]].concat(),
        }
    }

    pub(super) fn profile_table(&self) -> Table {
        let mut rows: Vec<&Test> =
            self.comparison.tests.iter().filter(|test| test.measure.within().is_some()).collect();
        let within = |test: &Test| test.measure.within().unwrap_or(0.0);
        rows.sort_by(|a, b| {
            (a.subject, a.reference).cmp(&(b.subject, b.reference)).then(within(a).total_cmp(&within(b)))
        });
        let rows = rows.as_slice();
        Table {
            name: "distance_profile".into(),
            caption:
                "Enrichment against distance, with the pointwise null band; only the rows marked as tested belong to \
                      the family."
                    .into(),
            columns: [
                self.place_columns(rows),
                vec![
                    number("within_m", "m", "The distance; 0 means inside mapped units", rows, |t| t.measure.within()),
                    text("tested", "Whether this distance belongs to the family of tests", rows, |t| {
                        if t.tested { "yes" } else { "no" }.into()
                    }),
                    number("subject_share", "", "Share of the subject's cells within the distance", rows, |t| {
                        finite(t.subject_share)
                    }),
                    number("ground_share", "", "Share of all cells within the distance", rows, |t| {
                        finite(t.ground_share)
                    }),
                    number("enrichment", "", "The first share over the second", rows, |t| finite(t.observed)),
                    number("null_mean", "", "Mean enrichment over all admissible shifts", rows, |t| finite(t.expected)),
                    number("null_low", "", "2.5 % point of the enrichment over the shifts", rows, |t| finite(t.low)),
                    number("null_high", "", "97.5 % point of the enrichment over the shifts", rows, |t| finite(t.high)),
                    number("p_family", "", "p-value with the whole family counted, for tested distances", rows, |t| {
                        t.p_family
                    }),
                ],
            ]
            .concat(),
        }
    }
}
