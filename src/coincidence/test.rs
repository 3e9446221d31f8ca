//! One test: what was measured, and what may be said of it.

use super::measure::Measure;
use super::verdict::Verdict;

/// Where a test stands among all.
#[derive(Clone, Copy)]
pub(super) struct Place {
    pub subject: usize,
    pub reference: usize,
}

/// The result of one measure for one subject and one reference.
#[derive(Debug, Clone)]
pub struct Test {
    /// Index of the subject.
    pub subject: usize,
    /// Index of the reference.
    pub reference: usize,
    /// The measure.
    pub measure: Measure,
    /// False for the distances of the profile, which are described and not tested.
    pub tested: bool,
    /// The measure at no shift: a ratio, a mean distance, a coefficient. NaN where it is not defined.
    pub observed: f64,
    /// Its mean under the null.
    pub expected: f64,
    /// Observed over expected for enrichment, observed less expected otherwise.
    pub effect: f64,
    /// The 2.5 % point of the measure under the null.
    pub low: f64,
    /// The 97.5 % point of the measure under the null.
    pub high: f64,
    /// The standardised score at no shift; larger is closer.
    pub score: f64,
    /// The rank p-value before the guards, for calibration; a report prints [`Test::p`].
    pub raw_p: f64,
    /// The p-value, not below [`Test::smallest_p`]; `None` where the data cannot tell or nothing is tested.
    pub p: Option<f64>,
    /// The p-value with the whole family counted, not below the smallest that the family resolves.
    pub p_family: Option<f64>,
    /// The rank p-value with the whole family counted, before the guards, for calibration; NaN outside the family.
    pub raw_p_family: f64,
    /// The smallest family-wise p-value that can be told of this test.
    pub family_smallest_p: f64,
    /// Admissible shifts where the measure is defined, without the shift of zero.
    pub shifts: usize,
    /// How many of them are effectively independent.
    pub independent_shifts: f64,
    /// The smallest p-value that this footprint resolves.
    pub smallest_p: f64,
    /// Subject cells in the overlap; for the correlation, all cells.
    pub subject_cells: usize,
    /// Cells in the overlap of both footprints.
    pub footprint_cells: usize,
    /// Share of the subject's cells within the distance; NaN for other measures than enrichment.
    pub subject_share: f64,
    /// Share of all cells within the distance; NaN for other measures than enrichment.
    pub ground_share: f64,
    /// For the correlation: true if both strengths followed a plane in one direction, which was taken out.
    pub shared_trend: bool,
    /// What may be said.
    pub verdict: Verdict,
}

impl Test {
    /// A test of which nothing is known yet.
    pub(super) fn blank(place: Place, measure: Measure, tested: bool) -> Self {
        Self {
            subject: place.subject,
            reference: place.reference,
            measure,
            tested,
            observed: f64::NAN,
            expected: f64::NAN,
            effect: f64::NAN,
            low: f64::NAN,
            high: f64::NAN,
            score: f64::NAN,
            raw_p: f64::NAN,
            raw_p_family: f64::NAN,
            family_smallest_p: 1.0,
            p: None,
            p_family: None,
            shifts: 0,
            independent_shifts: 0.0,
            smallest_p: 1.0,
            subject_cells: 0,
            footprint_cells: 0,
            subject_share: f64::NAN,
            ground_share: f64::NAN,
            shared_trend: false,
            verdict: Verdict::Described,
        }
    }

    /// True for the tests that the family binds together: those that can tell, and are not descriptions.
    pub(super) fn is_family(&self) -> bool {
        self.p.is_some() && !matches!(self.measure, Measure::MeanDistance)
    }
}
