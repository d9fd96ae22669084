//! Parses the command line and dispatches.
#![forbid(unsafe_code)]

use std::process::ExitCode;

use clap::Parser;
use tautline::command::{self, Arguments};

fn main() -> ExitCode {
    match command::run(Arguments::parse()) {
        Ok(()) => ExitCode::SUCCESS,
        Err(failure) => {
            eprintln!("tautline: {failure}");
            ExitCode::from(2)
        }
    }
}
