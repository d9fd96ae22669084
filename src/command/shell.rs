//! Shell completions and the man page.

use std::io::stdout;

use clap::{Args, CommandFactory};
use clap_complete::Shell;

use super::{Arguments, Failure};

/// Options of `completions`.
#[derive(Debug, Args)]
pub struct CompletionOptions {
    /// The shell to write them for.
    pub shell: Shell,
}

/// Writes completions.
pub fn completions(options: &CompletionOptions) -> Result<(), Failure> {
    clap_complete::generate(options.shell, &mut Arguments::command(), "tautline", &mut stdout());
    Ok(())
}

/// Writes the man page.
pub fn man() -> Result<(), Failure> {
    clap_mangen::Man::new(Arguments::command()).render(&mut stdout())?;
    Ok(())
}
