//! One family of tests under one displacement: the largest score at each shift, and p-values adjusted by it.

use ndarray::{Array2, Zip};

use super::compare::Comparison;
use super::correlator::Correlator;
use super::independent::{independent_values_with, pairs_at_lags};
use super::measure::Measure;
use super::null::rank_p;
use super::resolution::{enough_shifts, smallest_p};
use super::shift::Reach;
use super::test::Test;
use super::verdict::Verdict;

/// Collects the scores of the tests of a family, shift by shift.
///
/// One shift moves every subject together, so the largest standardised score over the family, ranked among all shifts,
/// controls the chance of any false finding (Westfall & Young 1993). Each score is standardised by its own mean and
/// spread beforehand. Shifts that are not admissible in every test of the family are left out.
pub(super) struct Family {
    largest: Array2<f64>,
    tests: usize,
}

impl Family {
    pub(super) fn new(reach: Reach) -> Self {
        Self { largest: Array2::from_elem(reach.shape(), f64::NEG_INFINITY), tests: 0 }
    }

    /// Takes in the scores of one test, NaN where a shift is not admissible.
    pub(super) fn add(&mut self, scores: &Array2<f64>) {
        self.tests += 1;
        Zip::from(&mut self.largest).and(scores).for_each(|largest, &score| {
            // NaN once, NaN for good: that shift is not admissible in every test.
            *largest = if largest.is_nan() || score.is_nan() { f64::NAN } else { largest.max(score) };
        });
    }

    /// Adjusts each test of the family and says what may be said of it.
    pub(super) fn judge(self, mut tests: Vec<Test>, level: f64, lags: &Correlator) -> Comparison {
        let field = self.largest.mapv(|value| if value.is_finite() { value } else { f64::NAN });
        let scores: Vec<f64> = field.iter().copied().filter(|value| value.is_finite()).collect();
        let independent = independent_values_with(lags, &field, &pairs_at_lags(lags, &field.mapv(f64::is_finite)));
        let shifts = scores.len().saturating_sub(1);
        let smallest = smallest_p(shifts, independent);
        let enough = enough_shifts(smallest, independent, level);
        for test in &mut tests {
            if test.is_family() {
                test.raw_p_family = rank_p(&scores, test.score);
            }
            let Some(p) = test.p else { continue };
            if matches!(test.measure, Measure::MeanDistance) {
                test.verdict = Verdict::Described;
            } else if test.is_family() {
                let adjusted = test.raw_p_family.max(smallest).max(p);
                test.p_family = enough.is_ok().then_some(adjusted);
                test.verdict = match test.p_family {
                    Some(adjusted) if adjusted <= level => Verdict::Found,
                    _ if p <= level => Verdict::OnlyAlone,
                    _ => Verdict::NotFound,
                };
            }
        }
        Comparison {
            tests,
            family_shifts: shifts,
            family_independent_shifts: independent,
            family_smallest_p: smallest,
            family_tests: self.tests,
        }
    }
}
