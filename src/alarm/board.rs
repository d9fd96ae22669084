use std::cmp::Reverse;

use chrono::{DateTime, Utc};

use super::{Action, Alarm, CorridorBoard, Note, Priority, Refusal, Restored, State, Transition};
use crate::{config::Config, desk::Assessment};

/// The alarms of all corridors.
#[derive(Debug, Clone)]
pub struct Board {
    /// One each, in the order of the configuration.
    pub corridors: Vec<CorridorBoard>,
}

/// Points at one alarm of a [`Board`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct AlarmId {
    /// Index into [`Board::corridors`].
    pub corridor: usize,
    /// Index into [`CorridorBoard::alarms`].
    pub alarm: usize,
}

/// How many alarms are in each state.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Summary {
    /// Unacknowledged, by priority from low to urgent.
    pub unacknowledged: [usize; Priority::ALL.len()],
    /// Acknowledged, by priority.
    pub acknowledged: [usize; Priority::ALL.len()],
    /// Returned unacknowledged.
    pub returned: usize,
    /// Shelved.
    pub shelved: usize,
    /// Suppressed by design.
    pub suppressed: usize,
    /// Out of service.
    pub out_of_service: usize,
}

impl Board {
    /// All alarms of a configuration, all normal.
    pub fn new(config: &Config) -> Self {
        let corridors = config.grid.corridors.iter().zip(&config.alarms);
        Self { corridors: corridors.map(|(corridor, alarms)| CorridorBoard::new(corridor, alarms)).collect() }
    }

    /// Takes the assessments of a frame in, in the order of the configuration; what changes is in the order of the
    /// corridors and their definitions.
    pub fn observe(&mut self, assessments: &[Assessment]) -> Vec<Transition> {
        let mut transitions = Vec::new();
        for (corridor, assessment) in self.corridors.iter_mut().zip(assessments) {
            corridor.observe(assessment, &mut transitions);
        }
        transitions
    }

    /// Takes in that time has passed without a frame.
    pub fn elapse(&mut self, now: DateTime<Utc>) -> Vec<Transition> {
        let mut transitions = Vec::new();
        self.corridors.iter_mut().for_each(|corridor| corridor.elapse(now, &mut transitions));
        transitions
    }

    /// Does what the operator wants with one alarm, at the time of the latest frame.
    pub fn act(&mut self, id: AlarmId, action: &Action, time: DateTime<Utc>) -> Result<Transition, Refusal> {
        self.corridors.get_mut(id.corridor).ok_or(Refusal::NotThere)?.act(id.alarm, action, time)
    }

    /// Acknowledges those of the alarms that wait for it.
    pub fn acknowledge_all(&mut self, ids: impl IntoIterator<Item = AlarmId>, time: DateTime<Utc>) -> Vec<Transition> {
        ids.into_iter().filter_map(|id| self.act(id, &Action::Acknowledge, time).ok()).collect()
    }

    /// Puts a note on an alarm.
    pub fn note(&mut self, id: AlarmId, text: &str, time: DateTime<Utc>) -> Result<Note, Refusal> {
        self.corridors.get_mut(id.corridor).ok_or(Refusal::NotThere)?.note(id.alarm, text, time)
    }

    /// One alarm.
    pub fn get(&self, id: AlarmId) -> Option<&Alarm> {
        self.corridors.get(id.corridor)?.alarms().get(id.alarm)
    }

    /// All alarms, corridor by corridor.
    pub fn alarms(&self) -> impl Iterator<Item = (AlarmId, &Alarm)> {
        let corridors = self.corridors.iter().enumerate();
        corridors.flat_map(|(corridor, board)| {
            let alarms = board.alarms().iter().enumerate();
            alarms.map(move |(alarm, shown)| (AlarmId { corridor, alarm }, shown))
        })
    }

    /// All that are not normal: first those that wait to be acknowledged, and among equals the newest first.
    pub fn abnormal(&self) -> Vec<AlarmId> {
        let abnormal = self.alarms().filter(|(_, alarm)| alarm.standing.state != State::Normal);
        let mut keyed: Vec<_> = abnormal
            .map(|(id, alarm)| {
                let rank = match alarm.standing.state {
                    State::Unacknowledged | State::ReturnedUnacknowledged => 0,
                    State::Acknowledged => 1,
                    _ => 2,
                };
                let since = if rank == 2 { alarm.standing.since } else { alarm.standing.raised };
                (rank, Reverse(since), Reverse(alarm.definition.priority), id)
            })
            .collect();
        keyed.sort_unstable();
        keyed.into_iter().map(|(.., id)| id).collect()
    }

    /// How many are in each state.
    pub fn summary(&self) -> Summary {
        let mut summary = Summary::default();
        for (_, alarm) in self.alarms() {
            let priority = alarm.definition.priority as usize;
            match alarm.standing.state {
                State::Normal => {}
                State::Unacknowledged => summary.unacknowledged[priority] += 1,
                State::Acknowledged => summary.acknowledged[priority] += 1,
                State::ReturnedUnacknowledged => summary.returned += 1,
                State::Shelved => summary.shelved += 1,
                State::Suppressed => summary.suppressed += 1,
                State::OutOfService => summary.out_of_service += 1,
            }
        }
        summary
    }

    /// Sets alarms to how they were kept, before the first frame; returns those that are no longer defined.
    pub fn restore(&mut self, kept: Vec<Restored>) -> Vec<Restored> {
        let unknown = |restored: &Restored| {
            let board = self.corridors.iter_mut().find(|board| **board.corridor() == *restored.corridor);
            !board.is_some_and(|board| board.restore(restored))
        };
        kept.into_iter().filter(unknown).collect()
    }

    /// Goes on under another configuration, at the time of the latest frame: alarms keep their states by the names of
    /// corridor and definition, and those that are gone are withdrawn.
    pub fn reconfigure(&mut self, config: &Config, time: DateTime<Utc>) -> Vec<Transition> {
        let mut transitions = Vec::new();
        let mut before = std::mem::replace(self, Self::new(config)).corridors;
        for board in &mut self.corridors {
            if let Some(index) = before.iter().position(|old| old.corridor() == board.corridor()) {
                board.take_over(before.swap_remove(index), time, &mut transitions);
            }
        }
        for gone in before {
            gone.withdraw(time, &mut transitions);
        }
        transitions
    }
}
