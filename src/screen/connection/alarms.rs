use std::{
    collections::{HashSet, VecDeque},
    sync::Arc,
};

use chrono::{DateTime, TimeDelta, Utc};

use crate::{
    alarm::{Act, Action, Alarm, AlarmId, Board, Deed, Priority, Refusal, Target, Transition},
    config::Config,
    desk::Assessment,
    feed::Aside,
    journal::{Entry, Status},
};

/// Entries kept in memory; older ones are in the journal, or forgotten where there is none.
pub const LOG_KEPT: usize = 2000;

/// Names one alarm, also after the configuration has changed.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct AlarmKey {
    /// The corridor's name.
    pub corridor: Arc<str>,
    /// The definition's name.
    pub alarm: Arc<str>,
}

/// What the operator asks for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct AlarmOrder {
    /// Counts up, so that the answer can be told from others.
    pub number: u64,
    /// What.
    pub wish: Wish,
}

/// What can be asked for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Wish {
    /// Acknowledges those that have not been raised anew since they were seen.
    Acknowledge(Vec<Seen>),
    /// Puts one aside.
    Shelve {
        /// Which.
        key: AlarmKey,
        /// For how long.
        span: TimeDelta,
        /// Why.
        reason: String,
    },
    /// Anything else that changes a state.
    Act(AlarmKey, Action),
    /// Puts a note on one.
    Note(AlarmKey, String),
    /// Brings everything that is known to have happened to one.
    History(AlarmKey),
}

/// An alarm as the operator saw it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Seen {
    /// Which.
    pub key: AlarmKey,
    /// When it was raised.
    pub raised: Option<DateTime<Utc>>,
}

/// The alarms beside the desk, and what they did of late. A function of frames and orders, and cheap to clone.
#[derive(Debug, Clone)]
pub struct Alarms {
    /// How they stand.
    pub board: Arc<Board>,
    /// What they did, newest last.
    pub log: Arc<VecDeque<Arc<Entry>>>,
    /// How often one was raised, by priority.
    pub raised: [u64; Priority::ALL.len()],
    /// The frames' time.
    pub now: Option<DateTime<Utc>>,
}

/// Everything a screen shows of alarms.
#[derive(Debug, Clone, Default)]
pub struct AlarmReport {
    /// How they stand.
    pub alarms: Alarms,
    /// The last order that was answered.
    pub answered: u64,
    /// Why it was refused.
    pub refusal: Option<String>,
    /// How the journal is doing; `None` where none is kept.
    pub journal: Option<Status>,
    /// Alarms with entries that are not durable yet.
    pub unwritten: Arc<HashSet<AlarmKey>>,
    /// The history asked for last, from the journal.
    pub history: Option<Arc<(AlarmKey, Vec<Entry>)>>,
}

impl Wish {
    /// What was done, going by the entry that tells of it.
    pub(super) fn act(&self, entry: &Entry) -> Option<Act> {
        let target = Target { corridor: entry.corridor.clone()?, alarm: entry.alarm.clone()? };
        let deed = match self {
            Self::Acknowledge(_) => Deed::Action(target, Action::Acknowledge),
            Self::Shelve { reason, .. } => {
                Deed::Action(target, Action::Shelve { until: entry.until?, reason: reason.clone() })
            }
            Self::Act(_, action) => Deed::Action(target, action.clone()),
            Self::Note(_, text) => Deed::Note(target, text.as_str().into()),
            Self::History(_) => return None,
        };
        Some(Act { time: entry.time, by: entry.by.clone(), deed })
    }
}

impl AlarmKey {
    /// Of an alarm of a board.
    pub fn of(board: &Board, id: AlarmId) -> Option<Self> {
        let corridor = board.corridors.get(id.corridor)?.corridor().clone();
        Some(Self { corridor, alarm: board.get(id)?.definition.name.clone() })
    }

    /// The alarm on a board; `None` once it is defined no longer.
    pub fn find(&self, board: &Board) -> Option<AlarmId> {
        let corridor = board.corridors.iter().position(|corridor| *corridor.corridor() == self.corridor)?;
        let alarms = board.corridors[corridor].alarms();
        let alarm = alarms.iter().position(|alarm| alarm.definition.name == self.alarm)?;
        Some(AlarmId { corridor, alarm })
    }

    /// Whether an entry is about it.
    pub fn is_of(&self, entry: &Entry) -> bool {
        entry.corridor.as_ref() == Some(&self.corridor) && entry.alarm.as_ref() == Some(&self.alarm)
    }
}

impl Default for Alarms {
    fn default() -> Self {
        Self::new(Board { corridors: Vec::new() })
    }
}

impl Alarms {
    /// Nothing happened yet.
    pub fn new(board: Board) -> Self {
        Self { board: Arc::new(board), log: Arc::default(), raised: [0; Priority::ALL.len()], now: None }
    }

    /// Takes the assessments of a frame in; what is to be written of it.
    pub fn observe(&mut self, assessments: &[Assessment]) -> Vec<Entry> {
        self.now = self.now.max(assessments.first().map(|assessment| assessment.time));
        let transitions = Arc::make_mut(&mut self.board).observe(assessments);
        self.tell(&transitions)
    }

    /// Takes in that time has passed without a frame.
    pub fn elapse(&mut self, now: DateTime<Utc>) -> Vec<Entry> {
        self.now = self.now.max(Some(now));
        let transitions = Arc::make_mut(&mut self.board).elapse(now);
        self.tell(&transitions)
    }

    /// Does what the operator asks for, in his name.
    pub fn obey(&mut self, wish: &Wish, by: Option<&str>) -> Result<Vec<Entry>, Refusal> {
        let time = self.now.unwrap_or_else(Utc::now);
        let board = Arc::make_mut(&mut self.board);
        let act = |board: &mut Board, key: &AlarmKey, action: &Action| {
            board.act(key.find(board).ok_or(Refusal::NotThere)?, action, time)
        };
        let signed = |entry: Entry| if let Some(by) = by { entry.by(by) } else { entry };
        let done = match wish {
            Wish::Acknowledge(seen) => {
                let as_seen = |seen: &Seen| {
                    let alarm = seen.key.find(board).and_then(|id| board.get(id));
                    alarm.is_some_and(|alarm| alarm.standing.raised == seen.raised)
                };
                let unchanged: Vec<_> = seen.iter().filter(|seen| as_seen(seen)).collect();
                unchanged.into_iter().filter_map(|seen| act(board, &seen.key, &Action::Acknowledge).ok()).collect()
            }
            Wish::Shelve { key, span, reason } => {
                let until = time.checked_add_signed(*span).ok_or(Refusal::ShelvingTime)?;
                vec![act(board, key, &Action::Shelve { until, reason: reason.clone() })?]
            }
            Wish::Act(key, action) => vec![act(board, key, action)?],
            Wish::Note(key, text) => {
                let note = board.note(key.find(board).ok_or(Refusal::NotThere)?, text, time)?;
                let entries = vec![signed(Entry::note(&note))];
                self.keep(&entries);
                return Ok(entries);
            }
            Wish::History(_) => return Ok(Vec::new()),
        };
        let entries: Vec<_> = done.iter().map(|transition| signed(Entry::transition(transition))).collect();
        self.keep(&entries);
        Ok(entries)
    }

    /// Goes on under another configuration.
    pub fn reconfigure(&mut self, config: &Config, time: DateTime<Utc>) -> Vec<Entry> {
        let transitions = Arc::make_mut(&mut self.board).reconfigure(config, time);
        self.tell(&transitions)
    }

    /// Takes up what a recording says before a frame.
    pub fn take_up(&mut self, aside: &Aside) {
        let transitions = Arc::make_mut(&mut self.board).take_up(aside);
        self.tell(&transitions);
    }

    /// One alarm; `None` once it is defined no longer.
    pub fn get(&self, key: &AlarmKey) -> Option<&Alarm> {
        self.board.get(key.find(&self.board)?)
    }

    /// Writes down what happened.
    pub fn tell(&mut self, transitions: &[Transition]) -> Vec<Entry> {
        for transition in transitions.iter().filter(|transition| transition.is_annunciated()) {
            self.raised[transition.priority as usize] += 1;
        }
        let entries: Vec<_> = transitions.iter().map(Entry::transition).collect();
        self.keep(&entries);
        entries
    }

    /// Adds to what is kept in memory.
    pub fn keep(&mut self, entries: &[Entry]) {
        if entries.is_empty() {
            return;
        }
        let log = Arc::make_mut(&mut self.log);
        log.extend(entries.iter().cloned().map(Arc::new));
        log.drain(..log.len().saturating_sub(LOG_KEPT));
    }

    /// Whether any alarm waits to be acknowledged.
    pub fn calls(&self) -> bool {
        self.board.alarms().any(|(_, alarm)| alarm.standing.state.calls())
    }
}
