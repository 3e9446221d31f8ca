//! One family of tests under one displacement: the largest score at each shift, and p-values adjusted by it.

use ndarray::{Array2, Zip};

use super::compare::Comparison;
use super::correlator::Correlator;
use super::independent::{independent_values_with, pairs_at_lags};
use super::measure::Measure;
use super::null::rank_p;
use super::resolution::{enough_shifts, smallest_p};
use super::test::Test;
use super::verdict::{Refusal, Verdict};

/// Tests share a part of the family if the shifts that they have in common make up this share of all that either has.
const ALIKE: f64 = 0.9;

/// Collects the scores of the tests of a family, shift by shift.
///
/// One shift moves every subject together, so the largest standardised score over the family, ranked among all shifts,
/// controls the chance of any false finding (Westfall & Young 1993). Each score is standardised by its own mean and spread
/// beforehand. Only shifts that are admissible in every test can be ranked; a test on a footprint of its own would take most
/// shifts from all others, so it opens a part of the family for itself, and the parts are held together by Bonferroni's
/// factor, their number.
#[derive(Default)]
pub(super) struct Family {
    parts: Vec<Part>,
}

/// Tests with about the same admissible shifts.
struct Part {
    /// The largest score at each shift, NaN where a shift is not admissible in every test.
    largest: Array2<f64>,
    tests: usize,
}

impl Part {
    /// Share of the shifts of either that both have.
    fn alike(&self, scores: &Array2<f64>) -> f64 {
        let (mut both, mut either) = (0usize, 0usize);
        Zip::from(&self.largest).and(scores).for_each(|largest, score| {
            let (here, there) = (largest.is_finite(), score.is_finite());
            both += usize::from(here && there);
            either += usize::from(here || there);
        });
        both as f64 / either.max(1) as f64
    }

    fn add(&mut self, scores: &Array2<f64>) {
        self.tests += 1;
        Zip::from(&mut self.largest).and(scores).for_each(|largest, &score| {
            *largest = if largest.is_nan() || score.is_nan() { f64::NAN } else { largest.max(score) };
        });
    }
}

/// What a part resolves.
struct Resolved {
    scores: Vec<f64>,
    independent: f64,
    smallest: f64,
    enough: Result<(), Refusal>,
}

impl Family {
    /// Takes in the scores of one test, NaN where a shift is not admissible, and says which part of the family it joins.
    pub(super) fn add(&mut self, scores: &Array2<f64>) -> usize {
        match self.parts.iter().position(|part| part.alike(scores) >= ALIKE) {
            Some(number) => {
                self.parts[number].add(scores);
                number
            }
            None => {
                self.parts.push(Part { largest: scores.clone(), tests: 1 });
                self.parts.len() - 1
            }
        }
    }

    /// Adjusts each test of the family and says what may be said of it; `parts` holds the part of each test that has one.
    pub(super) fn judge(
        self,
        mut tests: Vec<Test>,
        parts: &[Option<usize>],
        level: f64,
        lags: &Correlator,
    ) -> Comparison {
        let factor = self.parts.len() as f64;
        let resolved: Vec<Resolved> = self.parts.iter().map(|part| part.resolve(factor, level, lags)).collect();
        for (test, part) in tests.iter_mut().zip(parts) {
            let Some(p) = test.p else { continue };
            if matches!(test.measure, Measure::MeanDistance) {
                test.verdict = Verdict::Described;
            }
            let Some(part) = part.map(|part| &resolved[part]) else { continue };
            test.raw_p_family = (factor * rank_p(&part.scores, test.score)).min(1.0);
            test.family_smallest_p = part.smallest.max(test.smallest_p);
            test.verdict = match &part.enough {
                Err(refusal) => Verdict::CannotTell(refusal.clone()),
                Ok(()) => {
                    let adjusted = test.raw_p_family.max(test.family_smallest_p).max(p);
                    test.p_family = Some(adjusted);
                    match adjusted {
                        adjusted if adjusted <= level => Verdict::Found,
                        _ if p <= level => Verdict::OnlyAlone,
                        _ => Verdict::NotFound,
                    }
                }
            };
        }
        let largest = (0..self.parts.len()).max_by_key(|number| (self.parts[*number].tests, usize::MAX - number));
        let told = largest.map(|number| &resolved[number]);
        Comparison {
            tests,
            family_shifts: told.map_or(0, |part| part.scores.len().saturating_sub(1)),
            family_independent_shifts: told.map_or(0.0, |part| part.independent),
            family_smallest_p: told.map_or(1.0, |part| part.smallest),
            family_tests: self.parts.iter().map(|part| part.tests).sum(),
            family_parts: self.parts.len(),
        }
    }
}

impl Part {
    fn resolve(&self, factor: f64, level: f64, lags: &Correlator) -> Resolved {
        let pairs = pairs_at_lags(lags, &self.largest.mapv(f64::is_finite));
        let independent = independent_values_with(lags, &self.largest, &pairs);
        let scores: Vec<f64> = self.largest.iter().copied().filter(|value| value.is_finite()).collect();
        let shifts = scores.len().saturating_sub(1);
        // Ranks are multiplied by the number of parts, so each part needs that many times the shifts. The bound for few
        // independent shifts is not multiplied: it says how small a p can be told, whatever it was adjusted for.
        let ranks = (shifts as f64 / factor) as usize;
        let enough = enough_shifts(ranks, independent, level);
        Resolved { smallest: smallest_p(ranks, independent), scores, independent, enough }
    }
}
