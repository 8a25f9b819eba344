//! The command line: `stageleaf check`, `new`, `page`, `explain`, `embed`.

use std::{env, process::ExitCode};

fn main() -> ExitCode {
    stageleaf::cli::run(env::args_os())
}
