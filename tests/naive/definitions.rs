//! Each number from its definition, one shift and one cell at a time.

use ndarray::Array2;
use salband::coincidence::{Measure, Reference, Settings, Subject};

/// The sums at one shift.
#[derive(Debug, Default, Clone)]
pub struct Sums {
    pub overlap: f64,
    pub subject: f64,
    pub near: Vec<f64>,
    pub hits: Vec<f64>,
    pub far_all: f64,
    pub far_subject: f64,
    /// The two strengths, a pair for each cell of the overlap.
    pub pairs: Vec<(f64, f64)>,
}

/// What the naive comparison says of one test.
pub struct Told {
    pub subject: usize,
    pub measure: Measure,
    pub observed: f64,
    pub expected: f64,
    pub score: f64,
    pub raw_p: f64,
    pub raw_p_family: Option<f64>,
    pub p: Option<f64>,
    pub p_family: Option<f64>,
    pub shifts: usize,
    pub independent: f64,
}

/// Half the side of the shifts: a quarter of the box around the shared cells.
fn reach(subject: &Subject, reference: &Reference) -> (isize, isize) {
    let shared = &subject.footprint & &reference.footprint;
    let span = |index: fn((usize, usize)) -> usize| {
        let at = || shared.indexed_iter().filter(|(_, set)| **set).map(|(at, _)| index(at));
        (at().max().unwrap() - at().min().unwrap() + 1) as isize
    };
    (span(|at| at.0) / 4, span(|at| at.1) / 4)
}

/// The sums over the cells x of the subject's footprint for which x + shift lies in the reference's.
pub fn sums_at(subject: &Subject, reference: &Reference, within: &[f64], cap: f64, shift: (isize, isize)) -> Sums {
    let (members, a) = (subject.members.as_ref().unwrap(), subject.strength.as_ref().unwrap());
    let (distance, b) = (reference.distance.as_ref().unwrap(), reference.strength.as_ref().unwrap());
    let (rows, cols) = subject.footprint.dim();
    let mut sums = Sums { near: vec![0.0; within.len()], hits: vec![0.0; within.len()], ..Sums::default() };
    for row in 0..rows {
        for col in 0..cols {
            let (r, c) = (row as isize + shift.0, col as isize + shift.1);
            if r < 0 || c < 0 || r >= rows as isize || c >= cols as isize || !subject.footprint[[row, col]] {
                continue;
            }
            let there = [r as usize, c as usize];
            if !reference.footprint[there] {
                continue;
            }
            let member = members[[row, col]];
            sums.overlap += 1.0;
            sums.far_all += distance[there].min(cap);
            if member {
                sums.subject += 1.0;
                sums.far_subject += distance[there].min(cap);
            }
            for (index, within) in within.iter().enumerate() {
                if distance[there] <= *within {
                    sums.near[index] += 1.0;
                    sums.hits[index] += if member { 1.0 } else { 0.0 };
                }
            }
            sums.pairs.push((a[[row, col]], b[there]));
        }
    }
    sums
}

/// Pearson's correlation by its two-pass definition.
pub fn pearson(pairs: &[(f64, f64)]) -> f64 {
    let n = pairs.len() as f64;
    let (ma, mb) = (pairs.iter().map(|p| p.0).sum::<f64>() / n, pairs.iter().map(|p| p.1).sum::<f64>() / n);
    let of = |f: &dyn Fn(f64, f64) -> f64| pairs.iter().map(|(a, b)| f(a - ma, b - mb)).sum::<f64>();
    of(&|a, b| a * b) / (of(&|a, _| a * a) * of(&|_, b| b * b)).sqrt()
}

/// What the least-squares plane over a footprint leaves, by Gram-Schmidt on (1, row, column).
fn without_plane(values: &Array2<f64>, footprint: &Array2<bool>) -> Array2<f64> {
    let cells: Vec<(usize, usize)> = footprint.indexed_iter().filter(|(_, set)| **set).map(|(at, _)| at).collect();
    let mut basis: Vec<Vec<f64>> = Vec::new();
    let take_off = |vector: &mut Vec<f64>, basis: &[Vec<f64>]| {
        for unit in basis {
            let along: f64 = vector.iter().zip(unit).map(|(v, u)| v * u).sum();
            vector.iter_mut().zip(unit).for_each(|(v, u)| *v -= along * u);
        }
    };
    for kind in 0..3 {
        let mut vector: Vec<f64> = cells.iter().map(|at| [1.0, at.0 as f64, at.1 as f64][kind]).collect();
        take_off(&mut vector, &basis);
        let norm = vector.iter().map(|v| v * v).sum::<f64>().sqrt();
        basis.push(vector.iter().map(|v| v / norm).collect());
    }
    let mut left: Vec<f64> = cells.iter().map(|at| values[*at]).collect();
    take_off(&mut left, &basis);
    let mut residual = Array2::from_elem(values.dim(), f64::NAN);
    cells.iter().zip(left).for_each(|(at, value)| residual[*at] = value);
    residual
}

/// Scores over shifts: shift, standardised score.
type Scores = Vec<((isize, isize), f64)>;

fn rank(scores: &Scores, score: f64) -> f64 {
    scores.iter().filter(|(_, other)| *other >= score - 1e-9).count() as f64 / scores.len() as f64
}

/// Finite cells over the sum of their autocorrelation, summed over rings up to the first whose mean is not positive.
fn independent(scores: &Scores) -> f64 {
    let n = scores.len() as f64;
    let mean = scores.iter().map(|(_, score)| score).sum::<f64>() / n;
    let variance = scores.iter().map(|(_, score)| (score - mean).powi(2)).sum::<f64>() / n;
    let up = scores.iter().map(|(at, _)| at.0).max().unwrap();
    let left = scores.iter().map(|(at, _)| at.1).max().unwrap();
    let mut rings = vec![(0.0, 0); 1 + (up as f64).hypot(left as f64).round() as usize];
    for down in -up..=up {
        for right in -left..=left {
            let (mut pairs, mut sum) = (0.0, 0.0);
            for (at, score) in scores {
                let other = (at.0 + down, at.1 + right);
                if let Some((_, there)) = scores.iter().find(|(at, _)| *at == other) {
                    pairs += 1.0;
                    sum += (score - mean) * (there - mean);
                }
            }
            if pairs > 0.0 {
                let ring = &mut rings[(down as f64).hypot(right as f64).round() as usize];
                ring.0 += sum / pairs / variance;
                ring.1 += 1;
            }
        }
    }
    let area: f64 = rings.iter().take_while(|(sum, count)| *count > 0 && *sum > 0.0).map(|(sum, _)| sum).sum();
    n / area.max(1.0)
}

/// The whole comparison of several subjects with one reference.
pub fn naive_compare(subjects: &[Subject], reference: &Reference, settings: &Settings) -> Vec<Told> {
    let mut reference = reference.clone();
    reference.strength = Some(without_plane(reference.strength.as_ref().unwrap(), &reference.footprint));
    let mut told = Vec::new();
    let mut family: Vec<Scores> = Vec::new();
    for (number, subject) in subjects.iter().enumerate() {
        let mut subject = subject.clone();
        subject.strength = Some(without_plane(subject.strength.as_ref().unwrap(), &subject.footprint));
        let (up, left) = reach(&subject, &reference);
        let at = |shift| sums_at(&subject, &reference, &settings.within, settings.distance_cap, shift);
        let room = at((0, 0)).overlap;
        let mut sums = Vec::new();
        for down in -up..=up {
            for right in -left..=left {
                let sum = at((down, right));
                let long = (down as f64 / up as f64).powi(2) + (right as f64 / left as f64).powi(2) > 1.0 + 1e-12;
                if !long && sum.overlap >= 0.5 * room {
                    sums.push(((down, right), sum));
                }
            }
        }
        let mut measures: Vec<Measure> =
            settings.within.iter().map(|within| Measure::Enrichment { within: *within }).collect();
        measures.extend([Measure::MeanDistance, Measure::Correlation]);
        for (index, measure) in measures.into_iter().enumerate() {
            let statistic = |sums: &Sums| match measure {
                Measure::Enrichment { .. } => (sums.hits[index] / sums.subject) / (sums.near[index] / sums.overlap),
                Measure::MeanDistance => sums.far_all / sums.overlap - sums.far_subject / sums.subject,
                Measure::Correlation => pearson(&sums.pairs),
            };
            let values: Vec<_> = sums.iter().map(|(shift, sums)| (*shift, statistic(sums), sums.overlap)).collect();
            let values: Vec<_> = values.into_iter().filter(|(_, value, _)| value.is_finite()).collect();
            let count = values.len() as f64;
            let mean = values.iter().map(|(_, value, _)| value).sum::<f64>() / count;
            let mut scores: Scores = values.iter().map(|(at, value, n)| (*at, (value - mean) * n.sqrt())).collect();
            let spread = (scores.iter().map(|(_, score)| score * score).sum::<f64>() / count).sqrt();
            scores.iter_mut().for_each(|(_, score)| *score /= spread);
            let zero = |scores: &Scores| scores.iter().find(|(at, _)| *at == (0, 0)).unwrap().1;
            let observed = values.iter().find(|(at, _, _)| *at == (0, 0)).unwrap().1;
            let base = &sums.iter().find(|(at, _)| *at == (0, 0)).unwrap().1;
            // Mean distance is told as a distance: the ground's mean less the closeness.
            let tell = |value: f64| match measure {
                Measure::MeanDistance => base.far_all / base.overlap - value,
                _ => value,
            };
            let (score, independent) = (zero(&scores), independent(&scores));
            let raw_p = rank(&scores, score);
            let least = floor(scores.len() - 1, independent);
            told.push(Told {
                subject: number,
                measure,
                observed: tell(observed),
                expected: tell(mean),
                score,
                raw_p,
                raw_p_family: None,
                p: (independent >= 3.0 && least <= settings.level).then_some(raw_p.max(least)),
                p_family: None,
                shifts: scores.len() - 1,
                independent,
            });
            if measure != Measure::MeanDistance && told.last().is_some_and(|test| test.p.is_some()) {
                family.push(scores);
            }
        }
    }
    // Tests that cannot tell are no members of the family.
    if family.is_empty() {
        return told;
    }
    let everywhere = |at: &(isize, isize)| family.iter().all(|scores| scores.iter().any(|(other, _)| other == at));
    let shifts: Vec<(isize, isize)> = family[0].iter().map(|(at, _)| *at).filter(everywhere).collect();
    let largest = |at: &(isize, isize)| {
        let here = family.iter().map(|scores| scores.iter().find(|(other, _)| other == at).unwrap().1);
        here.fold(f64::NEG_INFINITY, f64::max)
    };
    let largest: Scores = shifts.iter().map(|at| (*at, largest(at))).collect();
    let independent = independent(&largest);
    let least = floor(largest.len() - 1, independent);
    let enough = independent >= 3.0 && least <= settings.level;
    for test in told.iter_mut().filter(|test| test.measure != Measure::MeanDistance && test.p.is_some()) {
        let adjusted = rank(&largest, test.score);
        test.raw_p_family = Some(adjusted);
        if let (Some(p), true) = (test.p, enough) {
            test.p_family = Some(adjusted.max(least).max(p));
        }
    }
    told
}

/// The smallest p that is told: .005, what the shifts resolve, and what the independent ones among them resolve, the last no
/// coarser than .05, at which the level was measured to hold for few of them. Below three, nothing is told.
fn floor(shifts: usize, independent: f64) -> f64 {
    [0.005, 1.0 / (1.0 + shifts as f64), (1.0 / (1.0 + independent)).min(0.05)].into_iter().fold(0.0, f64::max)
}
