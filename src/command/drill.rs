//! `tautline drill`.

use std::{
    fs,
    io::{self, ErrorKind},
    path::{Path, PathBuf},
    sync::mpsc::{self, Sender},
    thread,
    time::{Duration, Instant},
};

use chrono::{SubsecRound, Utc};
use clap::Args;
use tokio::{runtime, signal::ctrl_c};

use super::Failure;
use crate::{
    config::Config,
    drill::{Drill, Invented, Invention, Output, Scenario, Truth},
    feed::{Channels, Frame, FrameText},
};

/// Options of `drill`.
#[derive(Debug, Args)]
pub struct Options {
    /// The corridors (TOML).
    #[arg(long, value_name = "FILE", required_unless_present = "invent")]
    pub config: Option<PathBuf>,
    /// What is true of them, and what happens (TOML; config/demo-day.toml is one).
    #[arg(long, value_name = "FILE", required_unless_present = "invent")]
    pub scenario: Option<PathBuf>,
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
    /// Instead of playing: makes up a configuration and a scenario, a frame a second for a day, and writes both
    /// into this folder, as config.toml and scenario.toml.
    #[arg(long, value_name = "FOLDER", conflicts_with_all = ["config", "scenario", "truth", "real_time"])]
    pub invent: Option<PathBuf>,
    /// How many corridors to make up.
    #[arg(long, value_name = "NUMBER", default_value_t = 1, requires = "invent", value_parser = clap::value_parser!(u16).range(1..=1000))]
    pub corridors: u16,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    if let Some(folder) = &options.invent {
        return invent(options, folder);
    }
    let (Some(config), Some(scenario)) = (&options.config, &options.scenario) else {
        return Err("give --config and --scenario".into());
    };
    let config = Config::load(config)?;
    let mut scenario = Scenario::load(scenario, &config)?;
    scenario.seed = options.seed.unwrap_or(scenario.seed);
    let truth = options.truth.as_deref().map(Output::open).transpose()?;
    let output = Output::open(&options.output)?;
    if options.real_time {
        scenario.start = Utc::now().trunc_subsecs(0);
    }
    let mut record = Record { output, truth, line: Vec::new() };
    match play(&config, &scenario, options.real_time, &mut record).and_then(|()| record.finish()) {
        // Whoever reads has had enough.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(()),
        played => Ok(played?),
    }
}

/// Sends a message when the user has had enough, so that what is written so far can be ended well.
fn tell_of_interrupt(listener: Sender<()>) {
    thread::spawn(move || {
        let runtime = runtime::Builder::new_current_thread().enable_all().build();
        if runtime.is_ok_and(|runtime| runtime.block_on(ctrl_c()).is_ok()) {
            // Whoever listened may be done already.
            let _ = listener.send(());
        }
    });
}

fn invent(options: &Options, folder: &Path) -> Result<(), Failure> {
    let invention = Invention {
        seed: options.seed.unwrap_or(1),
        corridors: options.corridors.into(),
        interval_s: 1.0,
        ..Invention::default()
    };
    fs::create_dir_all(folder).map_err(|error| format!("cannot make {}: {error}", folder.display()))?;
    let Invented { config, scenario } = invention.invent();
    for (name, text) in [("config.toml", config), ("scenario.toml", scenario)] {
        let path = folder.join(name);
        fs::write(&path, text).map_err(|error| format!("cannot write {}: {error}", path.display()))?;
    }
    Ok(())
}

fn play(config: &Config, scenario: &Scenario, real_time: bool, record: &mut Record) -> io::Result<()> {
    let channels = Channels::new(config);
    let text = FrameText::new(config, &channels);
    let mut drill = Drill::new(config, &channels, scenario);
    let (listener, interrupt) = mpsc::channel();
    tell_of_interrupt(listener.clone());
    let began = Instant::now();
    while let Some(frame) = drill.next() {
        let due = if real_time { (frame.time - scenario.start).to_std().unwrap_or_default() } else { Duration::ZERO };
        if interrupt.recv_timeout(due.saturating_sub(began.elapsed())).is_ok() {
            break;
        }
        record.frame(&frame, &text)?;
        record.truth(drill.take_truth())?;
        if real_time {
            record.flush()?;
        }
    }
    // What became true after the last frame.
    record.truth(drill.take_truth())
}

/// Where a drill is written down.
struct Record {
    output: Output,
    truth: Option<Output>,
    line: Vec<u8>,
}

impl Record {
    fn frame(&mut self, frame: &Frame, text: &FrameText) -> io::Result<()> {
        self.line.clear();
        text.write(frame, &mut self.line)?;
        self.output.line(&self.line)
    }

    fn truth(&mut self, facts: Vec<Truth>) -> io::Result<()> {
        let Some(output) = &mut self.truth else { return Ok(()) };
        for fact in facts {
            self.line.clear();
            serde_json::to_writer(&mut self.line, &fact)?;
            self.line.push(b'\n');
            output.line(&self.line)?;
        }
        Ok(())
    }

    fn flush(&mut self) -> io::Result<()> {
        self.output.flush()?;
        self.truth.as_mut().map_or(Ok(()), Output::flush)
    }

    fn finish(self) -> io::Result<()> {
        self.output.finish()?;
        self.truth.map_or(Ok(()), Output::finish)
    }
}
