//! The answer in words, made from the tests.

use super::run::{Findings, SubjectFinding};
use super::series::Series;
use super::settings::UnitRole;
use crate::coincidence::{Measure, Refusal, Test, VALID_LEVEL, Verdict};
use crate::conductor::Side;
use crate::evidence::{Answer, KeyFigure, depth_label, distance_label, grouped, significant};

/// How a p-value is printed: never as exact where it stands at the smallest that is resolved.
fn p_label(p: f64, smallest: f64) -> String {
    if p > smallest {
        return format!("p\u{a0}=\u{a0}{}", significant(p, 2));
    }
    // A bound is rounded up to two digits, never below what was resolved.
    let unit = 10f64.powf(p.log10().floor() - 1.0);
    format!("p\u{a0}<\u{a0}{}", significant((p / unit - 1e-9).ceil() * unit, 2))
}

impl Findings {
    /// How a test's family-wise p-value is printed.
    pub(super) fn p_label(&self, test: &Test, p: f64) -> String {
        p_label(p, test.family_smallest_p)
    }

    /// Depth of a test's subject, m; `None` for mapped units.
    pub(super) fn depth(&self, test: &Test) -> Option<f64> {
        match self.subjects[test.subject] {
            SubjectFinding::Bodies { slice, .. } => Some(self.slices[slice].depth),
            SubjectFinding::Units(_) => None,
        }
    }

    /// The depth in words: "1,500 m", or "the surface" for mapped units.
    fn depth_words(&self, test: &Test) -> String {
        self.depth(test).map_or_else(|| "the surface".into(), depth_label)
    }

    /// Side of a test's subject; `None` for mapped units.
    pub(super) fn side(&self, test: &Test) -> Option<Side> {
        match self.subjects[test.subject] {
            SubjectFinding::Bodies { side, .. } => Some(side),
            SubjectFinding::Units(_) => None,
        }
    }

    /// The series that a test's reference belongs to.
    pub(super) fn series_of(&self, test: &Test) -> Series {
        self.series[self.references[test.reference].series]
    }

    /// The distance at which a series' enrichment is told: the one with the highest score over all depths.
    pub(super) fn telling_distance(&self, series: Series, side: Side) -> f64 {
        let tests = self.comparison.tests.iter().filter(|test| {
            self.series_of(test) == series && self.side(test) == Some(side) && test.tested && test.score.is_finite()
        });
        let best = tests.filter(|test| test.measure.within().is_some()).max_by(|a, b| a.score.total_cmp(&b.score));
        best.and_then(|test| test.measure.within()).unwrap_or(self.plan.within[0])
    }

    /// The question, in one sentence.
    pub(super) fn question(&self) -> String {
        let study = &self.plan.study;
        let fields: Vec<String> = study.potentials.iter().map(|field| field.name.clone()).collect();
        let lines: Vec<String> = study.lines.iter().map(|lines| lines.name.clone()).collect();
        let margins = (!fields.is_empty()).then(|| format!("the margins in {}", list(&fields)));
        let mapped = (!lines.is_empty()).then(|| format!("the lines of {}", list(&lines)));
        let stay = study.units.iter().filter(|units| units.role == UnitRole::Reference);
        let units: Vec<String> = stay.map(|units| units.name.clone()).collect();
        let ground = (!units.is_empty()).then(|| format!("the ground of {}", list(&units)));
        let both: Vec<String> = margins.into_iter().chain(mapped).chain(ground).collect();
        format!(
            "Do the conductors keep to {} more closely than chance would give, at which depth and within what distance?",
            list(&both)
        )
    }

    /// The answer: what was found for conductors first, then the rest.
    pub(super) fn answer(&self) -> Answer {
        let of_conductors = |test: &&Test| self.side(test) == Some(Side::Conductor) && test.tested;
        let tests: Vec<&Test> = self.comparison.tests.iter().filter(of_conductors).collect();
        let found: Vec<&Test> = tests.iter().copied().filter(|test| test.verdict == Verdict::Found).collect();
        let enriched: Vec<&Test> = found.iter().copied().filter(|test| test.measure.within().is_some()).collect();
        let judged: Vec<&Test> = tests.iter().copied().filter(|test| test.p_family.is_some()).collect();
        // A distance finer than the files' own cells may be found, but does not carry the headline if another can.
        let order = |test: &Test| (self.resolved(test), test.score);
        let best = enriched.iter().copied().max_by(|a, b| {
            let ((a_resolved, a_score), (b_resolved, b_score)) = (order(a), order(b));
            a_resolved.cmp(&b_resolved).then(a_score.total_cmp(&b_score))
        });
        let (headline, figures) = match (best, found.is_empty(), judged.is_empty()) {
            (Some(best), ..) => (self.found_headline(best, &enriched), self.key_figures(best)),
            (None, false, _) => (self.correlation_headline(&found, &judged), self.family_figures()),
            (None, true, false) => (self.nothing_headline(&judged), self.family_figures()),
            (None, true, true) => (
                "The data cannot tell: no test of conductors against contacts has enough room to reach the level."
                    .into(),
                self.family_figures(),
            ),
        };
        Answer { headline, figures, detail: self.detail(&found), limits: self.limits() }
    }

    fn found_headline(&self, best: &Test, enriched: &[&Test]) -> String {
        let depths = self.depths(enriched.iter().copied().filter(|test| self.series_of(test) == self.series_of(best)));
        let within = best.measure.within().unwrap_or(f64::NAN);
        let near = match self.series_of(best) {
            Series::Units(_) if within == 0.0 => "inside them".to_string(),
            Series::Units(_) => format!("within {} of them", distance_label(within)),
            Series::Lines(_) => format!("within {} of a line", distance_label(within)),
            _ => format!("within {} of a contact line", distance_label(within)),
        };
        format!(
            "Yes, at {}: conductors keep to {} more closely than chance. At {}, {} of their area lies {near} \
             against {} of the ground; that is {} times what displacement gives ({} with all {} tests counted).",
            list(&depths),
            self.plan.series_label(self.series_of(best)),
            self.depth_words(best),
            percent(best.subject_share),
            percent(best.ground_share),
            significant(best.effect, 3),
            self.p_label(best, best.p_family.unwrap_or(1.0)),
            self.comparison.family_tests
        )
    }

    fn correlation_headline(&self, found: &[&Test], judged: &[&Test]) -> String {
        let best = found.iter().copied().max_by(|a, b| a.score.total_cmp(&b.score));
        match best {
            None => String::new(),
            Some(best) => format!(
                "In part, at {}: log10 conductivity rises with the gradient strength of {} (coefficient {}, {} with all {} \
                 tests counted), but {}.",
                list(&self.depths(found.iter().copied())),
                self.field_name(best),
                significant(best.observed, 2),
                self.p_label(best, best.p_family.unwrap_or(1.0)),
                self.comparison.family_tests,
                if judged
                    .iter()
                    .any(|test| { test.measure.within().is_some() && self.series_of(test) == self.series_of(best) })
                {
                    "the conductors as bodies are not shown to lie closer to its contacts than chance"
                } else {
                    "whether the conductors as bodies lie closer to its contacts than chance, the data cannot tell"
                }
            ),
        }
    }

    fn nothing_headline(&self, judged: &[&Test]) -> String {
        let family = |test: &Test| test.p_family.unwrap_or(1.0);
        let closest = judged.iter().min_by(|a, b| family(a).total_cmp(&family(b)));
        let least = closest.map_or_else(|| "p = 1".into(), |test| self.p_label(test, family(test)));
        let bodies: Vec<&Test> = judged.iter().copied().filter(|test| test.measure.within().is_some()).collect();
        let said = match self.depths(bodies.iter().copied()).as_slice() {
            [] => {
                return format!(
                    "The data cannot tell whether conductors keep to the margins; their conductivity is not shown to rise with \
                     the gradient either ({least} for the closest of {} tests).",
                    self.comparison.family_tests
                );
            }
            [only] => {
                format!("Not shown: at {only}, conductors keep to the margins no more closely than chance may give")
            }
            many => format!(
                "Not shown: at none of the {} depths that could be tested do conductors keep to the margins more closely than \
                 chance may give",
                many.len()
            ),
        };
        format!("{said} ({least} for the closest of {} tests).", self.comparison.family_tests)
    }

    fn key_figures(&self, best: &Test) -> Vec<KeyFigure> {
        let within = match best.measure.within() {
            Some(within) if within > 0.0 => format!("within {}", distance_label(within)),
            _ => "inside".into(),
        };
        let mut figures = vec![
            KeyFigure {
                label: "Enrichment".into(),
                value: format!("{} \u{d7}", significant(best.effect, 3)),
                note: format!(
                    "observed {} against {} to {} under displacement, {within} at {}",
                    significant(best.observed, 3),
                    significant(best.low, 3),
                    significant(best.high, 3),
                    self.depth_words(best)
                ),
            },
            KeyFigure {
                label: "Family-wise p".into(),
                value: self.p_label(best, best.p_family.unwrap_or(1.0)),
                note: format!("{} tests, one family", self.comparison.family_tests),
            },
        ];
        figures.push(KeyFigure {
            label: "Independent shifts".into(),
            value: format!("{:.0}", best.independent_shifts),
            note: format!("effectively, among {} admissible ones of this test", grouped(best.shifts as f64)),
        });
        figures
    }

    fn family_figures(&self) -> Vec<KeyFigure> {
        vec![KeyFigure {
            label: "Independent shifts".into(),
            value: format!("{:.0}", self.comparison.family_independent_shifts),
            note: format!(
                "effectively, among {} admissible ones of the family",
                grouped(self.comparison.family_shifts as f64)
            ),
        }]
    }

    fn detail(&self, found: &[&Test]) -> Vec<String> {
        let mut detail = Vec::new();
        for series in self.series.iter().copied() {
            let label = self.plan.series_label(series);
            let here = |test: &&Test| self.series_of(test) == series;
            let near = |test: &&Test| here(test) && test.measure.within().is_some();
            let with_strength = |test: &&Test| here(test) && test.measure == Measure::Correlation;
            let depths = self.depths(found.iter().copied().filter(near));
            let correlated = self.depths(found.iter().copied().filter(with_strength));
            let told = |bodies: bool| {
                self.told(|test| {
                    self.series_of(test) == series
                        && self.side(test) == Some(Side::Conductor)
                        && test.measure.within().is_some() == bodies
                })
            };
            detail.push(match (depths.is_empty(), correlated.is_empty()) {
                (true, true) => match (told(true), told(false)) {
                    (true, _) => format!("{}: nothing shown beyond chance.", capital(&label)),
                    (false, true) => format!(
                        "{}: whether conductors lie closer, the data cannot tell; conductivity is not shown to rise with \
                         gradient strength.",
                        capital(&label)
                    ),
                    (false, false) => format!("{}: the data cannot tell.", capital(&label)),
                },
                (false, true) => {
                    format!("{}: conductors lie closer than chance at {}.", capital(&label), list(&depths))
                }
                (true, false) => format!(
                    "{}: conductivity rises with gradient strength at {}; the bodies themselves are not shown to lie closer.",
                    capital(&label),
                    list(&correlated)
                ),
                (false, false) => format!(
                    "{}: conductors lie closer than chance at {}; conductivity rises with gradient strength at {}.",
                    capital(&label),
                    list(&depths),
                    list(&correlated)
                ),
            });
        }
        let resistors = self.comparison.tests.iter().filter(|test| self.side(test) == Some(Side::Resistor));
        let of_resistors: Vec<&Test> = resistors.filter(|test| test.tested).collect();
        if !of_resistors.is_empty() {
            let kept = of_resistors.into_iter().filter(|test| test.verdict == Verdict::Found);
            let depths = self.depths(kept);
            detail.push(if !self.told(|test| self.side(test) == Some(Side::Resistor)) {
                "Resistors: the data cannot tell.".into()
            } else if depths.is_empty() {
                "Resistors are not shown to lie closer to any of the margins than chance.".into()
            } else {
                format!("Resistors lie closer to margins than chance at {}.", list(&depths))
            });
        }
        detail.extend((0..self.units.len()).filter_map(|index| self.moved_units_said(index)));
        detail
    }

    /// What was found of mapped units that are moved; `None` for those that stay.
    fn moved_units_said(&self, index: usize) -> Option<String> {
        let own = |test: &&Test| self.subjects[test.subject] == SubjectFinding::Units(index) && test.tested;
        let tests: Vec<&Test> = self.comparison.tests.iter().filter(own).collect();
        let name = capital(&self.plan.study.units[index].name);
        if self.plan.study.units[index].role == UnitRole::Reference {
            return None;
        }
        if !tests.iter().any(|test| test.p_family.is_some()) {
            return Some(format!("{name}, the mapped units that were moved: the data cannot tell."));
        }
        let mut near: Vec<String> = Vec::new();
        for test in tests.into_iter().filter(|test| test.verdict == Verdict::Found) {
            let label = self.plan.series_label(self.series_of(test));
            if !near.contains(&label) {
                near.push(label);
            }
        }
        Some(if near.is_empty() {
            format!("{name}, the mapped units that were moved, are not shown to lie closer to anything than chance.")
        } else {
            format!("{name}, the mapped units that were moved, lie closer than chance to {}.", list(&near))
        })
    }

    /// Name of the potential field behind a test.
    fn field_name(&self, test: &Test) -> String {
        let series = self.series_of(test);
        match series.potential() {
            Some(index) => self.plan.study.potentials[index].name.clone(),
            None => self.plan.series_label(series),
        }
    }

    /// True if any of some tests has a family-wise p-value.
    pub(super) fn told(&self, holds: impl Fn(&Test) -> bool) -> bool {
        self.comparison.tests.iter().any(|test| test.p_family.is_some() && holds(test))
    }

    /// What limits the answer, from the guards of the tests.
    pub(super) fn limits(&self) -> Vec<String> {
        let mut limits = Vec::new();
        let tests = || self.comparison.tests.iter().filter(|test| test.tested);
        let short: Vec<&Test> =
            tests().filter(|test| matches!(test.verdict, Verdict::CannotTell(Refusal::TooFewShifts { .. }))).collect();
        if !short.is_empty() {
            limits.push(format!(
                "{} of {} tests cannot tell, because the footprint holds too few displacements to reach the level; they are \
                 left empty, not counted as negative.",
                short.len(),
                tests().count()
            ));
        }
        let other = tests().filter(|test| {
            matches!(&test.verdict, Verdict::CannotTell(refusal) if !matches!(refusal, Refusal::TooFewShifts { .. }))
        });
        let other = other.count();
        if other > 0 {
            limits.push(format!(
                "{other} tests cannot tell for other reasons; each row of the table coincidence says which."
            ));
        }
        let bare: Vec<String> = self
            .slices
            .iter()
            .filter(|slice| slice.conductors.bodies.is_empty())
            .map(|slice| depth_label(slice.depth))
            .collect();
        if !bare.is_empty() {
            limits.push(format!("No conductor beyond the threshold at {}.", list(&bare)));
        }
        let trends: Vec<String> = self.depths(tests().filter(|test| test.shared_trend));
        if !trends.is_empty() {
            limits.push(format!(
                "At {} conductivity and gradient strength both follow a slope in one direction across the survey; a plane was \
                 taken out of both before the correlation.",
                list(&trends)
            ));
        }
        let mut bare: Vec<String> = Vec::new();
        for reference in self.references.iter().filter(|reference| reference.lines.is_empty()) {
            let label = self.plan.series_label(self.series[reference.series]);
            // Units that cover the whole frame have no outline in it, and a test of them says so itself.
            if reference.height.is_some() || reference.slice.is_some() {
                bare.push(match reference.slice {
                    Some(slice) => format!("{label} at {}", depth_label(self.slices[slice].depth)),
                    None => label,
                });
            }
        }
        if !bare.is_empty() {
            limits.push(format!(
                "No line was found for {}: no crest is long enough and stands above the noise.",
                list(&bare)
            ));
        }
        let scarce = tests().filter(|t| t.p_family.is_some() && t.independent_shifts < 1.0 / VALID_LEVEL - 1.0).count();
        if scarce > 0 {
            limits.push(format!(
                "{scarce} of {} tests rest on fewer than {:.0} independent shifts: the footprint is only a few pattern \
                 widths across, and their p-values are not told below {VALID_LEVEL}.",
                self.comparison.family_tests,
                1.0 / VALID_LEVEL - 1.0
            ));
        }
        limits.push(format!(
            "No family-wise p below {} can be told on this footprint, and for most single tests the bound is higher \
             (column smallest_p); a p at its bound stands as \u{201c}p\u{a0}<\u{201d}.",
            significant(self.comparison.family_smallest_p, 2)
        ));
        if self.comparison.family_parts > 1 {
            limits.push(format!(
                "Footprints differ, so the family fell into {0} parts and each p-value was multiplied by {0}.",
                self.comparison.family_parts
            ));
        }
        limits.extend(self.limits_of_layers());
        limits.push("No control was taken out: cover, topography or station spacing may shape both maps.".into());
        let outside = self.deposits.iter().filter(|deposit| deposit.cell.is_none()).count();
        if outside > 0 {
            limits.push(format!("{outside} of {} deposits lie outside the frame.", self.deposits.len()));
        }
        limits
    }

    /// The depths of some tests, each once, from the shallowest down.
    fn depths<'a>(&self, tests: impl Iterator<Item = &'a Test>) -> Vec<String> {
        let mut depths: Vec<f64> = tests.filter_map(|test| self.depth(test)).collect();
        depths.sort_by(f64::total_cmp);
        depths.dedup();
        depths.into_iter().map(depth_label).collect()
    }
}

/// "a", "a and b", "a, b and c".
pub(super) fn list(items: &[String]) -> String {
    match items {
        [] => String::new(),
        [only] => only.clone(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

fn percent(share: f64) -> String {
    format!("{:.0}\u{a0}%", 100.0 * share)
}

/// The text with a capital letter in front.
pub(super) fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or(String::new(), |first| first.to_uppercase().chain(letters).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn small_p_values_are_never_printed_as_exact() {
        assert_eq!(p_label(0.005, 0.005), "p\u{a0}<\u{a0}0.005");
        assert_eq!(p_label(0.015_23, 0.015_23), "p\u{a0}<\u{a0}0.016");
        assert_eq!(p_label(0.05, 0.05), "p\u{a0}<\u{a0}0.05");
        assert_eq!(p_label(0.02, 0.02), "p\u{a0}<\u{a0}0.02");
        assert_eq!(p_label(0.031, 0.005), "p\u{a0}=\u{a0}0.031");
    }

    #[test]
    fn lists_read_as_english() {
        let items = |n: usize| ["a", "b", "c"][..n].iter().map(|s| (*s).to_string()).collect::<Vec<_>>();
        assert_eq!([0, 1, 2, 3].map(|n| list(&items(n))), ["", "a", "a and b", "a, b and c"]);
        assert_eq!(capital("gravity contacts"), "Gravity contacts");
    }
}
