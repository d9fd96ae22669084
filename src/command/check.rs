//! `tautline check`.

use clap::Args;

use super::Failure;

/// Options of `check`.
#[derive(Debug, Args)]
pub struct Options {}

/// Runs it.
pub fn run(_options: &Options) -> Result<(), Failure> {
    Err("not there yet".into())
}
