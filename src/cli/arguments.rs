//! The command line as the user types it.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};

/// Do the conductors follow the margins? Tests conductivity slices against gravity and magnetic contacts.
#[derive(Debug, Parser)]
#[command(name = "salband", version, about, max_term_width = 100)]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Run the whole job on the invented survey that comes with the source
    Demo {
        /// Folder of the demonstration grids
        #[arg(long, value_name = "DIR")]
        grids: Option<PathBuf>,
        #[command(flatten)]
        output: Output,
    },
    /// Write a commented study file from the files named
    New(NewStudy),
    /// Say what a file holds and how it would be read
    Inspect {
        /// A raster, or a vector file with lines
        file: PathBuf,
        /// The variable, for files that hold several
        #[arg(long)]
        variable: Option<String>,
        /// Coordinate system, if the file has none
        #[arg(long)]
        crs: Option<String>,
    },
    /// Derive one product of one raster: a derivative, a continuation, a reduction; alone it lists them all
    Derive(Derive),
    /// Check a study and print the plan: frame, resampling, tests, cost
    Check {
        /// The study file
        study: PathBuf,
    },
    /// Run a study and write the evidence
    Run {
        /// The study file
        study: PathBuf,
        #[command(flatten)]
        output: Output,
    },
}

#[derive(Debug, Args)]
pub(super) struct Output {
    /// Folder to write; made whole or not at all
    #[arg(long, value_name = "DIR")]
    pub out: PathBuf,
    /// Replace the folder if an earlier run wrote it
    #[arg(long)]
    pub replace: bool,
    /// Threads to use; the result is the same for any number [default: all cores]
    #[arg(long, value_name = "N")]
    pub threads: Option<usize>,
}

#[derive(Debug, Args)]
pub(super) struct Derive {
    /// The transform; leave everything out to see them all
    #[arg(requires = "raster")]
    pub transform: Option<String>,
    /// The raster
    #[arg(requires = "out")]
    pub raster: Option<PathBuf>,
    /// The GeoTIFF to write; made whole or not at all
    #[arg(long, value_name = "FILE")]
    pub out: Option<PathBuf>,
    /// A parameter of the transform, such as height=1000; may be given again
    #[arg(long, value_name = "NAME=NUMBER")]
    pub with: Vec<String>,
    /// The band, counted from 1
    #[arg(long, value_name = "N", default_value_t = 1)]
    pub band: usize,
    /// The variable, for files that hold several
    #[arg(long)]
    pub variable: Option<String>,
    /// Coordinate system, if the file has none
    #[arg(long)]
    pub crs: Option<String>,
    /// Unit of the raster's values, such as mGal or nT [default: as the file states]
    #[arg(long)]
    pub unit: Option<String>,
    /// A projected system to place the raster on first [default: its own]
    #[arg(long, value_name = "CRS")]
    pub onto: Option<String>,
    /// Side of a cell to place the raster on, m [default: its own]
    #[arg(long, value_name = "METRES")]
    pub cell: Option<f64>,
    /// Replace the file if it exists
    #[arg(long)]
    pub replace: bool,
}

#[derive(Debug, Args)]
pub(super) struct NewStudy {
    /// The study file to write
    pub study: PathBuf,
    /// Conductivity or resistivity slices, or one file with a depth axis
    #[arg(long, value_name = "FILE", num_args = 1.., required = true)]
    pub conductivity: Vec<PathBuf>,
    /// Gravity grids
    #[arg(long, value_name = "FILE", num_args = 1..)]
    pub gravity: Vec<PathBuf>,
    /// Grids of the total-field magnetic anomaly
    #[arg(long, value_name = "FILE", num_args = 1..)]
    pub magnetic: Vec<PathBuf>,
    /// Vector files with mapped lines
    #[arg(long, value_name = "FILE", num_args = 1..)]
    pub lines: Vec<PathBuf>,
    /// Vector files with mapped units (polygons)
    #[arg(long, value_name = "FILE", num_args = 1..)]
    pub units: Vec<PathBuf>,
    /// A table of known deposits (CSV)
    #[arg(long, value_name = "FILE")]
    pub deposits: Option<PathBuf>,
    /// Replace the study file if it exists
    #[arg(long)]
    pub replace: bool,
}
