//! Commands, progress and exit codes: the front that a terminal sees.

mod arguments;
mod commands;
mod derive;
mod inspect;
mod new;
mod progress;

use std::process::ExitCode;

use clap::Parser;

use crate::error::{Error, Fault};
use arguments::Arguments;

/// Runs the program: 0 when all went well, 2 when the user has something to mend, 1 for a defect of ours.
pub fn main() -> ExitCode {
    // Clap itself exits with 2 on a wrong command line, which is the user's to mend as well.
    match commands::run(Arguments::parse()) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("salband: {error}");
            ExitCode::from(exit_code(&error))
        }
    }
}

fn exit_code(error: &Error) -> u8 {
    match error.fault() {
        Fault::User => 2,
        Fault::Ours => 1,
    }
}
