//! The figures of a run, made from the findings.

use geo::LineString;

use super::run::Findings;
use super::series::Series;
use super::settings::UnitRole;
use super::slices::SliceFinding;
use crate::coincidence::{Measure, Test, Verdict};
use crate::conductor::{Side, outlines};
use crate::error::Result;
use crate::evidence::{
    Background, Colours, ContactLine, Deposit, DepthCurve, DepthRow, DistanceProfile, Figure, MapFigure, ProfilePanel,
    ProfilePoint, Reading, depth_label, distance_label,
};

impl Findings {
    /// One map for each depth, over the gradient of the first potential field at its first height.
    pub(super) fn maps(&self) -> Result<Vec<Figure>> {
        let frame = &self.plan.frame;
        let reference = self.references.iter().find(|reference| reference.strength.is_some());
        // Per kilometre, because a gradient in units per metre is a row of zeros.
        let strength = reference.and_then(|reference| reference.strength.as_ref());
        let gradient = strength.map(|strength| strength.map(|value| 1000.0 * value));
        let unit = reference
            .and_then(|reference| self.series[reference.series].potential())
            .map_or("", |index| self.plan.study.potentials[index].kind.unit());
        let lines: Vec<ContactLine> = match reference {
            Some(reference) => {
                // A contact runs with its dense side on the right.
                let dense = Some(crate::evidence::Side::Right);
                reference.contacts.iter().map(|c| ContactLine { line: c.line.clone(), dense_side: dense }).collect()
            }
            None => Vec::new(),
        };
        let from_maps = self.references.iter().filter(|reference| !self.series[reference.series].is_field());
        let moved =
            self.units.iter().zip(&self.plan.study.units).filter(|(_, choice)| choice.role == UnitRole::Subject);
        let mapped: Vec<LineString<f64>> = from_maps
            .flat_map(|reference| reference.lines.clone())
            .chain(moved.flat_map(|(units, _)| units.outlines.clone()))
            .collect();
        let deposits: Vec<Deposit> = self
            .deposits
            .iter()
            .filter(|deposit| deposit.cell.is_some())
            .map(|deposit| Deposit { name: deposit.name.clone(), x: deposit.x, y: deposit.y })
            .collect();
        let draw = |slice: &SliceFinding| {
            let shapes = outlines(&slice.conductors, frame);
            let footprint = slice.placed.grid.footprint();
            // Where no field has a gradient, as with mapped lines alone, the slice itself lies underneath.
            let (background, underneath) = match gradient.as_ref().zip(reference) {
                Some((grid, reference)) => {
                    let label = format!("Gradient of {}, {unit}/km", self.field_of(reference));
                    (Background { grid, colours: Colours::Quiet, label }, "the gradient strength")
                }
                None => {
                    let (grid, label) = (&slice.placed.grid, "Resistivity, log10 \u{3a9} m".into());
                    (Background { grid, colours: Colours::WarmLow, label }, "the resistivity")
                }
            };
            MapFigure {
                name: format!("map_{}", slice.depth),
                title: format!("Conductors at {}", depth_label(slice.depth)),
                description: format!(
                    "Map of {} conductors at {} over {underneath}, with {} contact lines, {} mapped lines and {} deposits.",
                    shapes.len(),
                    depth_label(slice.depth),
                    lines.len(),
                    mapped.len(),
                    deposits.len()
                ),
                frame,
                background: Some(background),
                footprint: Some(&footprint),
                conductors: &shapes,
                contacts: &lines,
                mapped: &mapped,
                deposits: &deposits,
            }
            .draw()
        };
        self.slices.iter().map(draw).collect()
    }

    /// Curves over depth and distance, each with its caption: conductors against each reference, then the correlations,
    /// then resistors.
    pub(super) fn curves(&self) -> Vec<(Figure, String)> {
        let mut curves = Vec::new();
        let all = || self.series.iter().copied();
        all().for_each(|series| curves.extend(self.body_curves(series, Side::Conductor)));
        curves.extend(all().filter_map(|series| self.correlation_curve(series)));
        all().for_each(|series| curves.extend(self.body_curves(series, Side::Resistor)));
        curves
    }

    /// Name of the potential field behind a reference.
    fn field_of(&self, reference: &super::references::ReferenceFinding) -> String {
        let potential = self.series[reference.series].potential();
        potential.map_or_else(String::new, |index| self.plan.study.potentials[index].name.clone())
    }

    /// Enrichment against depth, and against distance at each depth.
    fn body_curves(&self, series: Series, side: Side) -> Vec<(Figure, String)> {
        let here = |test: &&Test| self.series_of(test) == series && self.side(test) == Some(side);
        let tests: Vec<&Test> = self.comparison.tests.iter().filter(here).collect();
        if tests.is_empty() {
            return Vec::new();
        }
        let label = self.plan.series_label(series);
        let stem = self.plan.series_stem(series);
        let bodies = match side {
            Side::Conductor => "Conductors",
            Side::Resistor => "Resistors",
        };
        let within = self.telling_distance(series, side);
        let near_it = self.plan.near_label(series, within);
        let near = |test: &&&Test| test.measure.within() == Some(within) && test.tested;
        let caption = format!(
            "{bodies} {near_it}: share of their area over the share of the ground (dots), against the middle \
             95 % of what displacement gives (bars). A filled dot is closer than chance with the whole family counted. Of \
             the tested distances, the one with the highest score is shown."
        );
        let curve = DepthCurve {
            name: format!("enrichment_{}_{stem}", bodies.to_lowercase()),
            title: format!("{bodies} near {label}"),
            description: caption.clone(),
            measure: match within {
                0.0 => "Enrichment inside (ratio)".into(),
                within => format!("Enrichment within {} (ratio)", distance_label(within)),
            },
            neutral: Some(1.0),
            alpha: self.plan.study.test.level,
            rows: tests.iter().filter(near).filter_map(|test| self.depth_row(test)).collect(),
        };
        let distances = format!(
            "{bodies} within a growing distance of {label}, at each depth; the band is pointwise. Only the tested distances \
             carry a p-value."
        );
        let profile = DistanceProfile {
            name: format!("profile_{}_{stem}", bodies.to_lowercase()),
            title: format!("{bodies}: how near to {label}"),
            description: distances.clone(),
            measure: "Enrichment (ratio)".into(),
            neutral: Some(1.0),
            alpha: self.plan.study.test.level,
            panels: self.panels(&tests),
        };
        vec![(curve.draw(), caption), (profile.draw(), distances)]
    }

    /// Correlation with the gradient against depth; `None` for mapped lines, which have no gradient.
    fn correlation_curve(&self, series: Series) -> Option<(Figure, String)> {
        let here = |test: &&Test| self.series_of(test) == series && test.measure == Measure::Correlation;
        let tests: Vec<&Test> = self.comparison.tests.iter().filter(here).collect();
        if tests.is_empty() {
            return None;
        }
        let caption = format!(
            "Correlation of log10 conductivity with the gradient strength of {}, a plane taken out of both, against the \
             middle 95 % of what displacement gives.",
            series.potential().map_or("", |index| &self.plan.study.potentials[index].name)
        );
        let figure = DepthCurve {
            name: format!("correlation_{}", self.plan.series_stem(series)),
            title: format!("Conductivity and the gradient behind {}", self.plan.series_label(series)),
            description: caption.clone(),
            measure: "Correlation (coefficient)".into(),
            neutral: Some(0.0),
            alpha: self.plan.study.test.level,
            rows: tests.into_iter().filter_map(|test| self.depth_row(test)).collect(),
        };
        Some((figure.draw(), caption))
    }

    fn depth_row(&self, test: &Test) -> Option<DepthRow> {
        let finite = |value: f64| value.is_finite().then_some(value);
        Some(DepthRow {
            depth_m: self.depth(test)?,
            reading: Reading {
                observed: finite(test.observed),
                null_low: finite(test.low),
                null_mean: finite(test.expected),
                null_high: finite(test.high),
                p_family: test.p_family,
            },
            label: match (test.p_family, &test.verdict) {
                (Some(p), _) => self.p_label(test, p),
                (None, Verdict::CannotTell(_)) => "cannot tell".into(),
                (None, _) => String::new(),
            },
        })
    }

    /// One panel of the profile for each depth, distances ascending.
    fn panels(&self, tests: &[&Test]) -> Vec<ProfilePanel> {
        let mut panels: Vec<ProfilePanel> = Vec::new();
        for test in tests {
            let Some(within) = test.measure.within() else { continue };
            let Some(row) = self.depth_row(test) else { continue };
            let point = ProfilePoint { within_m: within, reading: row.reading };
            match panels.iter_mut().find(|panel| panel.depth_m == row.depth_m) {
                Some(panel) => panel.points.push(point),
                None => panels.push(ProfilePanel { depth_m: row.depth_m, points: vec![point] }),
            }
        }
        for panel in &mut panels {
            panel.points.sort_by(|a, b| a.within_m.total_cmp(&b.within_m));
        }
        panels
    }
}
