//! `tautline drill`.

use std::{
    io::{self, ErrorKind},
    path::PathBuf,
    thread,
    time::{Duration, Instant},
};

use chrono::{SubsecRound, Utc};
use clap::Args;

use super::Failure;
use crate::{
    config::Config,
    drill::{Drill, FrameText, Output, Scenario},
    feed::Channels,
};

/// Options of `drill`.
#[derive(Debug, Args)]
pub struct Options {
    /// The corridors (TOML).
    #[arg(long, value_name = "FILE")]
    pub config: PathBuf,
    /// What is true of them, and what happens (TOML).
    #[arg(long, value_name = "FILE")]
    pub scenario: PathBuf,
    /// Where the frames go: a file (compressed where it ends in .gz or .zst), `tcp://host:port`,
    /// `tcp-listen://host:port` (starts with its first reader; loopback without a host), or - for standard output.
    #[arg(long, value_name = "TO", default_value = "-")]
    pub output: String,
    /// Where the truth goes, as JSON Lines.
    #[arg(long, value_name = "TO")]
    pub truth: Option<String>,
    /// Another seed than the scenario's.
    #[arg(long, value_name = "NUMBER")]
    pub seed: Option<u64>,
    /// At the pace of the frames' own times, which start now.
    #[arg(long)]
    pub real_time: bool,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let config = Config::load(&options.config)?;
    let mut scenario = Scenario::load(&options.scenario, &config)?;
    scenario.seed = options.seed.unwrap_or(scenario.seed);
    let mut truth = options.truth.as_deref().map(Output::open).transpose()?;
    let mut output = Output::open(&options.output)?;
    if options.real_time {
        scenario.start = Utc::now().trunc_subsecs(0);
    }
    match play(&config, &scenario, options.real_time, &mut output, truth.as_mut()) {
        // Whoever reads has had enough.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => return Ok(()),
        played => played?,
    }
    output.finish()?;
    truth.map_or(Ok(()), Output::finish)?;
    Ok(())
}

fn play(
    config: &Config,
    scenario: &Scenario,
    real_time: bool,
    output: &mut Output,
    mut truth: Option<&mut Output>,
) -> io::Result<()> {
    let channels = Channels::new(config);
    let text = FrameText::new(config, &channels);
    let mut drill = Drill::new(config, &channels, scenario);
    let began = Instant::now();
    let mut line = Vec::new();
    while let Some(frame) = drill.next() {
        if real_time {
            let due = (frame.time - scenario.start).to_std().unwrap_or(Duration::ZERO);
            thread::sleep(due.saturating_sub(began.elapsed()));
        }
        line.clear();
        text.write(&frame, &mut line)?;
        output.line(&line)?;
        for fact in drill.take_truth() {
            if let Some(truth) = &mut truth {
                line.clear();
                serde_json::to_writer(&mut line, &fact)?;
                line.push(b'\n');
                truth.line(&line)?;
            }
        }
        if real_time {
            output.flush()?;
            truth.as_mut().map_or(Ok(()), |truth| truth.flush())?;
        }
    }
    Ok(())
}
