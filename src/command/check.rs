//! `tautline check`.

use std::{
    io::{ErrorKind, Write, stdout},
    path::PathBuf,
};

use clap::Args;

use super::Failure;
use crate::{config::Config, report::check::Understood};

/// Options of `check`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
}

/// Prints what the configuration says.
pub fn run(options: &Options) -> Result<(), Failure> {
    let config = Config::load(&options.config)?;
    match write!(stdout().lock(), "{}", Understood(&config)) {
        // Nobody reads on.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(()),
        result => Ok(result?),
    }
}
