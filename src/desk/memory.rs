//! A corridor's desk as a whole, to go on elsewhere exactly where it stood.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use super::{
    CorridorDesk,
    corridor::{Settings, switches},
};
use crate::{
    config::LearningSettings,
    feed::Start,
    margin::{Engine, Trend},
    network::Topology,
    source::{Learner, store::StoreError},
};

/// What is remembered of a corridor, as far as what follows depends on it.
#[derive(Debug, Serialize, Deserialize)]
pub struct CorridorMemory {
    learner: Learner,
    trend: Trend,
    topology: Option<Topology>,
    switchings: u64,
}

impl CorridorDesk {
    /// What is remembered of it, to be taken up where a recording starts.
    pub fn memory(&self) -> CorridorMemory {
        CorridorMemory {
            learner: self.learner.kept(),
            trend: self.trend.clone(),
            topology: self.topology.clone(),
            switchings: self.switchings,
        }
    }

    /// Goes on as a recording says that this corridor stood. What is only quicker to keep is forgotten, so that who goes on
    /// from here has the same as who was here before.
    pub(super) fn begin(&mut self, start: &Start) {
        let name = self.corridor.name.clone();
        let Some(CorridorMemory { learner, trend, topology, switchings }) = start.desk(&name) else { return };
        let is_same = start.config().is_some_and(|config| {
            Settings::of(config) == self.settings && config.grid.corridors.contains(&*self.corridor)
        });
        if !is_same {
            start.doubt(&name, &"recorded under another configuration; what was learned of other sources begins anew");
        }
        let resumed = if is_same { self.learner.resume(learner) } else { self.begin_anew(&learner) };
        if let Err(error) = resumed {
            start.doubt(&name, &error);
        }
        self.engine = Engine::new(self.settings.frequency_hz);
        (self.trend, self.topology, self.switchings) = match topology {
            Some(topology) if is_same && topology.is_of(&self.corridor) => (trend, Some(topology), switchings),
            _ => (Trend::default(), None, 0),
        };
        self.switches = self.topology.as_ref().map_or_else(Arc::default, |topology| switches(&self.corridor, topology));
        self.show_learned();
    }

    /// Another corridor than the one recorded: what was learned holds for it too where its configured sources are the same.
    fn begin_anew(&mut self, recorded: &Learner) -> Result<(), StoreError> {
        let learning = LearningSettings { enabled: self.learner.is_enabled(), ..self.settings.learning };
        self.learner = Learner::new(&self.corridor.sides.map(|side| side.source), learning);
        match recorded.memory() {
            Some(memory) if self.learner.is_enabled() => self.learner.recall(&memory),
            _ => Ok(()),
        }
    }
}
