//! The engine against plain loops, against scipy, and against what must hold for any data.

use ndarray::{Array2, array};
use proptest::prelude::*;
use salband::coincidence::{
    Comparison, Correlator, Measure, Moments, Reach, Reference, Settings, ShiftNull, Subject, admissible, closeness,
    compare, correlation, enrichment,
};

mod naive;

use naive::{Case, SHAPE, case, naive_compare, pearson, sums_at};

const WITHIN: [f64; 3] = [1.0, 1.5, 3.0];
const CAP: f64 = 3.5;

fn settings() -> Settings {
    Settings { within: WITHIN.to_vec(), profile: vec![], distance_cap: CAP, level: 0.05 }
}

/// Equal to 1e-9 of the larger of one and their size; NaN equals NaN.
fn same(found: f64, expected: f64, what: &str) {
    let near = (found - expected).abs() <= 1e-9 * expected.abs().max(1.0);
    assert!(near || (found.is_nan() && expected.is_nan()), "{what}: {found} against {expected}");
}

/// The statistics that the public parts of the engine give for one subject, over a reach.
struct Fields {
    overlap: Array2<f64>,
    counts: [Array2<f64>; 3],
    statistics: [Array2<f64>; 3],
}

fn engine_fields(subject: &Subject, reference: &Reference, reach: Reach, within: f64) -> Fields {
    let engine = Correlator::new(SHAPE, reach);
    let layer = |footprint: &Array2<bool>, value: &dyn Fn([usize; 2]) -> f64| {
        engine.spectrum(|row, col| if footprint[[row, col]] { value([row, col]) } else { 0.0 })
    };
    let (f, g) = (&subject.footprint, &reference.footprint);
    let (a, b) = (subject.strength.as_ref().unwrap(), reference.strength.as_ref().unwrap());
    let (members, far) = (subject.members.as_ref().unwrap(), reference.distance.as_ref().unwrap());
    let (ground, there) = (layer(f, &|_| 1.0), layer(g, &|_| 1.0));
    let moved = layer(f, &|at| f64::from(u8::from(members[at])));
    let capped = layer(g, &|at| far[at].min(CAP));
    // The footprint and one distance travel as a pair; the counts of a single mask are checked with them.
    let masks = engine.masks(2, |mask, row, col| g[[row, col]] && (mask == 0 || far[[row, col]] <= within));
    let [overlap, near] = engine.counts_of(&ground, &masks).try_into().unwrap();
    let [inside, hits] = engine.counts_of(&moved, &masks).try_into().unwrap();
    assert_eq!(overlap, engine.counts(&ground, &there), "paired and single counts");
    let (fa, fb) = (layer(f, &|at| a[at]), layer(g, &|at| b[at]));
    let (faa, fbb) = (layer(f, &|at| a[at] * a[at]), layer(g, &|at| b[at] * b[at]));
    let statistics = [
        enrichment(&hits, &inside, &near, &overlap),
        closeness(&engine.sums(&moved, &capped), &inside, &engine.sums(&ground, &capped), &overlap),
        correlation(
            &engine.sums(&fa, &fb),
            &Moments { sum: &engine.sums(&fa, &there), square: &engine.sums(&faa, &there) },
            &Moments { sum: &engine.sums(&ground, &fb), square: &engine.sums(&ground, &fbb) },
            &overlap,
        ),
    ];
    Fields { overlap, counts: [inside, near, hits], statistics }
}

#[test]
fn every_sum_and_measure_equals_its_definition_at_every_shift() {
    let reach = Reach { rows: 6, cols: 7 };
    let mut checked = 0;
    for seed in 0..6 {
        let Case { subjects, reference } = case(seed, seed as usize % 3, 1);
        let fields = engine_fields(&subjects[0], &reference, reach, 1.5);
        let allowed = admissible(reach, &fields.overlap);
        for ((row, col), allowed) in allowed.indexed_iter() {
            let shift = (row as isize - 6, col as isize - 7);
            let sums = sums_at(&subjects[0], &reference, &[1.5], CAP, shift);
            assert_eq!(fields.overlap[[row, col]], sums.overlap);
            let expected = [sums.subject, sums.near[0], sums.hits[0]];
            assert_eq!(fields.counts.each_ref().map(|counts| counts[[row, col]]), expected, "shift {shift:?}");
            if *allowed {
                let values = fields.statistics.each_ref().map(|statistic| statistic[[row, col]]);
                same(values[0], (sums.hits[0] / sums.subject) / (sums.near[0] / sums.overlap), "enrichment");
                same(values[1], sums.far_all / sums.overlap - sums.far_subject / sums.subject, "closeness");
                same(values[2], pearson(&sums.pairs), "correlation");
                checked += 1;
            }
        }
    }
    assert!(checked > 600, "{checked} shifts were checked");
}

#[test]
fn the_whole_comparison_equals_loops() {
    let (mut told, mut refused) = (0, 0);
    for seed in 0..9 {
        let Case { subjects, reference } = case(100 + seed, seed as usize % 3, 3);
        // Such small footprints hold too few independent shifts for a level of .01, but enough for .05.
        let settings = Settings { level: if seed % 2 == 0 { 0.05 } else { 0.01 }, ..settings() };
        let expected = naive_compare(&subjects, &reference, &settings);
        let found = compare(&subjects, &[reference], &settings).unwrap();
        assert_eq!(found.tests.len(), expected.len());
        for (found, expected) in found.tests.iter().zip(&expected) {
            assert_eq!((found.subject, found.measure), (expected.subject, expected.measure));
            let what = format!("seed {seed}, subject {}, {}", found.subject, found.measure);
            same(found.observed, expected.observed, &what);
            same(found.expected, expected.expected, &what);
            same(found.score, expected.score, &what);
            same(found.raw_p, expected.raw_p, &what);
            same(found.raw_p_family, expected.raw_p_family.unwrap_or(f64::NAN), &what);
            same(found.independent_shifts, expected.independent, &what);
            same(found.p.unwrap_or(f64::NAN), expected.p.unwrap_or(f64::NAN), &what);
            same(found.p_family.unwrap_or(f64::NAN), expected.p_family.unwrap_or(f64::NAN), &what);
            assert_eq!(found.shifts, expected.shifts, "{what}");
            told += usize::from(found.p_family.is_some());
            refused += usize::from(found.p.is_none());
        }
    }
    assert!(told >= 20 && refused >= 20, "both outcomes occur: {told} told, {refused} refused");
}

#[test]
fn sums_and_correlations_equal_scipy() {
    // Expected: scipy.signal.correlate2d and scipy.stats.pearsonr; tests/reference/make_shift_reference.py made the file.
    let text = include_str!("data/shift_reference.json");
    let data: serde_json::Value = serde_json::from_str(text).unwrap();
    let size = |name: &str| data[name].as_u64().unwrap() as usize;
    let shape = (size("rows"), size("cols"));
    let reach = Reach { rows: size("up"), cols: size("left") };
    let numbers = |name: &str, shape| {
        let numbers = data[name].as_array().unwrap().iter().map(|value| value.as_f64().unwrap()).collect();
        Array2::from_shape_vec(shape, numbers).unwrap()
    };
    let [f, g, m, a, b, far] =
        ["subject_footprint", "reference_footprint", "members", "a", "b", "distance"].map(|name| numbers(name, shape));
    let engine = Correlator::new(shape, reach);
    let layer = |values: &Array2<f64>| engine.spectrum(|row, col| values[[row, col]]);
    let near = &far.mapv(|far| f64::from(u8::from(far <= 2.0))) * &g;
    let capped = &far.mapv(|far| far.min(3.0)) * &g;
    let [ground, there, moved, close, capped] = [&f, &g, &m, &near, &capped].map(layer);
    let (af, bg) = (&a * &f, &b * &g);
    let (fa, fb) = (layer(&af), layer(&bg));
    let mut checked = 0;
    let mut check = |name: &str, found: &Array2<f64>| {
        for (found, expected) in found.iter().zip(&numbers(name, reach.shape())) {
            assert!((found - expected).abs() < 1e-8, "{name}: {found} against {expected}");
            checked += 1;
        }
    };
    let overlap = engine.counts(&ground, &there);
    check("overlap", &overlap);
    check("subject", &engine.counts(&moved, &there));
    check("near", &engine.counts(&ground, &close));
    check("hits", &engine.counts(&moved, &close));
    check("distance_sum", &engine.sums(&moved, &capped));
    let product = engine.sums(&fa, &fb);
    check("product", &product);
    assert_eq!(checked, 6 * 9 * 11);
    let (aa, bb) = (layer(&(&af * &af)), layer(&(&bg * &bg)));
    let coefficient = correlation(
        &product,
        &Moments { sum: &engine.sums(&fa, &there), square: &engine.sums(&aa, &there) },
        &Moments { sum: &engine.sums(&ground, &fb), square: &engine.sums(&ground, &bb) },
        &overlap,
    );
    let rows = data["pearson"].as_array().unwrap();
    assert_eq!(rows.len(), 7);
    for row in rows {
        let at = |index: usize, half: usize| (row[index].as_i64().unwrap() + half as i64) as usize;
        let found = coefficient[[at(0, reach.rows), at(1, reach.cols)]];
        assert!((found - row[2].as_f64().unwrap()).abs() < 1e-9, "{row}: {found}");
    }
}

#[test]
fn a_tiny_footprint_is_refused() {
    // 5 x 5 cells have a reach of one cell: at most four shifts, so no p below 1/5 could be told.
    let footprint = Array2::from_shape_fn((5, 5), |(row, col)| row + col > 0);
    let members = Some(Array2::from_shape_fn((5, 5), |(row, col)| row == col));
    let distance = Some(Array2::from_shape_fn((5, 5), |(row, col)| row.abs_diff(col) as f64));
    let subject = Subject { footprint: footprint.clone(), members, strength: None };
    let reference = Reference { footprint, distance, strength: None, ..Reference::default() };
    let found = compare(&[subject], &[reference], &settings()).unwrap();
    assert!(found.tests.iter().all(|test| test.shifts <= 4 && test.p.is_none() && test.p_family.is_none()));
    // Three shifts of equal overlap by hand: the largest of three has p = 1/3.
    let null = ShiftNull::new(&array![[0.0, 1.0, 0.5]], &array![[9.0, 9.0, 9.0]], &array![[true, true, true]]).unwrap();
    same(null.p, 1.0 / 3.0, "the largest of three");
}

#[test]
fn inside_an_area_is_tested_as_the_ground_within_nothing() {
    // The same masks, told twice: distances one larger, tested within 1 instead of within 0 and within 1.5 instead of 0.5.
    let Case { subjects, reference } = case(11, 2, 2);
    let far = reference.distance.clone().unwrap();
    let area = Reference { area: true, ..reference.clone() };
    let settings = Settings { within: vec![0.5], ..settings() };
    let found = compare(&subjects, &[area], &settings).unwrap();
    let lifted = Reference { distance: Some(far + 1.0), ..reference };
    let lifted_settings = Settings { within: vec![1.0, 1.5], distance_cap: CAP + 1.0, ..settings };
    let expected = compare(&subjects, &[lifted], &lifted_settings).unwrap();
    assert_eq!(found.family_tests, expected.family_tests);
    let mut inside = 0;
    for (found, expected) in found.tests.iter().zip(&expected.tests) {
        if let (Some(a), Some(b)) = (found.measure.within(), expected.measure.within()) {
            same(a, b - 1.0, "the distance");
            inside += usize::from(a == 0.0);
        }
        assert_eq!(found.p, expected.p);
        assert_eq!(found.p_family, expected.p_family);
        same(found.score, expected.score, "score");
    }
    assert_eq!(inside, 2);
}

#[test]
fn a_reference_meets_only_the_subjects_that_it_is_given() {
    let Case { subjects, reference } = case(12, 0, 3);
    let some = Reference { against: Some(vec![2]), ..reference.clone() };
    let found = compare(&subjects, &[some.clone(), reference.clone()], &settings()).unwrap();
    let every = compare(&subjects, std::slice::from_ref(&reference), &settings()).unwrap();
    let alone = compare(&subjects[2..], std::slice::from_ref(&reference), &settings()).unwrap();
    let of_first: Vec<_> = found.tests.iter().filter(|test| test.reference == 0).collect();
    assert!(of_first.iter().all(|test| test.subject == 2) && of_first.len() == alone.tests.len());
    assert_eq!(found.tests.len(), every.tests.len() + alone.tests.len());
    for (one, other) in of_first.iter().zip(&alone.tests) {
        assert_eq!((one.p, one.observed.to_bits()), (other.p, other.observed.to_bits()));
    }
}

/// Transposes every array of a subject and a reference.
fn transposed(subject: &Subject, reference: &Reference) -> (Subject, Reference) {
    let turn = |layer: &Option<Array2<f64>>| layer.as_ref().map(|layer| layer.t().to_owned());
    let subject = Subject {
        footprint: subject.footprint.t().to_owned(),
        members: subject.members.as_ref().map(|members| members.t().to_owned()),
        strength: turn(&subject.strength),
    };
    let reference = Reference {
        footprint: reference.footprint.t().to_owned(),
        distance: turn(&reference.distance),
        strength: turn(&reference.strength),
        ..Reference::default()
    };
    (subject, reference)
}

fn assert_same_results(found: &Comparison, expected: &Comparison) {
    assert_eq!(found.tests.len(), expected.tests.len());
    for (found, expected) in found.tests.iter().zip(&expected.tests) {
        for (found, expected, what) in [
            (found.observed, expected.observed, "observed"),
            (found.score, expected.score, "score"),
            (found.raw_p, expected.raw_p, "p"),
            (found.raw_p_family, expected.raw_p_family, "family p"),
        ] {
            let near = (found - expected).abs() < 1e-8;
            assert!(near || (found.is_nan() && expected.is_nan()), "{what}: {found} against {expected}");
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, ..ProptestConfig::default() })]

    #[test]
    fn p_lies_above_zero_and_up_to_one(seed in 0u64..1_000_000, kind in 0usize..3) {
        let Case { subjects, reference } = case(seed, kind, 2);
        let found = compare(&subjects, &[reference], &settings()).unwrap();
        for test in &found.tests {
            prop_assert!(test.raw_p > 0.0 && test.raw_p <= 1.0);
            let family = matches!(test.measure, Measure::Enrichment { .. } | Measure::Correlation);
            prop_assert_eq!(family, test.raw_p_family > 0.0 && test.raw_p_family <= 1.0);
            for p in [test.p, test.p_family].into_iter().flatten() {
                prop_assert!(p >= test.smallest_p && p <= 1.0);
            }
            if let (Some(p), Some(adjusted)) = (test.p, test.p_family) {
                prop_assert!(adjusted >= p);
            }
        }
    }

    #[test]
    fn a_displaced_subject_moves_the_peak(seed in 0u64..1_000_000, down in -4isize..=4, right in -4isize..=4) {
        // The subject is the reference's own near ground, moved by (-down, -right): every cell hits at that shift.
        let Case { reference, .. } = case(seed, 0, 1);
        let far = reference.distance.unwrap();
        let near = |row: isize, col: isize| {
            let held = (6..18).contains(&row) && (6..25).contains(&col);
            held && far[[row as usize, col as usize]] <= 1.0
        };
        let reach = Reach { rows: 6, cols: 6 };
        let engine = Correlator::new(SHAPE, reach);
        let one = |value: bool| f64::from(u8::from(value));
        let fixed = engine.spectrum(|row, col| one(near(row as isize, col as isize)));
        let moved = engine.spectrum(|row, col| one(near(row as isize + down, col as isize + right)));
        let hits = engine.counts(&moved, &fixed);
        let peak = hits.indexed_iter().max_by(|a, b| a.1.total_cmp(b.1)).unwrap();
        let all = (6..18).flat_map(|row| (6..25).map(move |col| (row, col))).filter(|(row, col)| near(*row, *col)).count();
        prop_assume!(all > 0);
        prop_assert_eq!(*peak.1, all as f64);
        prop_assert_eq!(peak.0, ((6 + down) as usize, (6 + right) as usize));
    }

    #[test]
    fn scale_and_origin_of_a_strength_do_not_matter(
        seed in 0u64..1_000_000, kind in 0usize..3, factor in 0.01f64..100.0, constant in -50.0f64..50.0,
    ) {
        let Case { mut subjects, reference } = case(seed, kind, 1);
        let plain = compare(&subjects, std::slice::from_ref(&reference), &settings()).unwrap();
        subjects[0].strength.as_mut().unwrap().mapv_inplace(|value| value * factor + constant);
        assert_same_results(&compare(&subjects, &[reference], &settings()).unwrap(), &plain);
    }

    #[test]
    fn rows_and_columns_are_treated_alike(seed in 0u64..1_000_000, kind in 0usize..3) {
        let Case { subjects, reference } = case(seed, kind, 1);
        let (turned, turned_reference) = transposed(&subjects[0], &reference);
        let plain = compare(&subjects, &[reference], &settings()).unwrap();
        assert_same_results(&compare(&[turned], &[turned_reference], &settings()).unwrap(), &plain);
    }

    #[test]
    fn threads_do_not_change_a_bit(seed in 0u64..1_000_000, kind in 0usize..3) {
        let Case { subjects, reference } = case(seed, kind, 3);
        let on = |threads: usize| {
            let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
            // Debug writes the shortest text that reads back to the same bits.
            pool.install(|| format!("{:?}", compare(&subjects, std::slice::from_ref(&reference), &settings()).unwrap()))
        };
        prop_assert_eq!(on(1), on(2));
    }
}

#[test]
fn a_poor_layer_does_not_silence_the_others() {
    // Four slices on a full square keep to the lines; a fifth exists in a corner only. Alone, the four are found; beside the
    // fifth they must be found too, with their p-values at most doubled (Bonferroni over two parts).
    let side = 96;
    let full = Array2::from_elem((side, side), true);
    let wave = |row: usize, col: usize| (row as f64 * 0.31).sin() * 4.0 + (col as f64 * 0.13).cos() * 5.0;
    let distance = Array2::from_shape_fn((side, side), |(row, col)| {
        let phase = (col as f64 + wave(row, col)).rem_euclid(24.0);
        phase.min(24.0 - phase)
    });
    let near = |at: (usize, usize), seed: usize| {
        distance[at] < 2.0 && (at.0 * 7 + at.1 * 13 + seed * 5) % 11 < 6
            || (at.0 * 31 + at.1 * 17 + seed * 3).is_multiple_of(29)
    };
    let slices: Vec<Subject> = (0..4)
        .map(|seed| Subject {
            footprint: full.clone(),
            members: Some(Array2::from_shape_fn((side, side), |at| near(at, seed))),
            strength: None,
        })
        .collect();
    let corner = Array2::from_shape_fn((side, side), |(row, col)| row < 40 && col < 40);
    let poor = Subject { footprint: corner, ..slices[0].clone() };
    let reference =
        Reference { footprint: full, distance: Some(distance.clone()), strength: None, ..Reference::default() };
    let settings = Settings { within: vec![2.0], profile: vec![], distance_cap: 8.0, level: 0.05 };
    let alone = compare(&slices, std::slice::from_ref(&reference), &settings).unwrap();
    let beside = compare(&[slices, vec![poor]].concat(), &[reference], &settings).unwrap();
    assert_eq!((alone.family_parts, beside.family_parts), (1, 2));
    let mut found = 0;
    for (alone, beside) in alone.tests.iter().zip(&beside.tests).filter(|(test, _)| test.p_family.is_some()) {
        assert!((beside.raw_p_family - (2.0 * alone.raw_p_family).min(1.0)).abs() < 1e-12);
        assert!(beside.p_family.unwrap() <= 2.0 * alone.p_family.unwrap() + 1e-12);
        found += usize::from(beside.p_family.unwrap() <= 0.05);
    }
    assert_eq!(found, 4, "every slice is found beside the poor one");
}
