use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};

use super::{Aside, Channels, Frame, Quality, Reading, Slot, Start};

/// What stands at the time of a frame: its own values, and earlier ones that are not too old.
#[derive(Debug, Clone, PartialEq)]
pub struct Snapshot {
    /// The frame's time.
    pub time: DateTime<Utc>,
    /// By slot; `None`: missing.
    pub readings: Vec<Option<Reading>>,
    /// What a recording says besides the frame.
    pub aside: Option<Arc<Aside>>,
}

impl Snapshot {
    /// The reading, unless it is missing or invalid.
    pub fn usable(&self, slot: Slot) -> Option<Reading> {
        self.readings[slot].filter(|reading| reading.quality != Quality::Invalid)
    }

    /// How everything stood before the frame, if it says so.
    pub fn start(&self) -> Option<&Start> {
        self.aside.as_ref()?.start.as_ref()
    }
}

/// Keeps the last value of each channel for its age.
#[derive(Debug, Clone)]
pub struct Holder {
    max_age: TimeDelta,
    is_status: Vec<bool>,
    last: Vec<Option<(DateTime<Utc>, Reading)>>,
    latest: Option<DateTime<Utc>>,
}

impl Holder {
    /// Nothing held yet.
    pub fn new(channels: &Channels, max_age: TimeDelta) -> Self {
        Self {
            max_age,
            is_status: (0..channels.len()).map(|slot| channels.is_status(slot)).collect(),
            last: vec![None; channels.len()],
            latest: None,
        }
    }

    /// Goes on under channels that came from its own by [`Channels::extended`]: what is held stays.
    pub fn rewire(&mut self, channels: &Channels, max_age: TimeDelta) {
        self.max_age = max_age;
        self.is_status = (0..channels.len()).map(|slot| channels.is_status(slot)).collect();
        self.last.resize(channels.len(), None);
    }

    /// Takes a frame in; `None` when it is older than the one before it, which changes nothing.
    pub fn take(&mut self, frame: &Frame) -> Option<Snapshot> {
        if self.latest.is_some_and(|latest| frame.time < latest) {
            return None;
        }
        self.latest = Some(frame.time);
        if let Some(start) = frame.aside.as_ref().and_then(|aside| aside.start.as_ref()) {
            self.last.fill(None);
            start.held.iter().for_each(|(slot, held)| self.last[*slot] = Some(*held));
        }
        for &(slot, reading) in &frame.readings {
            // An invalid status says nothing new: the circuit stays as last known.
            if !(self.is_status[slot] && reading.quality == Quality::Invalid) {
                self.last[slot] = Some((frame.time, reading));
            }
        }
        Some(Snapshot { aside: frame.aside.clone(), ..self.snapshot()? })
    }

    /// The last value of each channel, and when it came.
    pub(super) fn held(&self) -> impl Iterator<Item = (Slot, (DateTime<Utc>, Reading))> {
        self.last.iter().enumerate().filter_map(|(slot, last)| Some((slot, (*last)?)))
    }

    /// What stands at the time of the latest frame; `None` before the first.
    pub fn snapshot(&self) -> Option<Snapshot> {
        let time = self.latest?;
        let readings = self
            .last
            .iter()
            .zip(&self.is_status)
            .map(|(last, is_status)| {
                last.filter(|(since, _)| *is_status || time - *since <= self.max_age).map(|(_, reading)| reading)
            })
            .collect();
        Some(Snapshot { time, readings, aside: None })
    }
}
