//! Every subject against every reference: sums by transform, nulls, and the family that binds the tests together.

use ndarray::{Array2, Zip, s};
use rayon::prelude::*;

use super::correlator::{Correlator, Spectrum};
use super::family::Family;
use super::independent::independent_values_with;
use super::layer::{Reference, Settings, Subject, check_layers};
use super::measure::{Measure, Moments, closeness, correlation, enrichment};
use super::null::{SMALLEST_P, ShiftNull};
use super::shift::{Reach, admissible};
use super::trend::Trend;
use super::verdict::{Refusal, Verdict};
use crate::error::Result;
use crate::grid::Mask;

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
    let mut family = Family::new(engine.window.reach);
    let mut tests = Vec::new();
    for (index, reference) in references.iter().enumerate() {
        let fixed = engine.fix(reference);
        let shared: Vec<Shared> = groups.par_iter().map(|footprint| engine.share(footprint, &fixed)).collect();
        let results: Vec<Vec<(Test, Option<ShiftNull>)>> = subjects
            .par_iter()
            .enumerate()
            .map(|(number, subject)| {
                let shared = &shared[group_of[number]];
                let place = Place { subject: number, reference: index };
                engine.measure(place, subject, trends[number].as_ref(), &fixed, shared)
            })
            .collect();
        for (test, null) in results.into_iter().flatten() {
            if let (true, Some(null)) = (is_family(&test), &null) {
                family.add(&null.scores);
            }
            tests.push(test);
        }
    }
    tests.sort_by_key(|test| (test.subject, test.reference));
    Ok(family.judge(tests, settings.level, &engine.lags))
}

/// True for the tests that the family binds together.
pub(super) fn is_family(test: &Test) -> bool {
    test.tested && !matches!(test.measure, Measure::MeanDistance) && test.score.is_finite()
}

/// Where a test stands among all.
#[derive(Clone, Copy)]
struct Place {
    subject: usize,
    reference: usize,
}

/// The part of the arrays that holds every footprint, and how far shifts go in it.
struct Window {
    top: usize,
    left: usize,
    rows: usize,
    cols: usize,
    reach: Reach,
}

impl Window {
    /// `None` if no subject shares a cell with any reference.
    fn around(subjects: &[Subject], references: &[Reference]) -> Option<Self> {
        let mut reach: Option<Reach> = None;
        let mut extent: Option<((usize, usize), (usize, usize))> = None;
        let mut cover = |bounds: ((usize, usize), (usize, usize))| {
            let ((top, left), (bottom, right)) = extent.unwrap_or(bounds);
            let ((t, l), (b, r)) = bounds;
            extent = Some(((top.min(t), left.min(l)), (bottom.max(b), right.max(r))));
        };
        for (number, subject) in subjects.iter().enumerate() {
            let earlier = &subjects[..number];
            if earlier.iter().any(|other| other.footprint == subject.footprint) {
                continue;
            }
            for reference in references {
                if let Some(longest) = longest_shift(&subject.footprint, &reference.footprint) {
                    reach = Some(reach.map_or(longest, |reach| reach.or(longest)));
                    [&subject.footprint, &reference.footprint].into_iter().filter_map(bounds).for_each(&mut cover);
                }
            }
        }
        let ((top, left), (bottom, right)) = extent?;
        Some(Self { top, left, rows: bottom - top + 1, cols: right - left + 1, reach: reach? })
    }

    fn shape(&self) -> (usize, usize) {
        (self.rows, self.cols)
    }

    fn cut<'a, T>(&self, array: &'a Array2<T>) -> ndarray::ArrayView2<'a, T> {
        array.slice(s![self.top..self.top + self.rows, self.left..self.left + self.cols])
    }
}

fn bounds(footprint: &Array2<bool>) -> Option<((usize, usize), (usize, usize))> {
    Mask(footprint.clone()).bounds()
}

/// The longest admissible shift for a pair of footprints: a quarter of the box around the cells that they share.
fn longest_shift(a: &Array2<bool>, b: &Array2<bool>) -> Option<Reach> {
    let ((top, left), (bottom, right)) = bounds(&(a & b))?;
    Some(Reach::of_box(bottom - top + 1, right - left + 1))
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

fn strength_without_plane(footprint: &Array2<bool>, strength: Option<&Array2<f64>>) -> Option<(Trend, Array2<f64>)> {
    let mut inside = strength?.clone();
    Zip::from(&mut inside).and(footprint).for_each(|value, &inside| {
        if !inside {
            *value = f64::NAN;
        }
    });
    Trend::remove(&inside)
}

/// A reference, transformed.
struct Fixed<'a> {
    layer: &'a Reference,
    footprint: Spectrum,
    /// One for each distance: the tested ones, then those of the profile.
    near: Vec<Spectrum>,
    distance: Option<Spectrum>,
    strength: Option<FixedStrength>,
}

/// The strength of a reference without its plane, and its square, transformed.
struct FixedStrength {
    trend: Trend,
    plain: Spectrum,
    square: Spectrum,
}

/// Sums that depend on the footprints and the reference alone, shared by all subjects on one footprint.
struct Shared {
    overlap: Array2<f64>,
    allowed: Array2<bool>,
    near: Vec<Array2<f64>>,
    distance: Option<Array2<f64>>,
    strength: Option<(Array2<f64>, Array2<f64>)>,
}

struct Engine<'a> {
    correlator: Correlator,
    /// For the autocorrelation of scores over shifts.
    lags: Correlator,
    window: Window,
    settings: &'a Settings,
}

impl Engine<'_> {
    fn mask(&self, mask: &Array2<bool>) -> Spectrum {
        let view = self.window.cut(mask);
        self.correlator.spectrum(|row, col| f64::from(u8::from(view[[row, col]])))
    }

    /// The spectrum of a layer inside a footprint, 0 elsewhere.
    fn layer(&self, footprint: &Array2<bool>, values: &Array2<f64>, change: impl Fn(f64) -> f64) -> Spectrum {
        let (inside, values) = (self.window.cut(footprint), self.window.cut(values));
        self.correlator.spectrum(|row, col| if inside[[row, col]] { change(values[[row, col]]) } else { 0.0 })
    }

    fn distances(&self) -> impl Iterator<Item = (f64, bool)> {
        let profile = self.settings.profile.iter().filter(|distance| !self.settings.within.contains(distance));
        self.settings.within.iter().map(|distance| (*distance, true)).chain(profile.map(|distance| (*distance, false)))
    }

    fn fix<'a>(&self, layer: &'a Reference) -> Fixed<'a> {
        let ladder: Vec<f64> = match layer.distance {
            Some(_) => self.distances().map(|(distance, _)| distance).collect(),
            None => Vec::new(),
        };
        let cap = self.settings.distance_cap;
        let near = ladder.par_iter().filter_map(|within| {
            let distance = layer.distance.as_ref()?;
            Some(self.layer(&layer.footprint, distance, |far| f64::from(u8::from(far <= *within))))
        });
        let near = near.collect();
        let strength = strength_without_plane(&layer.footprint, layer.strength.as_ref()).map(|(trend, values)| {
            let plain = self.layer(&layer.footprint, &values, |value| value);
            let square = self.layer(&layer.footprint, &values, |value| value * value);
            FixedStrength { trend, plain, square }
        });
        Fixed {
            footprint: self.mask(&layer.footprint),
            distance: layer.distance.as_ref().map(|far| self.layer(&layer.footprint, far, |far| far.min(cap))),
            near,
            strength,
            layer,
        }
    }

    fn share(&self, footprint: &Array2<bool>, fixed: &Fixed<'_>) -> Shared {
        let spectrum = self.mask(footprint);
        let overlap = self.correlator.counts(&spectrum, &fixed.footprint);
        let longest = longest_shift(footprint, &fixed.layer.footprint).unwrap_or(Reach { rows: 0, cols: 0 });
        Shared {
            allowed: admissible(longest, &overlap),
            near: fixed.near.par_iter().map(|near| self.correlator.counts(&spectrum, near)).collect(),
            distance: fixed.distance.as_ref().map(|distance| self.correlator.sums(&spectrum, distance)),
            strength: fixed.strength.as_ref().map(|strength| {
                let sums = |layer| self.correlator.sums(&spectrum, layer);
                (sums(&strength.plain), sums(&strength.square))
            }),
            overlap,
        }
    }

    /// All measures of one subject against one reference.
    fn measure(
        &self,
        place: Place,
        subject: &Subject,
        strength: Option<&(Trend, Array2<f64>)>,
        fixed: &Fixed<'_>,
        shared: &Shared,
    ) -> Vec<(Test, Option<ShiftNull>)> {
        let mut results = Vec::new();
        if let (Some(members), Some(_)) = (&subject.members, &fixed.layer.distance) {
            self.measure_members(place, &(members & &subject.footprint), fixed, shared, &mut results);
        }
        if let (Some(_), Some(_)) = (&subject.strength, &fixed.layer.strength) {
            results.push(self.measure_strength(place, subject, strength, fixed, shared));
        }
        results
    }

    fn measure_members(
        &self,
        place: Place,
        members: &Array2<bool>,
        fixed: &Fixed<'_>,
        shared: &Shared,
        results: &mut Vec<(Test, Option<ShiftNull>)>,
    ) {
        let moved = self.mask(members);
        let inside = self.correlator.counts(&moved, &fixed.footprint);
        let zero = self.window.reach.zero();
        let (cells, own) = (shared.overlap[zero], inside[zero]);
        let blank = |measure, tested| Test {
            subject_cells: own as usize,
            footprint_cells: cells as usize,
            ..Test::blank(place, measure, tested)
        };
        let ladder: Vec<(f64, bool)> = self.distances().collect();
        let enriched =
            ladder.par_iter().zip(&fixed.near).zip(&shared.near).map(|(((within, tested), near), ground)| {
                let hits = self.correlator.counts(&moved, near);
                let mut test = blank(Measure::Enrichment { within: *within }, *tested);
                test.subject_share = hits[zero] / own;
                test.ground_share = ground[zero] / cells;
                let statistic = enrichment(&hits, &inside, ground, &shared.overlap);
                let refusal = if own < 2.0 {
                    Some(Refusal::TooFewMembers { cells: own as usize })
                } else if ground[zero] == 0.0 || ground[zero] == cells {
                    Some(Refusal::NoContrast { near: ground[zero] as usize, cells: cells as usize })
                } else {
                    None
                };
                self.judge(test, refusal, &statistic, shared)
            });
        results.extend(enriched.collect::<Vec<_>>());
        if let (Some(distance), Some(ground)) = (&fixed.distance, &shared.distance) {
            let sum = self.correlator.sums(&moved, distance);
            let statistic = closeness(&sum, &inside, ground, &shared.overlap);
            let refusal = (own < 2.0).then_some(Refusal::TooFewMembers { cells: own as usize });
            let (mut test, null) = self.judge(blank(Measure::MeanDistance, true), refusal, &statistic, shared);
            // Told as a distance: what the subject's cells have, against what they would have under the null.
            let ground = ground[zero] / cells;
            (test.low, test.high) = (ground - test.high, ground - test.low);
            (test.observed, test.expected) = (ground - test.observed, ground - test.expected);
            test.effect = test.observed - test.expected;
            results.push((test, null));
        }
    }

    fn measure_strength(
        &self,
        place: Place,
        subject: &Subject,
        strength: Option<&(Trend, Array2<f64>)>,
        fixed: &Fixed<'_>,
        shared: &Shared,
    ) -> (Test, Option<ShiftNull>) {
        let cells = shared.overlap[self.window.reach.zero()] as usize;
        let mut test =
            Test { subject_cells: cells, footprint_cells: cells, ..Test::blank(place, Measure::Correlation, true) };
        let (Some((own, values)), Some(other), Some((sum, squares))) = (strength, &fixed.strength, &shared.strength)
        else {
            test.verdict = Verdict::CannotTell(Refusal::Constant);
            return (test, None);
        };
        test.shared_trend = own.shared_with(&other.trend);
        let a = self.layer(&subject.footprint, values, |value| value);
        let aa = self.layer(&subject.footprint, values, |value| value * value);
        let statistic = correlation(
            &self.correlator.sums(&a, &other.plain),
            &Moments {
                sum: &self.correlator.sums(&a, &fixed.footprint),
                square: &self.correlator.sums(&aa, &fixed.footprint),
            },
            &Moments { sum, square: squares },
            &shared.overlap,
        );
        let (mut test, null) = self.judge(test, None, &statistic, shared);
        test.effect = test.observed - test.expected;
        (test, null)
    }

    /// Fills in what the null says of a statistic, or why it says nothing.
    fn judge(
        &self,
        mut test: Test,
        refusal: Option<Refusal>,
        statistic: &Array2<f64>,
        shared: &Shared,
    ) -> (Test, Option<ShiftNull>) {
        let zero = self.window.reach.zero();
        test.observed = statistic[zero];
        let shifts = shared.allowed.iter().filter(|allowed| **allowed).count();
        let refusal = refusal.or((shifts < 2).then_some(Refusal::NoRoom { cells: test.footprint_cells }));
        let null = match refusal {
            None => ShiftNull::new(statistic, &shared.overlap, &shared.allowed).ok_or(Refusal::Constant),
            Some(refusal) => Err(refusal),
        };
        let null = match null {
            Ok(null) => null,
            Err(refusal) => {
                test.verdict = Verdict::CannotTell(refusal);
                return (test, None);
            }
        };
        (test.expected, test.low, test.high) = (null.mean, null.low, null.high);
        test.effect = null.observed / null.mean;
        (test.score, test.raw_p, test.shifts) = (null.score, null.p, null.shifts);
        if test.tested {
            test.independent_shifts = independent_values_with(&self.lags, &null.scores);
            test.smallest_p = smallest_p(null.shifts, test.independent_shifts);
            test.verdict = match enough_shifts(test.smallest_p, test.independent_shifts, self.settings.level) {
                Err(refusal) => Verdict::CannotTell(refusal),
                Ok(()) => {
                    test.p = Some(null.p.max(test.smallest_p));
                    Verdict::NotFound
                }
            };
        }
        (test, Some(null))
    }
}

/// The smallest p-value that a number of shifts, and of independent ones among them, resolves.
pub(super) fn smallest_p(shifts: usize, independent: f64) -> f64 {
    SMALLEST_P.max(1.0 / (1.0 + shifts as f64)).max(1.0 / (1.0 + independent))
}

/// Refuses where not even the smallest p-value reaches the level.
pub(super) fn enough_shifts(smallest: f64, independent: f64, level: f64) -> std::result::Result<(), Refusal> {
    if smallest <= level {
        return Ok(());
    }
    Err(Refusal::TooFewShifts { independent, needed: (1.0 / level - 1.0).ceil() })
}

impl Test {
    fn blank(place: Place, measure: Measure, tested: bool) -> Self {
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
            if subject.members.is_some() && reference.distance.is_some() {
                settings.within.iter().for_each(|within| refuse(Measure::Enrichment { within: *within }));
                refuse(Measure::MeanDistance);
            }
            if subject.strength.is_some() && reference.strength.is_some() {
                refuse(Measure::Correlation);
            }
        }
    }
    Comparison { tests, family_shifts: 0, family_independent_shifts: 0.0, family_smallest_p: 1.0, family_tests: 0 }
}
