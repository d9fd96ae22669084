//! The command line: one file a command.

pub mod assess;
pub mod check;
pub mod demo;
pub mod drill;
mod inputs;
pub mod journal;
mod papers;
mod progress;
pub mod replay;
pub mod review;
pub mod shell;
mod stage;
mod tables;
pub mod try_thresholds;
pub mod watch;

use clap::{Parser, Subcommand};

/// N-1 angle-stability headroom of long AC corridors, live and replayed.
#[derive(Debug, Parser)]
#[command(version, about, after_help = ADVICE)]
pub struct Arguments {
    /// Without a command: the bundled demo day on the screen, or its review as text when piped.
    #[command(subcommand)]
    pub command: Option<Command>,
}

const ADVICE: &str = "tautline advises. Protection, approved operating limits, local codes and licensed engineers \
stand above it. The README lists what its method leaves out.";

/// What to do.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Print what a configuration says, or all that is wrong with it.
    Check(check::Options),
    /// Write one record for each corridor and frame, as JSON Lines.
    Assess(assess::Options),
    /// Watch live inputs on the screen.
    Watch(watch::Options),
    /// Play recorded files on the screen.
    Replay(replay::Options),
    /// Review recorded days: how close, when, because of what.
    Review(review::Options),
    /// Try alarms on recorded days: how many, how early, and what they would have missed.
    Try(try_thresholds::Options),
    /// Print or export what the alarms did.
    Journal(journal::Options),
    /// Make a feed with known truth.
    Drill(drill::Options),
    /// Write shell completions to standard output.
    Completions(shell::CompletionOptions),
    /// Write the man page to standard output.
    Man,
}

/// Where a command ended up going wrong: `main` prints it once and exits with 2.
pub type Failure = Box<dyn std::error::Error>;

/// Runs what the command line asks for.
pub fn run(arguments: Arguments) -> Result<(), Failure> {
    match arguments.command {
        None => demo::run(),
        Some(Command::Check(options)) => check::run(&options),
        Some(Command::Assess(options)) => assess::run(&options),
        Some(Command::Watch(options)) => watch::run(&options),
        Some(Command::Replay(options)) => replay::run(&options),
        Some(Command::Review(options)) => review::run(&options),
        Some(Command::Try(options)) => try_thresholds::run(&options),
        Some(Command::Journal(options)) => journal::run(&options),
        Some(Command::Drill(options)) => drill::run(&options),
        Some(Command::Completions(options)) => shell::completions(&options),
        Some(Command::Man) => shell::man(),
    }
}
