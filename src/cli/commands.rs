//! What each command does.

use std::io::Write;
use std::path::{Path, PathBuf};

use super::arguments::{Arguments, Command, Output};
use super::progress::Bars;
use super::{derive, inspect, new};
use crate::error::{Error, Result};
use crate::study::{Plan, RunOptions, Study, run_and_publish};

pub(super) fn run(arguments: Arguments) -> Result<()> {
    match arguments.command {
        Command::Demo { grids, output } => execute(&demo_study(grids)?, &output),
        Command::New(choice) => new::write(&choice),
        Command::Inspect { file, variable, crs } => inspect::print(&file, variable, crs),
        Command::Derive(choice) => derive::run(choice),
        Command::Check { study } => {
            let plan = Plan::make(Study::read(&study)?)?;
            say(&format!("{}\n{}", plan.describe(), plan.describe_footprints()?))
        }
        Command::Run { study, output } => execute(&study, &output),
    }
}

/// The study of the demonstration: beside the working folder, or in the source that the program was built from.
fn demo_study(grids: Option<PathBuf>) -> Result<PathBuf> {
    let places = match grids {
        Some(folder) => vec![folder],
        None => vec![PathBuf::from("demo-grids"), Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-grids")],
    };
    let studies = places.iter().map(|folder| folder.join("study.toml"));
    studies.into_iter().find(|study| study.exists()).ok_or_else(|| {
        Error::input("the demonstration grids")
            .found(format!("no study.toml in {}", places[0].display()))
            .wanted("the folder demo-grids of the source")
            .mend("run from the source folder, or name it with --grids")
    })
}

fn execute(study: &Path, output: &Output) -> Result<()> {
    let threads = match output.threads {
        Some(0) => return Err(Error::input("--threads").found("0").wanted("1 or more")),
        Some(threads) => threads,
        None => std::thread::available_parallelism().map_or(1, usize::from),
    };
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build_global()
        .map_err(|source| Error::ours("starting the threads").because(source))?;
    let options = RunOptions { out: output.out.clone(), replace: output.replace, threads };
    let answer = run_and_publish(study, &options, &Bars::new())?;
    say(&format!(
        "{answer}\nPage: {}\nTables: {}",
        output.out.join("report.html").display(),
        output.out.join("tables").display()
    ))
}

/// Prints text on standard output. A reader that has gone away (`| head`) is no error of anyone's.
pub(super) fn say(text: &str) -> Result<()> {
    match writeln!(std::io::stdout(), "{text}") {
        Err(source) if source.kind() != std::io::ErrorKind::BrokenPipe => {
            Err(Error::ours("writing to standard output").because(source))
        }
        _ => Ok(()),
    }
}
