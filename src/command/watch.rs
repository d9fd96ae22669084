//! `tautline watch`: live inputs on the screen.

use std::{
    env, fs,
    io::{Write, stderr},
    path::{Path, PathBuf},
    sync::Arc,
    thread,
};

use clap::Args;
use tokio::sync::{mpsc, watch};

use super::{Failure, assess::Sources, inputs, stage};
use crate::{
    config::Config,
    desk::Desk,
    feed::{Channels, Feed, Input, Patience},
    recording::{RecordError, Recorder},
    screen::connection::{Duty, Keeper, Live, Revision},
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
    /// Where what is learned is kept over a restart [default: as the configuration says, else beside it, named like it
    /// and ending in .learned.json]
    #[arg(long, value_name = "FILE", conflicts_with = "no_state")]
    state: Option<PathBuf>,
    /// Begin with the configured sources, and keep nothing
    #[arg(long)]
    no_state: bool,
    /// Record every frame in this folder, one file a day [default: as the configuration says]
    #[arg(long, value_name = "DIR")]
    record: Option<PathBuf>,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let (mut config, text) = Config::read(&options.config)?;
    Sources::choose(options.sources, &mut config);
    let inputs = inputs::chosen(&options.input, &config)?;
    let state_file = options.state_file(&config)?;
    stage::needs_terminal()?;
    let channels = Arc::new(Channels::new(&config));
    let (mut desk, holder) = (Desk::detailed(&config, &channels), inputs::holder(&config, &channels));

    let runtime = stage::runtime()?;
    let recorder = options.recorder(&config, &text, &channels)?;
    let feed = runtime.block_on(Feed::open(&inputs, &channels, Patience::new(&config.feed)))?;
    let keeper = state_file.map(|path| Keeper::open(path, &mut desk));
    keeper.iter().flat_map(Keeper::findings).for_each(say);
    let duty = Duty::begin(&config, config.journal.path(&options.config), env::var("USER").ok())?;
    let (sender, parcels) = watch::channel(None);
    let (orders, taken) = mpsc::channel(stage::ORDERS_WAITING);
    let sources = options.sources;
    let adjust = move |config: &mut Config| Sources::choose(sources, config);
    let revision = Revision::new(&options.config, config.clone(), text, adjust);
    let live = Live { feed, desk, holder, channels, revision, duty, keeper, recorder, parcels: sender, orders: taken };
    let handle = runtime.handle().clone();
    let connection = thread::spawn(move || handle.block_on(live.run()));
    let ending = stage::show(&runtime, &config, parcels, move |order| orders.try_send(order).is_ok());
    // It ends with the screen, once the journal and the recording are closed and what was learned is kept.
    let kept = connection.join();
    // A thread that waits for standard input cannot be stopped, nor need it be waited for.
    runtime.shutdown_background();
    ending?;
    kept.map_err(|_| stage::fault())?.iter().for_each(|trouble| say(trouble));
    Ok(())
}

/// A word on standard error, which may be gone with the terminal.
fn say(what: &str) {
    let _ = writeln!(stderr(), "tautline: {what}");
}

impl Options {
    fn recorder(&self, config: &Config, text: &str, channels: &Arc<Channels>) -> Result<Option<Recorder>, RecordError> {
        let beside = |folder: &PathBuf| self.config.parent().unwrap_or(Path::new("")).join(folder);
        let folder = self.record.clone().or_else(|| config.recording.folder.as_ref().map(beside));
        folder.map(|folder| Recorder::open(&folder, config, text, channels)).transpose()
    }

    fn state_file(&self, config: &Config) -> Result<Option<PathBuf>, Failure> {
        if self.no_state || !config.learning.enabled {
            return Ok(None);
        }
        let configured = || {
            let name = config.state_file.as_ref()?;
            Some(self.config.parent().unwrap_or(Path::new("")).join(name))
        };
        let path = self.state.clone().or_else(configured).unwrap_or_else(|| self.config.with_extension("learned.json"));
        if fs::canonicalize(&path).is_ok_and(|path| fs::canonicalize(&self.config).is_ok_and(|config| config == path)) {
            return Err(
                format!("{} is the configuration; name another file for what is learned", path.display()).into()
            );
        }
        Ok(Some(path))
    }
}
