//! Takes each corridor of a snapshot from measurements to an assessment: a pure function of configuration and frames.

mod alternative;
mod assessment;
mod change;
mod corridor;
mod memory;

use std::sync::Arc;

pub use crate::margin::{Action, Binding, Criterion, Intact, IntactLimits, OutageLimits, OutageRecord, Reclose};
pub use alternative::Alternative;
pub use assessment::{
    Assessment, Basis, BusDetail, CircuitDetail, Detail, FitRecord, Learned, SourceRecord, State, Switch, SwitchKind,
};
pub use change::ChangeErrors;
pub use corridor::CorridorDesk;
pub use memory::CorridorMemory;

use crate::{
    config::Config,
    feed::{Channels, Snapshot},
};

/// All corridors of a configuration.
#[derive(Debug, Clone)]
pub struct Desk {
    /// One each, in the order of the configuration: they share nothing and may run on different threads.
    pub corridors: Vec<CorridorDesk>,
}

impl Desk {
    /// A desk with nothing remembered.
    pub fn new(config: &Config, channels: &Arc<Channels>) -> Self {
        let corridors = config.grid.corridors.iter();
        Self { corridors: corridors.map(|corridor| CorridorDesk::new(corridor, config, channels)).collect() }
    }

    /// The same, bringing with every assessment what a screen draws besides.
    pub fn detailed(config: &Config, channels: &Arc<Channels>) -> Self {
        Self { corridors: Self::new(config, channels).corridors.into_iter().map(CorridorDesk::detailed).collect() }
    }

    /// The same as it stands, bringing only what is part of the record.
    #[must_use]
    pub fn plain(self) -> Self {
        Self { corridors: self.corridors.into_iter().map(CorridorDesk::plain).collect() }
    }

    /// Goes on under another configuration, with channels that came from its own by [`Channels::extended`]. A corridor
    /// that is the same in it goes on as if nothing had happened; of another, what was learned stays where its configured
    /// sources are the same.
    #[must_use]
    pub fn reconfigured(mut self, before: &Config, after: &Config, channels: &Arc<Channels>) -> Self {
        let is_same = before.grid.frequency_hz.to_bits() == after.grid.frequency_hz.to_bits()
            && before.measurement == after.measurement
            && before.learning == after.learning;
        let mut desk = Self::detailed(after, channels);
        for new in &mut desk.corridors {
            let Some(index) = self.corridors.iter().position(|old| old.corridor().name == new.corridor().name) else {
                continue;
            };
            let old = self.corridors.swap_remove(index);
            if is_same && old.corridor() == new.corridor() {
                *new = old;
            } else if let Some(memory) = old.learner().memory() {
                // Other configured sources are learned anew.
                let _other = new.learner_mut().recall(&memory);
            }
        }
        desk
    }

    /// Every corridor at a snapshot, in order.
    pub fn assess(&mut self, snapshot: &Snapshot) -> Vec<Assessment> {
        self.corridors.iter_mut().map(|corridor| corridor.assess(snapshot)).collect()
    }
}
