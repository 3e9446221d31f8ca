//! One replicate: layers drawn, compared, and the p-values that come out.

use ndarray::Array2;
use salband::Result;
use salband::coincidence::{
    Comparison, Correlator, Measure, Moments, Reach, Reference, Settings, ShiftNull, Subject, admissible, closeness,
    compare, correlation, enrichment,
};

use super::fields::{Smoothness, crests, distance, gradient, highest, pair};

/// Slices in a family.
const DEPTHS: usize = 5;

/// Neighbouring slices correlate by this much.
const SLICE_CORRELATION: f64 = 0.8;

/// Enrichment is judged within this distance, in cells; the family holds the second one too.
const WITHIN: [f64; 2] = [2.0, 4.0];

/// Mean distance is capped here, in cells.
const CAP: f64 = 8.0;

/// The layers of one replicate, before a footprint is laid over them.
pub struct Layers {
    /// The slices, from the top.
    pub slices: Vec<Array2<f64>>,
    /// The gradient magnitude of the gravity.
    pub strength: Array2<f64>,
    /// The wrong null leaves out shifts up to this length, in cells; the correlation length unless changed.
    pub short: f64,
}

impl Layers {
    /// Independent slices and gravity of one correlation length.
    pub fn independent(seed: u64, shape: (usize, usize), length: f64) -> Self {
        let [gravity, _] = pair(seed.wrapping_mul(1000), shape, length, Smoothness::Twice);
        let draws = (1..=DEPTHS.div_ceil(2) as u64)
            .flat_map(|part| pair(seed.wrapping_mul(1000) + part, shape, length, Smoothness::Once));
        let mut slices: Vec<Array2<f64>> = Vec::new();
        for draw in draws.take(DEPTHS) {
            let slice = match slices.last() {
                None => draw,
                Some(above) => above * SLICE_CORRELATION + draw * (1.0 - SLICE_CORRELATION.powi(2)).sqrt(),
            };
            slices.push(slice);
        }
        Self { slices, strength: gradient(&gravity), short: length }
    }
}

/// What one replicate says on one footprint.
pub struct Outcome {
    /// p of enrichment, of mean distance as the crate defines it, of plain mean distance, and of correlation, for the
    /// first slice.
    pub p: [f64; 4],
    /// The smallest family-wise p over all slices, both distances and the correlation.
    pub family: f64,
    /// As `p`, with the shifts no longer than [`Layers::short`] left out, which must not be done.
    pub without_short: [f64; 4],
    /// The smallest p of enrichment over the slices, unadjusted, which must not be done.
    pub smallest_over_slices: f64,
    /// Effectively independent shifts of enrichment and of correlation, for the first slice.
    pub independent: [f64; 2],
}

/// Compares the layers inside one footprint.
pub fn trial(layers: &Layers, footprint: &Array2<bool>) -> Result<Outcome> {
    trial_over(layers, footprint, footprint)
}

/// Compares slices on one footprint with gravity on another, as where a ragged model lies over a wide grid.
pub fn trial_over(layers: &Layers, footprint: &Array2<bool>, wide: &Array2<bool>) -> Result<Outcome> {
    let far = distance(&crests(&layers.strength, wide));
    let subjects: Vec<Subject> = layers.slices.iter().map(|slice| subject(slice, footprint)).collect();
    let reference = Reference {
        footprint: wide.clone(),
        distance: Some(far.clone()),
        strength: Some(layers.strength.clone()),
        ..Reference::default()
    };
    let settings = Settings { within: WITHIN.to_vec(), profile: vec![], distance_cap: CAP, level: 0.05 };
    let comparison = compare(&subjects, &[reference], &settings)?;
    let first = |measure| comparison.tests.iter().find(|test| test.subject == 0 && test.measure == measure).unwrap();
    let enriched = Measure::Enrichment { within: WITHIN[0] };
    let nulls = nulls(&layers.slices[0], &layers.strength, &far, footprint);
    let plain = nulls[2].as_ref().map_or(1.0, |null| null.p);
    Ok(Outcome {
        p: [
            p(first(enriched).raw_p),
            p(first(Measure::MeanDistance).raw_p),
            plain,
            p(first(Measure::Correlation).raw_p),
        ],
        family: comparison.tests.iter().map(|test| p(test.raw_p_family)).fold(1.0, f64::min),
        without_short: nulls.map(|null| null.map_or(1.0, |null| without_short(&null, layers.short))),
        smallest_over_slices: smallest(&comparison, enriched),
        independent: [first(enriched).independent_shifts, first(Measure::Correlation).independent_shifts],
    })
}

/// A p-value that is not defined rejects nothing.
fn p(value: f64) -> f64 {
    if value.is_nan() { 1.0 } else { value }
}

fn smallest(comparison: &Comparison, measure: Measure) -> f64 {
    comparison.tests.iter().filter(|test| test.measure == measure).map(|test| p(test.raw_p)).fold(1.0, f64::min)
}

fn subject(slice: &Array2<f64>, footprint: &Array2<bool>) -> Subject {
    Subject {
        footprint: footprint.clone(),
        members: Some(highest(slice, footprint, 0.2)),
        strength: Some(slice.clone()),
    }
}

/// The nulls of enrichment, closeness, plain mean distance and correlation (no plane taken out) of one slice.
fn nulls(
    slice: &Array2<f64>,
    strength: &Array2<f64>,
    far: &Array2<f64>,
    footprint: &Array2<bool>,
) -> [Option<ShiftNull>; 4] {
    let (rows, cols) = footprint.dim();
    let longest = Reach::of_box(rows, cols);
    let engine = Correlator::new((rows, cols), longest);
    let layer = |value: &dyn Fn([usize; 2]) -> f64| {
        engine.spectrum(|row, col| if footprint[[row, col]] { value([row, col]) } else { 0.0 })
    };
    let members = highest(slice, footprint, 0.2);
    let one = layer(&|_| 1.0);
    let moved = layer(&|at| f64::from(u8::from(members[at])));
    let near = layer(&|at| f64::from(u8::from(far[at] <= WITHIN[0])));
    let capped = layer(&|at| far[at].min(CAP));
    let overlap = engine.counts(&one, &one);
    let allowed = admissible(longest, &overlap);
    let inside = engine.counts(&moved, &one);
    let sum = engine.sums(&moved, &capped);
    let (a, b) = (scaled(slice, footprint), scaled(strength, footprint));
    let (fa, fb) = (layer(&|at| a[at]), layer(&|at| b[at]));
    let (faa, fbb) = (layer(&|at| a[at] * a[at]), layer(&|at| b[at] * b[at]));
    let statistics = [
        enrichment(&engine.counts(&moved, &near), &inside, &engine.counts(&one, &near), &overlap),
        closeness(&sum, &inside, &engine.sums(&one, &capped), &overlap),
        -(&sum / &inside),
        correlation(
            &engine.sums(&fa, &fb),
            &Moments { sum: &engine.sums(&fa, &one), square: &engine.sums(&faa, &one) },
            &Moments { sum: &engine.sums(&one, &fb), square: &engine.sums(&one, &fbb) },
            &overlap,
        ),
    ];
    statistics.map(|statistic| ShiftNull::new(&statistic, &overlap, &allowed))
}

/// Centred on the footprint and scaled to unit variance there.
fn scaled(values: &Array2<f64>, footprint: &Array2<bool>) -> Array2<f64> {
    let inside: Vec<f64> = values.iter().zip(footprint).filter(|(_, inside)| **inside).map(|(v, _)| *v).collect();
    let inside = ndarray::Array1::from(inside);
    let (mean, spread) = (inside.mean().unwrap(), inside.std(0.0));
    values.mapv(|value| (value - mean) / spread)
}

fn without_short(null: &ShiftNull, short: f64) -> f64 {
    let centre = [null.scores.nrows() / 2, null.scores.ncols() / 2];
    let (mut count, mut as_high) = (1, 1);
    for ((row, col), score) in null.scores.indexed_iter() {
        let shift = (row as f64 - centre[0] as f64).hypot(col as f64 - centre[1] as f64);
        if score.is_finite() && shift > short {
            count += 1;
            as_high += usize::from(*score >= null.score - 1e-9);
        }
    }
    f64::from(as_high as u32) / f64::from(count as u32)
}
