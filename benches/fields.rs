//! How fast the transforms of a field are and how much memory they take.
//!
//! `cargo bench --bench fields` first takes a gravity grid of 4096 x 4096 cells through preparation, gradient, tilt and
//! contacts (asked: 12 s and 1.5 GB on two threads). Of a grid of 2048 x 2048 cells it then fills a quarter, and compares
//! gradient, vertical derivative and tilt with the same in numpy and scipy (`benches/peer/fields_peer.py`; needs python3
//! with both) and with the raw cost of the same one-dimensional transforms. Best of three. Two threads everywhere.

use std::process::Command;
use std::time::Instant;

use ndarray::Array2;
use rayon::prelude::*;
use rustfft::num_complex::Complex64;
use salband::contact::{ContactSettings, find_contacts};
use salband::field::{PreparedField, fill_gaps};
use salband::grid::{Frame, Grid};

const LARGE: usize = 4096;
const SIDE: usize = 2048;
/// The side after padding, twice the layer's.
const PADDED: usize = 2 * SIDE;
const THREADS: usize = 2;
const MOST_SECONDS: f64 = 12.0;
const MOST_MEGABYTES: f64 = 1500.0;

type Failure = Box<dyn std::error::Error>;

fn main() -> Result<(), Failure> {
    rayon::ThreadPoolBuilder::new().num_threads(THREADS).build_global()?;
    let large = layer(LARGE)?;
    let began = Instant::now();
    let lap =
        |what: &str| println!("  {what:<22} {:7.3} s, peak so far {:6.0} MB", began.elapsed().as_secs_f64(), peak());
    println!("{LARGE} x {LARGE} cells");
    let field = PreparedField::new(&large)?;
    lap("prepared");
    let gradient = field.gradient(0.0)?;
    lap("gradient");
    let tilt = gradient.tilt();
    lap("tilt");
    let contacts = find_contacts(&gradient, &ContactSettings::new(0.6, 0.3, 10_000.0)?)?;
    lap("contacts");
    let (seconds, memory) = (began.elapsed().as_secs_f64(), peak());
    println!("  {} contacts, tilt {:.3} in the first cell", contacts.len(), tilt[[0, 0]]);
    drop((large, field, gradient, tilt, contacts));

    let grid = layer(SIDE)?;
    let ours = best(|| {
        let gradient = PreparedField::new(&grid)?.gradient(0.0)?;
        Ok(gradient.tilt()[[0, 0]] + gradient.down()[[0, 0]])
    })?;
    let holed = with_gaps(&grid);
    let missing = holed.iter().filter(|value| value.is_nan()).count() as f64 / holed.len() as f64;
    let filled = best(|| Ok(fill_gaps(&holed)?[[0, 0]]))?;
    let field = PreparedField::new(&grid)?;
    let prepared = best(|| Ok(PreparedField::new(&grid)?.footprint().count() as f64))?;
    let products = best(|| Ok(field.gradient(0.0)?.down()[[0, 0]]))?;
    let raw = best(|| raw_transforms(1, 3))?;
    println!("{SIDE} x {SIDE} cells");
    println!("  filling {:.0} % of it {filled:.3} s", 100.0 * missing);
    println!("  preparation {prepared:.3} s, gradient {products:.3} s, both and tilt {ours:.3} s");
    println!(
        "  the same transforms alone {raw:.3} s: preparation and gradient take {:.2} times that",
        (prepared + products) / raw
    );
    let script = concat!(env!("CARGO_MANIFEST_DIR"), "/benches/peer/fields_peer.py");
    let arguments = [SIDE, PADDED, THREADS].map(|number| number.to_string());
    let output = Command::new("python3").arg(script).args(arguments).output()?;
    if !output.status.success() {
        return Err(format!("the peer failed: {}", String::from_utf8_lossy(&output.stderr)).into());
    }
    let text = String::from_utf8(output.stdout)?;
    let seconds_of_peer: f64 = text.trim().strip_prefix("s=").ok_or("the peer told no time")?.parse()?;
    println!("  peer {seconds_of_peer:.3} s: ours is {:.1} times as fast", seconds_of_peer / ours);
    println!(
        "whole of {LARGE} x {LARGE}: {seconds:.2} s (asked: {MOST_SECONDS}), {memory:.0} MB (asked: {MOST_MEGABYTES})"
    );
    if seconds > MOST_SECONDS || memory > MOST_MEGABYTES || seconds_of_peer < ours {
        return Err("slower or larger than asked".into());
    }
    Ok(())
}

/// Gravity of a dozen bodies, mGal, on cells of 250 m; the same numbers as the peer's.
fn layer(side: usize) -> Result<Grid, Failure> {
    let size = side as f64;
    let bodies: Vec<(f64, f64, f64, f64)> = (0..12)
        .map(|number| {
            let middle = (f64::from(number * 37 % 97) / 97.0 * size, f64::from(number * 61 % 89) / 89.0 * size);
            (middle.0, middle.1, (0.02 + 0.004 * f64::from(number)) * size, f64::from(30 - 4 * number))
        })
        .collect();
    let values = Array2::from_shape_fn((side, side), |(row, col)| {
        let one = |&(r, c, depth, height): &(f64, f64, f64, f64)| {
            let far = ((row as f64 - r).powi(2) + (col as f64 - c).powi(2)) / (depth * depth);
            height / ((1.0 + far) * (1.0 + far).sqrt())
        };
        bodies.iter().map(one).sum()
    });
    Ok(Grid::new(Frame::local(250.0, side, side)?, values)?)
}

/// The values without a ragged corner and without many small blobs.
fn with_gaps(grid: &Grid) -> Array2<f64> {
    let side = grid.frame().rows as f64;
    let mut values = grid.values().clone();
    for ((row, col), value) in values.indexed_iter_mut() {
        let (x, y) = (col as f64, row as f64);
        let blob = (x / 23.0).sin() * (y / 31.0).cos() + (x / 57.0 + y / 71.0).sin() > 1.2;
        if blob || x + y + 60.0 * (x / 40.0).sin() < 0.6 * side {
            *value = f64::NAN;
        }
    }
    values
}

/// As many one-dimensional transforms of the same lengths as `forwards` and `inverses` of the padded layer need, without
/// padding, turning or filters.
fn raw_transforms(forwards: usize, inverses: usize) -> Result<f64, Failure> {
    let mut real = realfft::RealFftPlanner::<f64>::new();
    let (forward, inverse) = (real.plan_fft_forward(PADDED), real.plan_fft_inverse(PADDED));
    let mut planner = rustfft::FftPlanner::<f64>::new();
    let (down, up) = (planner.plan_fft_forward(PADDED), planner.plan_fft_inverse(PADDED));
    let half = PADDED / 2 + 1;
    // Forward: every padded row. Back: only the rows of the layer. Columns: every one, both ways.
    let rows = forwards * PADDED + inverses * SIDE;
    let checks: Vec<f64> = (0..rows + (forwards + inverses) * half)
        .into_par_iter()
        .map_init(
            || {
                let length = down.get_inplace_scratch_len().max(up.get_inplace_scratch_len());
                let length = length.max(forward.get_scratch_len()).max(inverse.get_scratch_len());
                let column = vec![Complex64::new(1.0, 0.0); PADDED];
                (vec![1.0; PADDED], forward.make_output_vec(), column, vec![Complex64::default(); length])
            },
            |(row, line, column, scratch), number| {
                // The numbers do not matter, so long as they stay finite; the ends of a half spectrum must be real.
                let done = if number < forwards * PADDED {
                    row.fill(1.0);
                    forward.process_with_scratch(row, line, scratch)
                } else if number < rows {
                    line.fill(Complex64::new(1.0, 0.0));
                    inverse.process_with_scratch(line, row, scratch)
                } else {
                    column.fill(Complex64::new(1.0, 0.0));
                    let which = if number - rows < forwards * half { &down } else { &up };
                    which.process_with_scratch(column, scratch);
                    Ok(())
                };
                assert!(done.is_ok());
                row[0] + line[0].re + column[0].re
            },
        )
        .collect();
    Ok(checks.iter().sum())
}

/// Seconds of the fastest of three runs.
fn best(run: impl Fn() -> Result<f64, Failure>) -> Result<f64, Failure> {
    let mut fastest = f64::INFINITY;
    for _ in 0..3 {
        let began = Instant::now();
        std::hint::black_box(run()?);
        fastest = fastest.min(began.elapsed().as_secs_f64());
    }
    Ok(fastest)
}

/// The most memory that the process has held, MB; 0 where the system does not tell.
fn peak() -> f64 {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"));
    let kilobytes = line.and_then(|line| line.split_whitespace().next()?.parse::<f64>().ok());
    kilobytes.unwrap_or(0.0) * 1024.0 / 1e6
}
