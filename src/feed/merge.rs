use std::{collections::VecDeque, sync::Arc};

use chrono::{DateTime, Utc};

use super::{Channels, Frame, monitor::Gauge, places::Places};

/// Frames of one stream that wait for their turn, and where more of them come from.
#[derive(Debug)]
pub(super) struct Lane<S> {
    pub frames: VecDeque<Frame>,
    pub gauge: Arc<Gauge>,
    pub source: S,
}

impl<S> Lane<S> {
    pub fn new(gauge: Arc<Gauge>, source: S) -> Self {
        Self { frames: VecDeque::new(), gauge, source }
    }
}

/// Brings the frames of several streams into one order of time.
#[derive(Debug)]
pub(super) struct Merger {
    /// The time of the last frame taken.
    pub latest: Option<DateTime<Utc>>,
    places: Places,
}

impl Merger {
    pub fn new(channels: &Channels) -> Self {
        Self { latest: None, places: Places::new(channels) }
    }

    /// Goes on under more channels.
    pub fn rewire(&mut self, channels: &Channels) {
        self.places = Places::new(channels);
    }

    /// Takes the earliest frame that waits, and joins others of the same time to it.
    ///
    /// `None` when nothing waits, and when the earliest is late, or beyond the horizon: then it is counted and dropped.
    pub fn take<S>(&mut self, lanes: &mut [Lane<S>], horizon: Option<DateTime<Utc>>) -> Option<Frame> {
        let time = lanes.iter().filter_map(|lane| lane.frames.front()).map(|frame| frame.time).min()?;
        let is_late = self.latest.is_some_and(|latest| time < latest);
        let is_ahead = horizon.is_some_and(|horizon| time > horizon);
        let mut merged = None;
        for lane in lanes {
            if lane.frames.front().is_none_or(|frame| frame.time != time) {
                continue;
            }
            let frame = lane.frames.pop_front();
            match (&mut merged, &frame) {
                _ if is_late => lane.gauge.lock().tally.old += 1,
                _ if is_ahead => lane.gauge.lock().tally.ahead += 1,
                (Some(merged), Some(frame)) => self.join(merged, frame),
                _ => merged = frame,
            }
        }
        if !is_ahead {
            self.latest = self.latest.max(Some(time));
        }
        merged
    }

    /// Adds the readings of another frame; of two for one channel the better stands, or else the first.
    fn join(&mut self, merged: &mut Frame, other: &Frame) {
        if merged.aside.is_none() {
            merged.aside.clone_from(&other.aside);
        }
        let readings = std::mem::take(&mut merged.readings);
        for (slot, reading) in readings.into_iter().chain(other.readings.iter().copied()) {
            match self.places.find(&mut merged.readings, slot) {
                Some(before) if reading.quality < before.quality => *before = reading,
                Some(_) => {}
                None => self.places.push(&mut merged.readings, slot, reading),
            }
        }
    }
}
