//! The sums behind every measure, by transform, and the null of each.

use ndarray::{Array2, Zip};
use rayon::prelude::*;

use super::correlator::{Correlator, Masks, Spectrum};
use super::independent::{independent_values_with, pairs_at_lags};
use super::layer::{Reference, Settings, Subject};
use super::measure::{Measure, Moments, closeness, correlation, enrichment};
use super::null::ShiftNull;
use super::resolution::{enough_shifts, smallest_p};
use super::shift::{Reach, admissible};
use super::test::{Place, Test};
use super::trend::Trend;
use super::verdict::{Refusal, Verdict};
use super::window::{Window, longest_shift};

/// A reference, transformed.
pub(super) struct Fixed<'a> {
    layer: &'a Reference,
    footprint: Spectrum,
    /// The footprint, then the ground within each distance: the tested ones, then those of the profile.
    masks: Masks,
    distance: Option<Spectrum>,
    /// False where all capped distances are one.
    distances_vary: bool,
    strength: Option<FixedStrength>,
}

/// The strength of a reference without its plane, and its square, transformed.
struct FixedStrength {
    trend: Trend,
    plain: Spectrum,
    square: Spectrum,
}

/// Sums that depend on the footprints and the reference alone, shared by all subjects on one footprint.
pub(super) struct Shared {
    overlap: Array2<f64>,
    allowed: Array2<bool>,
    /// How many shifts are admissible, and how many pairs of them each lag joins.
    shifts: usize,
    pairs: Array2<f64>,
    near: Vec<Array2<f64>>,
    distance: Option<Array2<f64>>,
    strength: Option<(Array2<f64>, Array2<f64>)>,
}

pub(super) struct Engine<'a> {
    pub correlator: Correlator,
    /// For the autocorrelation of scores over shifts.
    pub lags: Correlator,
    pub window: Window,
    pub settings: &'a Settings,
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

    /// The distances of a reference and whether each is tested; inside an area comes first, as 0.
    fn distances(&self, reference: &Reference) -> impl Iterator<Item = (f64, bool)> {
        let inside = reference.area.then_some((0.0, true));
        let profile = self.settings.profile.iter().filter(|distance| !self.settings.within.contains(distance));
        let within = self.settings.within.iter().map(|distance| (*distance, true));
        inside.into_iter().chain(within).chain(profile.map(|distance| (*distance, false)))
    }

    pub fn fix<'a>(&self, layer: &'a Reference) -> Fixed<'a> {
        let cap = self.settings.distance_cap;
        let inside = self.window.cut(&layer.footprint);
        let masks = match &layer.distance {
            Some(distance) => {
                let ladder: Vec<f64> = self.distances(layer).map(|(within, _)| within).collect();
                let far = self.window.cut(distance);
                self.correlator.masks(1 + ladder.len(), |mask, row, col| {
                    inside[[row, col]] && (mask == 0 || far[[row, col]] <= ladder[mask - 1])
                })
            }
            None => self.correlator.masks(1, |_, row, col| inside[[row, col]]),
        };
        let strength = strength_without_plane(&layer.footprint, layer.strength.as_ref()).map(|(trend, values)| {
            let plain = self.layer(&layer.footprint, &values, |value| value);
            let square = self.layer(&layer.footprint, &values, |value| value * value);
            FixedStrength { trend, plain, square }
        });
        let mut capped = layer.distance.iter().flat_map(|distance| {
            let inside = distance.iter().zip(&layer.footprint).filter(|(_, inside)| **inside);
            inside.map(|(far, _)| far.min(cap))
        });
        let first = capped.next();
        let distances_vary = capped.any(|far| Some(far) != first);
        Fixed {
            distances_vary,
            footprint: self.mask(&layer.footprint),
            distance: layer.distance.as_ref().map(|far| self.layer(&layer.footprint, far, |far| far.min(cap))),
            masks,
            strength,
            layer,
        }
    }

    pub fn share(&self, footprint: &Array2<bool>, fixed: &Fixed<'_>) -> Shared {
        let spectrum = self.mask(footprint);
        let mut near = self.correlator.counts_of(&spectrum, &fixed.masks);
        let overlap = near.remove(0);
        let longest = longest_shift(footprint, &fixed.layer.footprint).unwrap_or(Reach { rows: 0, cols: 0 });
        let allowed = admissible(longest, &overlap);
        Shared {
            shifts: allowed.iter().filter(|allowed| **allowed).count(),
            pairs: pairs_at_lags(&self.lags, &allowed),
            allowed,
            near,
            distance: fixed.distance.as_ref().map(|distance| self.correlator.sums(&spectrum, distance)),
            strength: fixed.strength.as_ref().map(|strength| {
                let sums = |layer| self.correlator.sums(&spectrum, layer);
                (sums(&strength.plain), sums(&strength.square))
            }),
            overlap,
        }
    }

    /// All measures of one subject against one reference, each with its null if it belongs to the family.
    pub fn measure(
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
        let mut hits = self.correlator.counts_of(&moved, &fixed.masks);
        let inside = hits.remove(0);
        let zero = self.window.reach.zero();
        let (cells, own) = (shared.overlap[zero], inside[zero]);
        let blank = |measure, tested| Test {
            subject_cells: own as usize,
            footprint_cells: cells as usize,
            ..Test::blank(place, measure, tested)
        };
        let ladder: Vec<(f64, bool)> = self.distances(fixed.layer).collect();
        let enriched = ladder.par_iter().zip(&hits).zip(&shared.near).map(|(((within, tested), hits), ground)| {
            let mut test = blank(Measure::Enrichment { within: *within }, *tested);
            test.subject_share = hits[zero] / own;
            test.ground_share = ground[zero] / cells;
            let statistic = enrichment(hits, &inside, ground, &shared.overlap);
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
            let refusal = if own < 2.0 {
                Some(Refusal::TooFewMembers { cells: own as usize })
            } else {
                // Closeness is a difference, so rounding would pass for variation where every distance is the cap.
                (!fixed.distances_vary).then_some(Refusal::Constant)
            };
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
        let refusal = refusal.or((shared.shifts < 2).then_some(Refusal::NoRoom { cells: test.footprint_cells }));
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
            // Most measures are defined at every admissible shift, and share the count of pairs.
            test.independent_shifts = if null.shifts + 1 == shared.shifts {
                independent_values_with(&self.lags, &null.scores, &shared.pairs)
            } else {
                let pairs = pairs_at_lags(&self.lags, &null.scores.mapv(f64::is_finite));
                independent_values_with(&self.lags, &null.scores, &pairs)
            };
            test.smallest_p = smallest_p(null.shifts, test.independent_shifts);
            test.verdict = match enough_shifts(null.shifts, test.independent_shifts, self.settings.level) {
                Err(refusal) => Verdict::CannotTell(refusal),
                Ok(()) => {
                    test.p = Some(null.p.max(test.smallest_p));
                    Verdict::NotFound
                }
            };
        }
        let null = test.is_family().then_some(null);
        (test, null)
    }
}

pub(super) fn strength_without_plane(
    footprint: &Array2<bool>,
    strength: Option<&Array2<f64>>,
) -> Option<(Trend, Array2<f64>)> {
    let mut inside = strength?.clone();
    Zip::from(&mut inside).and(footprint).for_each(|value, &inside| {
        if !inside {
            *value = f64::NAN;
        }
    });
    Trend::remove(&inside)
}
