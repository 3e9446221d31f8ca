//! How fast the shift engine is, against what a practitioner would write in numpy and scipy.
//!
//! `cargo bench --bench engine` runs the peer `benches/peer/shift_peer.py` both ways (needs python3 with numpy and
//! scipy), then the same sums and statistics here: enrichment within five distances and capped mean distance, for ten
//! slices of 512 x 512 cells on one footprint, at every shift up to a quarter of the side, on two threads. The whole of
//! `compare` (nulls, independent shifts, the family) is timed beside it: the peer does none of that. Best of several.

use std::process::Command;
use std::time::Instant;

use ndarray::Array2;
use rayon::prelude::*;
use salband::coincidence::{Correlator, Reach, Reference, Settings, Subject, closeness, compare, enrichment};

#[path = "../tests/calibration/fields.rs"]
mod fields;

const SIDE: usize = 512;
const SLICES: usize = 10;
const CAP: f64 = 8.0;
const WITHIN: [f64; 5] = [1.0, 2.0, 3.0, 4.0, 5.0];
const REPEATS: usize = 9;

/// What is asked: this many times as fast as the peer, every shift here against what it does in each mode.
const ASKED: [(&str, f64); 2] = [("fft", 6.0), ("loop", 100.0)];

type Failure = Box<dyn std::error::Error>;

fn main() -> Result<(), Failure> {
    rayon::ThreadPoolBuilder::new().num_threads(2).build_global()?;
    let footprint = Array2::from_shape_fn((SIDE, SIDE), |(row, col)| row >= SIDE / 4 || col < SIDE / 2);
    let [gravity, _] = fields::pair(1, (SIDE, SIDE), 20.0, fields::Smoothness::Twice);
    let far = fields::distance(&fields::crests(&fields::gradient(&gravity), &footprint));
    let slices = (0..SLICES as u64).map(|depth| {
        let [slice, _] = fields::pair(10 + depth, (SIDE, SIDE), 8.0, fields::Smoothness::Once);
        fields::highest(&slice, &footprint, 0.2)
    });
    let slices: Vec<Array2<bool>> = slices.collect();
    let sums = best(REPEATS, || every_statistic(&footprint, &far, &slices));
    let transforms = best(REPEATS, || transforms_alone(&footprint));
    let subjects = slices.iter().map(|slice| Subject {
        footprint: footprint.clone(),
        members: Some(slice.clone()),
        strength: None,
    });
    let subjects: Vec<Subject> = subjects.collect();
    let reference = [Reference { footprint, distance: Some(far), strength: None, ..Reference::default() }];
    let settings = Settings { within: WITHIN.to_vec(), profile: vec![], distance_cap: CAP, level: 0.05 };
    let whole = best(REPEATS, || compare(&subjects, &reference, &settings).map(|found| found.family_tests));
    println!("sums and statistics  {sums:.4} s, of which the transforms alone {transforms:.4} s");
    println!("the whole comparison {whole:.4} s");
    println!("peak memory          {}", peak_memory()?);
    let mut missed = false;
    for (mode, asked) in ASKED {
        let repeats = if mode == "fft" { 5 } else { 1 };
        let runs: Vec<f64> = (0..repeats).map(|_| peer(mode)).collect::<Result<_, _>>()?;
        let seconds = runs.into_iter().fold(f64::INFINITY, f64::min);
        let ratio = seconds / sums;
        missed |= ratio < asked;
        println!(
            "peer, {mode:<4}           {seconds:.3} s: the sums are {ratio:.1} times as fast (asked: {asked}), the whole {:.1} times",
            seconds / whole
        );
    }
    if missed { Err("the engine is slower than asked".into()) } else { Ok(()) }
}

/// The sums and statistics that the peer computes; returns one number of them, so that none is optimised away.
fn every_statistic(footprint: &Array2<bool>, far: &Array2<f64>, slices: &[Array2<bool>]) -> f64 {
    let engine = Correlator::new((SIDE, SIDE), Reach::of_box(SIDE, SIDE));
    let one = |mask: &Array2<bool>| engine.spectrum(|row, col| f64::from(u8::from(mask[[row, col]])));
    let ground = one(footprint);
    let masks = engine.masks(1 + WITHIN.len(), |mask, row, col| {
        footprint[[row, col]] && (mask == 0 || far[[row, col]] <= WITHIN[mask - 1])
    });
    let distance = engine.spectrum(|row, col| if footprint[[row, col]] { far[[row, col]].min(CAP) } else { 0.0 });
    let all = engine.counts_of(&ground, &masks);
    let all_far = engine.sums(&ground, &distance);
    let statistics: Vec<Vec<Array2<f64>>> = slices
        .par_iter()
        .map(|slice| {
            let moved = one(slice);
            let hits = engine.counts_of(&moved, &masks);
            let mut statistics: Vec<Array2<f64>> =
                (1..hits.len()).map(|number| enrichment(&hits[number], &hits[0], &all[number], &all[0])).collect();
            statistics.push(closeness(&engine.sums(&moved, &distance), &hits[0], &all_far, &all[0]));
            statistics
        })
        .collect();
    statistics.iter().flatten().map(|statistic| statistic[[0, 0]]).sum()
}

/// As many transforms of the same size, without the filling in, the products and the statistics.
fn transforms_alone(footprint: &Array2<bool>) -> f64 {
    let reach = Reach::of_box(SIDE, SIDE);
    let (rows, cols) = (SIDE + reach.rows, SIDE + reach.cols);
    let mut real = realfft::RealFftPlanner::<f64>::new();
    let (forward, inverse) = (real.plan_fft_forward(cols), real.plan_fft_inverse(cols));
    let mut planner = rustfft::FftPlanner::<f64>::new();
    let (down, up) = (planner.plan_fft_forward(rows), planner.plan_fft_inverse(rows));
    // Reference: footprint, three pairs of masks, distance; each slice one forward. Inverse: four for the ground and
    // for each slice.
    let (forwards, inverses) = (5 + SLICES, 4 * (1 + SLICES));
    let half = cols / 2 + 1;
    let work = |number: usize| {
        let mut column = vec![rustfft::num_complex::Complex64::new(1.0, 0.0); rows];
        let mut line = forward.make_output_vec();
        let mut row: Vec<f64> = (0..cols).map(|col| f64::from(u8::from(footprint[[0, col % SIDE]]))).collect();
        let backwards = number >= forwards;
        let mut scratch = vec![
            Default::default();
            down.get_inplace_scratch_len()
                .max(up.get_inplace_scratch_len())
                .max(forward.get_scratch_len())
                .max(inverse.get_scratch_len())
        ];
        for _ in 0..half {
            if backwards { &up } else { &down }.process_with_scratch(&mut column, &mut scratch);
            column.iter_mut().for_each(|value| *value /= rows as f64);
        }
        for _ in 0..if backwards { 2 * reach.rows + 1 } else { SIDE } {
            // The numbers do not matter; the ends of a half spectrum must be real.
            let done = if backwards {
                line[0].im = 0.0;
                line[half - 1].im = 0.0;
                inverse.process_with_scratch(&mut line, &mut row, &mut scratch)
            } else {
                forward.process_with_scratch(&mut row, &mut line, &mut scratch)
            };
            assert!(done.is_ok());
            line.iter_mut().for_each(|value| *value = rustfft::num_complex::Complex64::new(1.0, 0.0));
            row.iter_mut().for_each(|value| *value = 1.0);
        }
        column[0].re + row[0]
    };
    let sums: Vec<f64> = (0..forwards + inverses).into_par_iter().map(work).collect();
    sums.iter().sum()
}

/// Seconds of the fastest of several runs.
fn best<T>(repeats: usize, run: impl Fn() -> T) -> f64 {
    let time = |_| {
        let began = Instant::now();
        std::hint::black_box(run());
        began.elapsed().as_secs_f64()
    };
    (0..repeats).map(time).fold(f64::INFINITY, f64::min)
}

/// Seconds that the peer reports of its own computation.
fn peer(mode: &str) -> Result<f64, Failure> {
    let script = concat!(env!("CARGO_MANIFEST_DIR"), "/benches/peer/shift_peer.py");
    let output = Command::new("python3").args([script, &SIDE.to_string(), &SLICES.to_string(), mode]).output()?;
    if !output.status.success() {
        return Err(format!("the peer failed: {}", String::from_utf8_lossy(&output.stderr)).into());
    }
    let text = String::from_utf8(output.stdout)?;
    let seconds = text.split_whitespace().find_map(|word| word.strip_prefix("s="));
    Ok(seconds.ok_or("the peer told no time")?.parse()?)
}

fn peak_memory() -> Result<String, Failure> {
    let status = std::fs::read_to_string("/proc/self/status")?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"));
    Ok(line.ok_or("no VmHWM in /proc/self/status")?.trim().to_owned())
}
