//! How a corridor's alarms stand as a whole, to go on elsewhere exactly there; and what was done to them meanwhile.

use std::{collections::BTreeMap, sync::Arc};

use chrono::{DateTime, Utc};
use serde::{Deserialize, Serialize};

use super::{
    Act, Board, CorridorBoard, Deed, Kind, Standing, State, Target, Transition, condition::Condition, operator::written,
};
use crate::feed::{Aside, Start, stamp};

/// Everything of a corridor's alarms that what follows depends on.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct BoardMemory {
    #[serde(with = "stamp::optional")]
    latest: Option<DateTime<Utc>>,
    narrowed: [bool; 2],
    alarms: BTreeMap<Arc<str>, AlarmMemory>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
struct AlarmMemory {
    on: String,
    standing: Standing,
    condition: Condition,
    suppressed: bool,
}

impl Board {
    /// Takes up what a recording says before a frame: what was done since the one before, and how the alarms stood.
    pub fn take_up(&mut self, aside: &Aside) -> Vec<Transition> {
        let mut transitions = Vec::new();
        for act in aside.acts() {
            self.corridors.iter_mut().for_each(|board| board.perform(&act, &mut transitions));
        }
        aside.start.iter().for_each(|start| self.begin(start));
        transitions
    }

    /// Goes on as a recording says that the alarms stood.
    pub fn begin(&mut self, start: &Start) {
        self.corridors.iter_mut().for_each(|board| board.begin(start));
    }
}

impl CorridorBoard {
    /// Takes up what a recording says before a frame, as [`Board::take_up`] does.
    pub fn take_up(&mut self, aside: &Aside, transitions: &mut Vec<Transition>) {
        aside.acts().for_each(|act| self.perform(&act, transitions));
        aside.start.iter().for_each(|start| self.begin(start));
    }

    /// How its alarms stand, to be taken up where a recording starts.
    pub fn memory(&self) -> BoardMemory {
        let alarms = self.alarms.iter().map(|alarm| {
            let memory = AlarmMemory {
                on: alarm.definition.kind.word().into(),
                standing: alarm.standing.clone(),
                condition: alarm.condition,
                suppressed: alarm.suppressed,
            };
            (alarm.definition.name.clone(), memory)
        });
        BoardMemory { latest: self.latest, narrowed: self.reader.narrowed, alarms: alarms.collect() }
    }

    /// Goes on as a recording says that the alarms stood; those that it does not know are normal.
    pub fn begin(&mut self, start: &Start) {
        let Some(mut memory) = start.alarms::<BoardMemory>(&self.corridor) else { return };
        self.latest = memory.latest;
        self.reader.narrowed = memory.narrowed;
        for alarm in &mut self.alarms {
            let same = memory.alarms.remove(&alarm.definition.name).filter(|kept| kept.is_on(alarm.definition.kind));
            let (standing, condition, suppressed) =
                same.map_or_else(Default::default, |kept| (kept.standing.shown(), kept.condition, kept.suppressed));
            (alarm.standing, alarm.condition, alarm.suppressed) = (standing, condition, suppressed);
        }
        for (name, _) in memory.alarms.iter().filter(|(_, kept)| kept.standing.state != State::Normal) {
            start.doubt(&self.corridor, &format!("alarm {name}: there is none of that name here"));
        }
    }

    /// Does what was done; what is not possible here is left.
    fn perform(&mut self, act: &Act, transitions: &mut Vec<Transition>) {
        let find = |board: &Self, target: &Target| {
            let named = board.alarms.iter().position(|alarm| alarm.definition.name == target.alarm);
            named.filter(|_| target.corridor == board.corridor)
        };
        match &act.deed {
            Deed::Silence => self.elapse(act.time, transitions),
            Deed::Action(target, action) => {
                let done = find(self, target).and_then(|alarm| self.act(alarm, action, act.time).ok());
                let by = act.by.as_deref().and_then(|by| written(by).ok());
                transitions.extend(done.map(|done| Transition { by, ..done }));
            }
            Deed::Note(target, text) => {
                let _noted = find(self, target).map(|alarm| self.note(alarm, text, act.time));
            }
        }
    }
}

impl AlarmMemory {
    fn is_on(&self, kind: Kind) -> bool {
        self.on == kind.word()
    }
}

impl Standing {
    /// With texts that can be shown.
    fn shown(self) -> Self {
        let shown = |text: Option<Arc<str>>| text.and_then(|text| written(&text).ok());
        Self { about: shown(self.about), reason: shown(self.reason), note: shown(self.note), ..self }
    }
}
