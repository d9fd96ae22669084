use std::{
    future::poll_fn,
    io,
    sync::Arc,
    task::{Context, Poll},
    time::{Duration, Instant},
};

use chrono::{DateTime, TimeDelta, Utc};
use thiserror::Error;
use tokio::{sync::mpsc, task::JoinSet, time::timeout_at};

use super::{
    Channels, Frame, Input, Monitor,
    inlet::Inlet,
    merge::{Lane, Merger},
    opening::Opening,
    switch::Switch,
};
use crate::config::FeedSettings;

/// How a feed treats its inputs.
#[derive(Debug, Clone, Copy)]
pub struct Patience {
    /// How long a frame waits for live inputs that may bring an earlier one, or more for the same time.
    pub hold: Duration,
    /// How far a frame of live inputs may be ahead of both the clock and the frame before it: one absurd time stamp would
    /// make all that follow look old.
    pub max_ahead: TimeDelta,
    /// Ends live inputs when they end for the first time, instead of connecting again.
    pub once: bool,
}

impl Patience {
    /// As a configuration says.
    pub fn new(settings: &FeedSettings) -> Self {
        Self {
            hold: Duration::try_from_secs_f64(settings.hold_s).unwrap_or(Duration::MAX),
            max_ahead: settings.max_ahead(),
            once: false,
        }
    }
}

impl Default for Patience {
    fn default() -> Self {
        Self::new(&FeedSettings::default())
    }
}

/// An input that cannot be opened.
#[derive(Debug, Error)]
#[error("cannot open {input}: {error}")]
pub struct OpenError {
    input: Input,
    error: io::Error,
}

/// Frames of all inputs in one order of time, as they come.
///
/// Files wait for one another as long as it takes, live inputs at most [`Patience::hold`]; what comes later than that is
/// counted and dropped. Standard input counts as a file among files, and as live among live inputs.
#[derive(Debug)]
pub struct Feed {
    lanes: Vec<Lane<Inlet>>,
    /// Lanes of clients that connect; `None` once there cannot be any more.
    new_lanes: Option<mpsc::Receiver<Lane<Inlet>>>,
    merger: Merger,
    switch: Switch,
    patience: Patience,
    any_live: bool,
    monitor: Monitor,
    /// Stops the inputs when it is dropped.
    _tasks: JoinSet<()>,
}

impl Feed {
    /// Opens all inputs and starts to read them; to be called inside a tokio runtime.
    pub async fn open(inputs: &[Input], channels: &Arc<Channels>, patience: Patience) -> Result<Self, OpenError> {
        let (lane_sender, new_lanes) = mpsc::channel(1);
        let switch = Switch::new(channels);
        let mut opening = Opening::new(channels, &switch, patience.once, lane_sender);
        let any_live = inputs.iter().any(Input::is_live);
        for input in inputs {
            let is_live = input.is_live() || (*input == Input::Stdin && any_live);
            opening.open(input, is_live).await.map_err(|error| OpenError { input: input.clone(), error })?;
        }
        Ok(Self {
            lanes: opening.lanes,
            new_lanes: Some(new_lanes),
            merger: Merger::new(channels),
            switch,
            patience,
            any_live,
            monitor: Monitor(opening.gauges.into()),
            _tasks: opening.tasks,
        })
    }

    /// Reads what follows with other channels, which came from these by [`Channels::extended`]. No frame is lost or
    /// doubled: what was read before is as it was.
    pub fn rewire(&mut self, channels: &Arc<Channels>) {
        self.merger.rewire(channels);
        self.switch.set(channels);
    }

    /// How the inputs are doing.
    pub fn monitor(&self) -> &Monitor {
        &self.monitor
    }

    /// The next frames, at most `max`: waits for the first, and takes those that follow without waiting. `None` at the
    /// end of all inputs. Nothing is lost when the future is dropped.
    pub async fn next_batch(&mut self, max: usize) -> Option<Vec<Frame>> {
        let mut batch = Vec::new();
        loop {
            poll_fn(|context| Poll::Ready(self.receive(context).is_ready())).await;
            if self.lanes.is_empty() && self.new_lanes.is_none() {
                return (!batch.is_empty()).then_some(batch);
            }
            match self.turn() {
                Turn::Now => {
                    let horizon = self.horizon();
                    batch.extend(self.merger.take(&mut self.lanes, horizon));
                    if batch.len() >= max {
                        return Some(batch);
                    }
                }
                _ if !batch.is_empty() => return Some(batch),
                Turn::At(deadline) => {
                    let _received = timeout_at(deadline.into(), poll_fn(|context| self.receive(context))).await;
                }
                Turn::Unknown => poll_fn(|context| self.receive(context)).await,
            }
        }
    }

    /// The latest time that the next frame of live inputs can have.
    fn horizon(&self) -> Option<DateTime<Utc>> {
        let latest = self.merger.latest.filter(|_| self.any_live)?;
        latest.max(Utc::now()).checked_add_signed(self.patience.max_ahead)
    }

    /// Whether the earliest frame that waits may go.
    fn turn(&self) -> Turn {
        let earliest =
            self.lanes.iter().filter_map(|lane| Some((lane.frames.front()?.time, lane.source.arrived))).min();
        let Some((_, arrived)) = earliest else { return Turn::Unknown };
        let mut missing = self.lanes.iter().filter(|lane| lane.frames.is_empty()).peekable();
        if missing.peek().is_none() {
            return Turn::Now;
        }
        let deadline = arrived + self.patience.hold;
        if missing.any(|lane| !lane.source.is_live) {
            Turn::Unknown
        } else if deadline <= Instant::now() {
            Turn::Now
        } else {
            Turn::At(deadline)
        }
    }

    /// Takes in what has come for lanes that have nothing; ready when something changed.
    fn receive(&mut self, context: &mut Context) -> Poll<()> {
        let mut changed = false;
        for lane in self.lanes.iter_mut().filter(|lane| lane.frames.is_empty()) {
            if let Poll::Ready(batch) = lane.source.outlet.poll_recv(context) {
                changed = true;
                match batch {
                    Some(batch) => (lane.frames, lane.source.arrived) = (batch.frames.into(), batch.arrived),
                    None => lane.source.has_ended = true,
                }
            }
        }
        self.lanes.retain(|lane| !lane.source.has_ended);
        if let Some(new_lanes) = &mut self.new_lanes
            && let Poll::Ready(lane) = new_lanes.poll_recv(context)
        {
            changed = true;
            match lane {
                Some(lane) => self.lanes.push(lane),
                None => self.new_lanes = None,
            }
        }
        if changed { Poll::Ready(()) } else { Poll::Pending }
    }
}

/// When the earliest frame that waits may go.
enum Turn {
    Now,
    At(Instant),
    /// When more has come.
    Unknown,
}
