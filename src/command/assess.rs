//! `tautline assess`: frames in, records out.

use std::{
    io::{self, BufWriter, Write},
    num::NonZeroUsize,
    path::PathBuf,
    sync::Arc,
};

use clap::{Args, ValueEnum};
use futures::FutureExt;
use rayon::{ThreadPool, ThreadPoolBuilder, prelude::*};
use tokio::{
    runtime, select,
    signal::unix::{SignalKind, signal},
};

use super::{Failure, inputs};
use crate::{
    config::Config,
    desk::{Assessment, CorridorDesk, Desk},
    feed::{Channels, Feed, Frame, Holder, Input, InputStatus, Patience, Snapshot},
    report::jsonl,
};

/// Frames assessed at once: enough to keep every thread busy, few enough to hold.
const BATCH_FRAMES: usize = 64;

/// Options of `assess`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
    /// Where frames come from, any number of times: PATH, -, tcp://HOST:PORT, tcp-listen://[HOST]:PORT,
    /// udp-listen://[HOST]:PORT, unix:PATH or follow:PATH [default: the configuration's]
    #[arg(long, value_name = "INPUT")]
    input: Vec<Input>,
    /// Recorded files, the same as --input
    #[arg(value_name = "INPUT")]
    files: Vec<Input>,
    /// Write only the records of the last frame
    #[arg(long)]
    last: bool,
    /// Threads to assess on [default: one a processor]
    #[arg(long, value_name = "N")]
    threads: Option<NonZeroUsize>,
    /// What stands behind the terminals [default: as the configuration says, else learned]
    #[arg(long, value_enum)]
    sources: Option<Sources>,
    /// End when live inputs end for the first time, instead of connecting again
    #[arg(long)]
    once: bool,
}

/// Where the sources' impedances come from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Sources {
    /// From the steps seen in the feed, beginning with the configured values
    Learned,
    /// From the configuration alone
    Configured,
}

impl Sources {
    /// Lets the command line overrule the configuration.
    pub(super) fn choose(chosen: Option<Self>, config: &mut Config) {
        if let Some(sources) = chosen {
            config.learning.enabled = sources == Self::Learned;
        }
    }
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let mut config = Config::load(&options.config)?;
    Sources::choose(options.sources, &mut config);
    let inputs = inputs::chosen(&[&options.input[..], &options.files[..]].concat(), &config)?;
    // Inputs are read beside the thread that assesses.
    let runtime = runtime::Builder::new_multi_thread().worker_threads(2).enable_all().build()?;
    let outcome = runtime.block_on(assess(options, &config, &inputs));
    // A thread that waits for standard input cannot be stopped, nor need it be waited for.
    runtime.shutdown_background();
    match outcome {
        Err(failure) if is_broken_pipe(&*failure) => Ok(()),
        outcome => outcome,
    }
}

fn is_broken_pipe(failure: &(dyn std::error::Error + 'static)) -> bool {
    failure.downcast_ref::<io::Error>().is_some_and(|error| error.kind() == io::ErrorKind::BrokenPipe)
}

async fn assess(options: &Options, config: &Config, inputs: &[Input]) -> Result<(), Failure> {
    let channels = Arc::new(Channels::new(config));
    let patience = Patience { once: options.once, ..Patience::new(&config.feed) };
    let mut feed = Feed::open(inputs, &channels, patience).await?;
    let mut bench = Bench::new(options, config, &channels)?;
    let mut out = BufWriter::with_capacity(1 << 16, io::stdout().lock());
    let mut interrupt = signal(SignalKind::interrupt())?;
    let mut terminate = signal(SignalKind::terminate())?;
    let interrupted = loop {
        let batch = select! {
            biased;
            _ = interrupt.recv() => break true,
            _ = terminate.recv() => break true,
            batch = next_batch(&mut feed, &mut out) => batch?,
        };
        let Some(batch) = batch else { break false };
        bench.assess(&batch)?;
        bench.write(&mut out)?;
    };
    bench.write_last(&mut out)?;
    out.flush()?;
    report(&feed.monitor().inputs(), interrupted)
}

/// The next frames; what was written so far goes out before waiting for them.
async fn next_batch(feed: &mut Feed, out: &mut impl Write) -> io::Result<Option<Vec<Frame>>> {
    if let Some(batch) = feed.next_batch(BATCH_FRAMES).now_or_never() {
        return Ok(batch);
    }
    out.flush()?;
    Ok(feed.next_batch(BATCH_FRAMES).await)
}

/// Says on standard error what could not be used; fails when nothing could.
fn report(inputs: &[InputStatus], interrupted: bool) -> Result<(), Failure> {
    for input in inputs {
        for finding in input.tally.findings() {
            eprintln!("tautline: {}: {finding}", input.name);
        }
    }
    if !interrupted && inputs.iter().all(|input| input.tally.frames == 0) {
        let names: Vec<&str> = inputs.iter().map(|input| &*input.name).collect();
        return Err(format!("not a single frame was read from {}", names.join(", ")).into());
    }
    Ok(())
}

/// All corridors at work: each takes a batch of snapshots in order, several at once.
struct Bench {
    pool: ThreadPool,
    holder: Holder,
    seats: Vec<Seat>,
}

/// One corridor, and what it makes of a batch.
struct Seat {
    desk: CorridorDesk,
    last_only: bool,
    last: Option<Assessment>,
    /// Records one after another, and where each ends; both used again for every batch.
    records: Vec<u8>,
    ends: Vec<usize>,
}

impl Bench {
    fn new(options: &Options, config: &Config, channels: &Arc<Channels>) -> Result<Self, Failure> {
        let seat = |desk| Seat { desk, last_only: options.last, last: None, records: Vec::new(), ends: Vec::new() };
        Ok(Self {
            pool: ThreadPoolBuilder::new().num_threads(options.threads.map_or(0, NonZeroUsize::get)).build()?,
            holder: inputs::holder(config, channels),
            seats: Desk::new(config, channels).corridors.into_iter().map(seat).collect(),
        })
    }

    fn assess(&mut self, frames: &[Frame]) -> io::Result<()> {
        let snapshots: Vec<Snapshot> = frames.iter().filter_map(|frame| self.holder.take(frame)).collect();
        self.pool.install(|| self.seats.par_iter_mut().with_max_len(1).try_for_each(|seat| seat.assess(&snapshots)))
    }

    /// Writes the batch's records frame by frame, corridor by corridor.
    fn write(&self, out: &mut impl Write) -> io::Result<()> {
        let frames = self.seats.first().map_or(0, |seat| seat.ends.len());
        for frame in 0..frames {
            for seat in &self.seats {
                out.write_all(seat.record(frame))?;
            }
        }
        Ok(())
    }

    fn write_last(&self, out: &mut impl Write) -> io::Result<()> {
        self.seats.iter().filter_map(|seat| seat.last.as_ref()).try_for_each(|last| jsonl::write(last, &mut *out))
    }
}

impl Seat {
    fn assess(&mut self, snapshots: &[Snapshot]) -> io::Result<()> {
        self.records.clear();
        self.ends.clear();
        for snapshot in snapshots {
            let assessment = self.desk.assess(snapshot);
            if self.last_only {
                self.last = Some(assessment);
            } else {
                jsonl::write(&assessment, &mut self.records)?;
                self.ends.push(self.records.len());
            }
        }
        Ok(())
    }

    fn record(&self, frame: usize) -> &[u8] {
        let start = if frame == 0 { 0 } else { self.ends[frame - 1] };
        &self.records[start..self.ends[frame]]
    }
}
