use std::sync::Arc;

use chrono::{DateTime, Utc};

use super::{Event, Kind, Priority, Standing, State};

/// An alarm went from one state to another.
#[derive(Debug, Clone, PartialEq)]
pub struct Transition {
    /// Time of the frame, or of the operator's action in the frames' time.
    pub time: DateTime<Utc>,
    /// The corridor.
    pub corridor: Arc<str>,
    /// The definition's name.
    pub alarm: Arc<str>,
    /// What it watches.
    pub on: Kind,
    /// Its priority.
    pub priority: Priority,
    /// Why.
    pub event: Event,
    /// From where.
    pub from: State,
    /// To where.
    pub to: State,
    /// The watched value, in the unit of the kind, where it is known.
    pub value: Option<f64>,
    /// What the value is of: an outage, a circuit, a channel, a bus.
    pub about: Option<Arc<str>>,
    /// The operator's reason.
    pub reason: Option<Arc<str>>,
    /// End of the shelving.
    pub until: Option<DateTime<Utc>>,
    /// Who did it, where a recording tells.
    pub by: Option<Arc<str>>,
}

impl Transition {
    /// Whether it calls for the operator: the standards' annunciated alarm.
    pub fn is_annunciated(&self) -> bool {
        self.to == State::Unacknowledged
    }
}

/// Something the operator wants to be remembered of an alarm.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Note {
    /// When, in the frames' time.
    pub time: DateTime<Utc>,
    /// The corridor.
    pub corridor: Arc<str>,
    /// The definition's name.
    pub alarm: Arc<str>,
    /// The note.
    pub text: Arc<str>,
}

/// An alarm's state as it was kept beyond the end of the program.
#[derive(Debug, Clone, PartialEq)]
pub struct Restored {
    /// The corridor's name.
    pub corridor: String,
    /// The definition's name.
    pub alarm: String,
    /// How it stood.
    pub standing: Standing,
}
