//! The program: a thin front on the library.

use std::process::ExitCode;

fn main() -> ExitCode {
    salband::cli::main()
}
