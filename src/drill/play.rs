//! Plays a scenario.

use std::{sync::Arc, time::Duration};

use chrono::{DateTime, TimeDelta, Utc};

use super::{CorridorTruth, Scenario, Truth, corridor_feed::CorridorFeed, truth::rounded};
use crate::{
    config::Config,
    feed::{Channels, Frame},
};

/// A scenario being played: an iterator over its frames.
#[derive(Debug, Clone)]
pub struct Drill {
    start: DateTime<Utc>,
    interval_s: f64,
    duration_s: f64,
    next: u64,
    corridors: Vec<(Arc<str>, CorridorFeed)>,
    truth: Vec<Truth>,
}

impl Drill {
    /// From the start, with the channels of the configuration that the scenario was read for.
    pub fn new(config: &Config, channels: &Channels, scenario: &Scenario) -> Self {
        let feed = |truth: &CorridorTruth| {
            let name = Arc::clone(&config.grid.corridors[truth.corridor].name);
            (name, CorridorFeed::new(config, channels, scenario, truth))
        };
        Self {
            start: scenario.start,
            interval_s: scenario.interval_s,
            duration_s: scenario.duration_s,
            next: 0,
            corridors: scenario.corridors.iter().map(feed).collect(),
            truth: Vec::new(),
        }
    }

    /// What became true since the last call, up to the last frame.
    pub fn take_truth(&mut self) -> Vec<Truth> {
        std::mem::take(&mut self.truth)
    }

    fn time(&self, seconds: f64) -> DateTime<Utc> {
        let passed = Duration::try_from_secs_f64(rounded(seconds)).unwrap_or_default();
        self.start + TimeDelta::from_std(passed).unwrap_or_default()
    }
}

impl Iterator for Drill {
    type Item = Frame;

    /// The next frame that says anything: one that lies in a gap of all corridors is left out.
    fn next(&mut self) -> Option<Frame> {
        let tolerance_s = 1e-6 * self.interval_s;
        while self.next as f64 * self.interval_s < self.duration_s - tolerance_s {
            let index = self.next;
            self.next += 1;
            let mut readings = Vec::new();
            let mut truth = Vec::new();
            for (name, corridor) in &mut self.corridors {
                let mut became_true = Vec::new();
                corridor.frame(index, &mut readings, &mut became_true);
                truth.extend(became_true.into_iter().map(|(at_s, what)| (at_s, Arc::clone(name), what)));
            }
            for (at_s, corridor, what) in truth {
                self.truth.push(Truth { time: self.time(at_s), corridor, what });
            }
            if !readings.is_empty() {
                return Some(Frame { time: self.time(index as f64 * self.interval_s), readings, aside: None });
            }
        }
        None
    }
}
