//! Every subject against every reference, and the family that binds the tests together.

use ndarray::Array2;
use rayon::prelude::*;

use super::correlator::Correlator;
use super::engine::{Engine, Shared, strength_without_plane};
use super::family::Family;
use super::layer::{Reference, Settings, Subject, check_layers};
use super::measure::Measure;
use super::null::ShiftNull;
use super::test::{Place, Test};
use super::trend::Trend;
use super::verdict::{Refusal, Verdict};
use super::window::Window;
use crate::error::Result;

/// All tests of a comparison, and what the family rests on.
#[derive(Debug, Clone)]
pub struct Comparison {
    /// One entry for each subject, reference and measure, in that order.
    pub tests: Vec<Test>,
    /// Shifts that are admissible in every test of the family.
    pub family_shifts: usize,
    /// How many of them are effectively independent, for the maximum over the family.
    pub family_independent_shifts: f64,
    /// The smallest family-wise p-value that can be resolved.
    pub family_smallest_p: f64,
    /// How many tests the family holds.
    pub family_tests: usize,
    /// How many parts the family fell into because footprints differ; their number multiplies its p-values. The three
    /// numbers above are those of the largest part.
    pub family_parts: usize,
}

/// Tests whether the subjects keep to the references more closely than under displacement.
///
/// 1. The overlap of the two footprints is counted at every shift, and the admissible shifts are found.
/// 2. Each measure is computed at every admissible shift from cross-correlations of masks and layers.
/// 3. Each is standardised over the shifts ([`ShiftNull`]), which ranks the observed value among them.
/// 4. Enrichment at the tested distances and correlation form the family: the same shift moves every subject, and the
///    largest standardised score over the family is ranked (Westfall & Young 1993).
///
/// A plane is taken out of both strengths before the correlation; where both followed one, the test says so.
/// The result is the same for any number of threads. Time grows as the number of tests times N log N.
///
/// # Errors
/// Layers of different shapes, strengths that are not finite inside their footprint, and settings out of range. Data
/// that cannot tell are not an error: see [`Verdict::CannotTell`].
pub fn compare(subjects: &[Subject], references: &[Reference], settings: &Settings) -> Result<Comparison> {
    settings.check()?;
    check_layers(subjects, references)?;
    let Some(window) = Window::around(subjects, references) else {
        return Ok(without_room(subjects, references, settings));
    };
    let correlator = Correlator::new(window.shape(), window.reach);
    let engine = Engine { lags: Correlator::new(window.reach.shape(), window.reach), correlator, window, settings };
    let trends: Vec<Option<(Trend, Array2<f64>)>> = subjects
        .par_iter()
        .map(|subject| strength_without_plane(&subject.footprint, subject.strength.as_ref()))
        .collect();
    let (groups, group_of) = group_footprints(subjects);
    let mut family = Family::default();
    let mut tests = Vec::new();
    for (index, reference) in references.iter().enumerate() {
        let fixed = engine.fix(reference);
        let met = |group: usize| (0..subjects.len()).any(|number| group_of[number] == group && reference.meets(number));
        let shared: Vec<Option<Shared>> = (groups.par_iter().enumerate())
            .map(|(group, footprint)| met(group).then(|| engine.share(footprint, &fixed)))
            .collect();
        let results: Vec<Vec<(Test, Option<ShiftNull>)>> = subjects
            .par_iter()
            .enumerate()
            .filter(|(number, _)| reference.meets(*number))
            .map(|(number, subject)| {
                let place = Place { subject: number, reference: index };
                let measure = |shared| engine.measure(place, subject, trends[number].as_ref(), &fixed, shared);
                shared[group_of[number]].as_ref().map(measure).unwrap_or_default()
            })
            .collect();
        for (test, null) in results.into_iter().flatten() {
            let part = null.map(|null| family.add(&null.scores));
            tests.push((test, part));
        }
    }
    tests.sort_by_key(|(test, _)| (test.subject, test.reference));
    let (tests, parts): (Vec<Test>, Vec<Option<usize>>) = tests.into_iter().unzip();
    Ok(family.judge(tests, &parts, settings.level, &engine.lags))
}

/// The different footprints among the subjects, and which one each subject has: slices of one model share theirs.
fn group_footprints(subjects: &[Subject]) -> (Vec<&Array2<bool>>, Vec<usize>) {
    let mut groups: Vec<&Array2<bool>> = Vec::new();
    let group_of = subjects.iter().map(|subject| {
        groups.iter().position(|known| **known == subject.footprint).unwrap_or_else(|| {
            groups.push(&subject.footprint);
            groups.len() - 1
        })
    });
    let group_of = group_of.collect();
    (groups, group_of)
}

/// What is left to say when no subject shares a cell with any reference.
fn without_room(subjects: &[Subject], references: &[Reference], settings: &Settings) -> Comparison {
    let mut tests = Vec::new();
    for (number, subject) in subjects.iter().enumerate() {
        for (index, reference) in references.iter().enumerate() {
            let mut refuse = |measure| {
                let place = Place { subject: number, reference: index };
                let verdict = Verdict::CannotTell(Refusal::NoRoom { cells: 0 });
                tests.push(Test { verdict, ..Test::blank(place, measure, true) });
            };
            if !reference.meets(number) {
                continue;
            }
            if subject.members.is_some() && reference.distance.is_some() {
                if reference.area {
                    refuse(Measure::Enrichment { within: 0.0 });
                }
                settings.within.iter().for_each(|within| refuse(Measure::Enrichment { within: *within }));
                refuse(Measure::MeanDistance);
            }
            if subject.strength.is_some() && reference.strength.is_some() {
                refuse(Measure::Correlation);
            }
        }
    }
    Comparison {
        tests,
        family_shifts: 0,
        family_independent_shifts: 0.0,
        family_smallest_p: 1.0,
        family_tests: 0,
        family_parts: 0,
    }
}
