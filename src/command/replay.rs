//! `tautline replay`: recorded files on the screen, or reviewed where there is none.

use std::{
    io::{ErrorKind, IsTerminal, stdout},
    path::PathBuf,
    sync::{Arc, mpsc::sync_channel},
    thread,
};

use clap::Args;
use tokio::sync::watch;

use super::{Failure, assess::Sources, inputs, review, stage};
use crate::{
    alarm::Board,
    config::Config,
    desk::Desk,
    feed::Channels,
    report::review::{Paper, text},
    review::Stretch,
    screen::{
        Ending,
        connection::{Player, Recording, Replay, Surveyor},
        state::parse_time,
    },
};

/// Options of `replay`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
    /// Recorded frames: JSON Lines or .csv, also as .gz or .zst; several are merged by time
    #[arg(required = true, value_name = "FILES")]
    files: Vec<PathBuf>,
    #[command(flatten)]
    start: Start,
    /// What stands behind the terminals [default: as the configuration says, else learned]
    #[arg(long, value_enum)]
    sources: Option<Sources>,
}

/// How to start.
#[derive(Debug, Args)]
pub struct Start {
    /// Recorded seconds in a second
    #[arg(long, value_name = "N", default_value_t = 1, value_parser = clap::value_parser!(u32).range(1..=3600))]
    pub speed: u32,
    /// Time to start at: 14:03, 14:03:20 or 2031-03-14T14:03:20Z
    #[arg(long, value_name = "TIME")]
    pub at: Option<String>,
    /// Start paused
    #[arg(long)]
    pub paused: bool,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let mut config = Config::load(&options.config)?;
    Sources::choose(options.sources, &mut config);
    play(&config, &Recording::Files(options.files.clone()), &options.start)
}

/// Plays a recording on the screen; where there is none to draw on, reviews it as text.
pub(super) fn play(config: &Config, recording: &Recording, start: &Start) -> Result<(), Failure> {
    if !stdout().is_terminal() {
        return review(config, recording);
    }
    let channels = Arc::new(Channels::new(config));
    let (desk, holder) = (Desk::detailed(config, &channels), inputs::holder(config, &channels));
    let mut player = Player::new(recording.clone(), channels, holder, desk, Board::new(config))?;
    let Some(first) = player.next_time() else {
        let findings = player.monitor().inputs().into_iter().flat_map(|input| input.tally.findings());
        let findings: Vec<_> = findings.collect();
        return Err(format!("not a single frame was read from {}\n{}", recording.name(), findings.join("\n"))
            .trim_end()
            .into());
    };
    let at = start.at.as_deref().map(|text| parse_time(text, config.time_zone, first)).transpose()?;

    let (sender, parcels) = watch::channel(None);
    let (orders, taken) = sync_channel(stage::ORDERS_WAITING);
    let survey = Surveyor::new(player.beginning(), inputs::max_age(config), config.time_zone).start();
    let mut replay = Replay::new(player, survey, sender, taken);
    let (speed, playing) = (start.speed, !start.paused);
    let connection = thread::spawn(move || {
        replay.begin(at, speed, playing);
        replay.run();
    });
    let ending = stage::show(&stage::runtime()?, config, parcels, move |order| orders.try_send(order).is_ok())?;
    if ending == Ending::Disconnected && connection.join().is_err() { Err(stage::fault()) } else { Ok(()) }
}

/// Reviews it, where there is no terminal.
fn review(config: &Config, recording: &Recording) -> Result<(), Failure> {
    let stretches = match recording {
        Recording::Files(paths) => Stretch::all(paths, &|file| Box::new(file), |_| {})?,
        Recording::Within { name, bytes } => vec![Stretch::within(name, bytes)],
    };
    let review = review::straight(config, &stretches)?;
    let paper = Paper { review: &review, grid: &config.grid, zone: config.time_zone, changes: &[] };
    match text::write(&paper, stdout().lock()) {
        // Nobody reads on.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(()),
        written => Ok(written?),
    }
}
