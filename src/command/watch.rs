//! `tautline watch`: live inputs on the screen.

use std::{
    path::PathBuf,
    sync::{Arc, mpsc::sync_channel},
    thread,
};

use clap::Args;
use tokio::sync::watch;

use super::{Failure, assess::Sources, inputs, stage};
use crate::{
    config::Config,
    desk::Desk,
    feed::{Channels, Feed, Input, Patience},
    screen::connection,
};

/// Options of `watch`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
    /// Where frames come from, any number of times: PATH, -, tcp://HOST:PORT, tcp-listen://[HOST]:PORT,
    /// udp-listen://[HOST]:PORT, unix:PATH or follow:PATH [default: the configuration's]
    #[arg(long, value_name = "INPUT")]
    input: Vec<Input>,
    /// What stands behind the terminals [default: as the configuration says, else learned]
    #[arg(long, value_enum)]
    sources: Option<Sources>,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let mut config = Config::load(&options.config)?;
    Sources::choose(options.sources, &mut config);
    let inputs = inputs::chosen(&options.input, &config)?;
    stage::needs_terminal()?;
    let channels = Arc::new(Channels::new(&config));
    let (desk, holder) = (Desk::detailed(&config, &channels), inputs::holder(&config, &channels));

    let runtime = stage::runtime()?;
    let feed = runtime.block_on(Feed::open(&inputs, &channels, Patience::default()))?;
    let (sender, parcels) = watch::channel(None);
    let handle = runtime.handle().clone();
    let connection = thread::spawn(move || handle.block_on(connection::watch(feed, desk, holder, sender)));
    // Nobody takes orders: a live feed cannot be played.
    let (orders, _) = sync_channel(1);
    stage::show(runtime, &config, parcels, orders, connection)
}
