//! `tautline watch`: live inputs on the screen.

use std::{env, path::PathBuf, sync::Arc, thread};

use clap::Args;
use tokio::sync::{mpsc, watch};

use super::{Failure, assess::Sources, inputs, stage};
use crate::{
    config::Config,
    desk::Desk,
    feed::{Channels, Feed, Input, Patience},
    screen::connection::{Duty, Live},
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
    let by = env::var("USER").ok();
    let duty = Duty::begin(&config, config.journal.path(&options.config), by)?;
    let (sender, parcels) = watch::channel(None);
    let (orders, taken) = mpsc::channel(stage::ORDERS_WAITING);
    let live = Live { feed, desk, holder, duty, parcels: sender, orders: taken };
    let handle = runtime.handle().clone();
    let connection = thread::spawn(move || handle.block_on(live.run()));
    stage::show(runtime, &config, parcels, move |order| orders.try_send(order).is_ok(), connection)
}
