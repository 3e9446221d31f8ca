//! The level of every test, measured in full: `cargo bench --bench calibrate -- FILE [REPLICATES]`.
//!
//! Writes a table in Markdown between the markers `<!-- calibration:begin -->` and `<!-- calibration:end -->` of FILE
//! (which is made if it does not exist). 400 replicates of each cell take a few minutes on two cores.

use std::fmt::Write;
use std::path::PathBuf;
use std::time::Instant;

use ndarray::Array2;
use rayon::prelude::*;

#[path = "../tests/calibration/mod.rs"]
mod calibration;

use calibration::fields::{Smoothness, highest, pair};
use calibration::{Layers, Outcome, bent, square, trial_over};

const SIDE: usize = 128;
const LENGTHS: [f64; 4] = [3.0, 6.0, 12.0, 20.0];
const BEGIN: &str = "<!-- calibration:begin -->";
const END: &str = "<!-- calibration:end -->";

fn main() -> Result<(), Box<dyn std::error::Error>> {
    // cargo passes --bench of its own.
    let words: Vec<String> = std::env::args().skip(1).filter(|word| !word.starts_with("--")).collect();
    let file = PathBuf::from(words.first().map_or("target/calibration.md", String::as_str));
    let replicates: u64 = words.get(1).map_or(Ok(400), |word| word.parse())?;
    let began = Instant::now();
    let alone = |name, footprint: Array2<bool>| (name, footprint.clone(), footprint);
    let squares = [
        alone("full square", square(SIDE)),
        alone("bent L", bent(SIDE)),
        alone("ragged, with holes", ragged(SIDE)),
        ("ragged, over a full grid", ragged(SIDE), square(SIDE)),
    ];
    let strip = [alone("64 x 256 strip", elongated(SIDE))];
    let mut table = heading();
    let mut all: Vec<Outcome> = Vec::new();
    for footprints in [squares.as_slice(), strip.as_slice()] {
        let shape = footprints[0].1.dim();
        for length in LENGTHS {
            let outcomes: Vec<Vec<Outcome>> = (0..replicates)
                .into_par_iter()
                .map(|seed| {
                    let layers = Layers::independent(seed, shape, length);
                    footprints.iter().map(|(_, footprint, wide)| trial_over(&layers, footprint, wide)).collect()
                })
                .collect::<Result<_, _>>()?;
            for (number, (name, ..)) in footprints.iter().enumerate() {
                let cell: Vec<&Outcome> = outcomes.iter().map(|trial| &trial[number]).collect();
                writeln!(table, "{}", line(name, length, &cell))?;
            }
            all.extend(outcomes.into_iter().flatten());
        }
    }
    let text = format!(
        "{BEGIN}\n{table}\n{}\n{replicates} replicates of each line; {:.0} s. A rate of .05 has a standard error of {:.3}, one of .01 of {:.3}.\n{END}",
        by_independent_shifts(&all),
        began.elapsed().as_secs_f64(),
        (0.05f64 * 0.95 / replicates as f64).sqrt(),
        (0.01f64 * 0.99 / replicates as f64).sqrt(),
    );
    println!("{text}");
    let old = if file.exists() { std::fs::read_to_string(&file)? } else { String::new() };
    let new = match (old.find(BEGIN), old.find(END)) {
        (Some(begin), Some(end)) if begin < end => format!("{}{text}{}", &old[..begin], &old[end + END.len()..]),
        _ => format!("{old}{text}\n"),
    };
    std::fs::write(&file, new)?;
    Ok(())
}

/// A ragged footprint of 60 % of the square, with bays and holes: the higher part of a smooth field.
fn ragged(side: usize) -> Array2<bool> {
    let [field, _] = pair(60, (side, side), side as f64 / 10.0, Smoothness::Twice);
    highest(&field, &square(side), 0.6)
}

/// A strip four times as long as wide, with the cells of the square.
fn elongated(side: usize) -> Array2<bool> {
    Array2::from_elem((side / 2, 2 * side), true)
}

fn heading() -> String {
    let columns = [
        "footprint",
        "L",
        "enrichment .05",
        ".01",
        "mean distance .05",
        ".01",
        "plain mean distance .05",
        ".01",
        "correlation .05",
        ".01",
        "family .05",
        "independent shifts: enrichment",
        "correlation",
        "wrong: no short shifts .05",
        ".01",
        "wrong: least p of 5 slices .05",
    ];
    format!("| {} |\n|{}\n", columns.join(" | "), " --- |".repeat(columns.len()))
}

fn line(name: &str, length: f64, cell: &[&Outcome]) -> String {
    let count = cell.len() as f64;
    let share = |holds: &dyn Fn(&Outcome) -> bool| cell.iter().filter(|outcome| holds(outcome)).count() as f64 / count;
    let mut rates = Vec::new();
    for measure in 0..4 {
        for level in [0.05, 0.01] {
            rates.push(share(&|outcome| outcome.p[measure] <= level));
        }
    }
    rates.push(share(&|outcome| outcome.family <= 0.05));
    rates.push(share(&|outcome| outcome.without_short[0] <= 0.05));
    rates.push(share(&|outcome| outcome.without_short[0] <= 0.01));
    rates.push(share(&|outcome| outcome.smallest_over_slices <= 0.05));
    let mut told: Vec<String> = rates.iter().map(|rate| short(*rate)).collect();
    for measure in [1, 0] {
        let mut numbers: Vec<f64> = cell.iter().map(|outcome| outcome.independent[measure]).collect();
        numbers.sort_by(f64::total_cmp);
        told.insert(9, format!("{:.0}", numbers[numbers.len() / 2]));
    }
    format!("| {name} | {length} | {} |", told.join(" | "))
}

/// A rate without its leading zero.
fn short(rate: f64) -> String {
    format!("{rate:.3}").replacen("0.", ".", 1)
}

/// All lines pooled, sorted by how many independent shifts the footprint held: does the level depend on it?
fn by_independent_shifts(all: &[Outcome]) -> String {
    let mut table = String::from(
        "| independent shifts | enrichment: replicates | .05 | .01 | correlation: replicates | .05 | .01 |\n\
         | --- | --- | --- | --- | --- | --- | --- |\n",
    );
    for (low, high) in
        [(0.0, 2.0), (2.0, 3.0), (3.0, 5.0), (5.0, 10.0), (10.0, 19.0), (19.0, 50.0), (50.0, f64::INFINITY)]
    {
        let mut cells = vec![format!("{low} to {high}").replace("to inf", "and more")];
        for (measure, p) in [(0, 0), (1, 3)] {
            let band = |outcome: &&Outcome| (low..high).contains(&outcome.independent[measure]);
            let count = all.iter().filter(band).count();
            cells.push(count.to_string());
            for level in [0.05, 0.01] {
                let found = all.iter().filter(band).filter(|outcome| outcome.p[p] <= level).count();
                cells.push(if count == 0 { "-".into() } else { short(found as f64 / count as f64) });
            }
        }
        // Writing to a String cannot fail.
        let _ = writeln!(table, "| {} |", cells.join(" | "));
    }
    table
}
