use std::{fmt, sync::Arc};

use chrono::TimeDelta;
use serde::{Deserialize, Serialize};

use super::{Direction, Kind};

/// One alarm of one corridor, as configured.
#[derive(Debug, Clone, PartialEq)]
pub struct Definition {
    /// Unique in the corridor; its states and its journal go by it.
    pub name: Arc<str>,
    /// What it watches.
    pub kind: Kind,
    /// How soon the operator must respond.
    pub priority: Priority,
    /// Raised at it and beyond it, in the unit of the kind.
    pub setpoint: f64,
    /// Returns to normal once so much on the good side of the setpoint.
    pub deadband: f64,
    /// How long the condition holds before the alarm is raised.
    pub on_delay: TimeDelta,
    /// How long it is gone before the alarm returns to normal.
    pub off_delay: TimeDelta,
    /// What it means.
    pub message: Arc<str>,
    /// What the operator can do.
    pub action: Arc<str>,
    /// When it is suppressed by design.
    pub suppress_while: Suppression,
}

/// Conditions of which any suppresses an alarm by design.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Suppression {
    /// One of these circuits is out.
    pub circuits_out: Vec<Arc<str>>,
    /// The transfer is below this, MW.
    pub transfer_below_mw: Option<f64>,
}

/// How soon an alarm needs a response.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Priority {
    /// Within the shift.
    Low,
    /// Within the hour.
    Medium,
    /// Within minutes.
    High,
    /// At once.
    Urgent,
}

impl Priority {
    /// All of them, from low to urgent.
    pub const ALL: [Self; 4] = [Self::Low, Self::Medium, Self::High, Self::Urgent];

    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Low => "low",
            Self::Medium => "medium",
            Self::High => "high",
            Self::Urgent => "urgent",
        }
    }

    /// The priority of that word.
    pub fn from_word(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|priority| priority.word() == word)
    }
}

impl fmt::Display for Priority {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.word())
    }
}

impl Definition {
    /// Whether a value is at the setpoint or beyond.
    pub(super) fn is_beyond(&self, value: f64) -> bool {
        match self.kind.direction() {
            Direction::Low => value <= self.setpoint,
            Direction::High => value >= self.setpoint,
        }
    }

    /// Whether a value is on the good side by more than the deadband.
    pub(super) fn is_clear(&self, value: f64) -> bool {
        match self.kind.direction() {
            Direction::Low => value > self.setpoint + self.deadband,
            Direction::High => value < self.setpoint - self.deadband,
        }
    }
}
