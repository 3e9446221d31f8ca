//! Makes the files of an invented survey, "Brindle Plain", from one seed: the same bytes on every run.
//!
//! `cargo run --release --example make_demo_grids -- OUT_DIR`

#![warn(missing_docs)]

mod bodies;
mod canvas;
mod layout;
mod placing;
mod pods;
mod prism;
mod random;
mod sanity;
mod survey;
mod texts;
mod truth;
mod truth_json;
mod world;
mod write;

use bodies::gravity_margins;
use std::error::Error;
use std::fs;
use std::path::Path;

/// The seed of everything that is drawn by lot.
const SEED: u64 = 20260401;

fn main() -> Result<(), Box<dyn Error>> {
    let mut arguments = std::env::args_os().skip(1);
    let (Some(out), None) = (arguments.next(), arguments.next()) else {
        return Err("usage: make_demo_grids OUT_DIR".into());
    };
    let out = Path::new(&out);
    fs::create_dir_all(out)?;

    let bodies = placing::bodies(SEED);
    let world = world::build(SEED, &bodies);
    let crests = survey::write_gravity(out, &bodies, SEED)?;
    survey::write_magnetics(out, &bodies, SEED)?;
    survey::write_slices(out, &world)?;
    survey::write_volume(out, &world)?;
    survey::write_cover(out, &world)?;
    let deposits = survey::deposits(&world, SEED);
    fs::write(out.join("deposits.csv"), survey::deposits_csv(&deposits)?)?;

    let check = sanity::check(&world, &gravity_margins(&bodies), &crests);
    let table = truth::check_table(&check);
    let truth = truth::Truth { seed: SEED, bodies: &bodies, world: &world, deposits: &deposits, check: &check };
    fs::write(out.join("truth.md"), truth.words())?;
    fs::write(out.join("truth.json"), truth.json())?;
    fs::write(out.join("study.toml"), texts::study(SEED))?;
    fs::write(out.join("README.md"), texts::README)?;

    println!("{table}");
    list_files(out)
}

/// Prints the name and size of every file in a folder.
fn list_files(folder: &Path) -> Result<(), Box<dyn Error>> {
    let mut files = Vec::new();
    for entry in fs::read_dir(folder)? {
        let entry = entry?;
        files.push((entry.file_name().to_string_lossy().into_owned(), entry.metadata()?.len()));
    }
    files.sort();
    let total: u64 = files.iter().map(|(_, size)| size).sum();
    for (name, size) in files {
        println!("{size:>9} bytes  {name}");
    }
    println!("{total:>9} bytes  in all");
    Ok(())
}
