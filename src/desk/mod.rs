//! Takes each corridor of a snapshot from measurements to an assessment, a pure function of configuration and frames.

mod assessment;

pub use crate::margin::{Action, Binding, Criterion, Intact, IntactLimits, OutageLimits, OutageRecord, Reclose};
pub use assessment::{Assessment, Basis, BusDetail, CircuitDetail, Detail, FitRecord, SourceRecord, State};

use crate::{config::Config, feed::Channels, feed::Snapshot};

/// All corridors of a configuration.
#[derive(Debug)]
pub struct Desk {
    /// One each, in the order of the configuration: they share nothing and may run on different threads.
    pub corridors: Vec<CorridorDesk>,
}

/// One corridor with what is remembered of it.
#[derive(Debug)]
pub struct CorridorDesk {}

impl Desk {
    /// A desk with nothing remembered.
    pub fn new(_config: &Config, _channels: &Channels) -> Self {
        Self { corridors: Vec::new() }
    }

    /// Every corridor at a snapshot, in order.
    pub fn assess(&mut self, snapshot: &Snapshot) -> Vec<Assessment> {
        self.corridors.iter_mut().map(|corridor| corridor.assess(snapshot)).collect()
    }
}

impl CorridorDesk {
    /// This corridor at a snapshot.
    pub fn assess(&mut self, _snapshot: &Snapshot) -> Assessment {
        unreachable!("replaced before anything runs")
    }
}
