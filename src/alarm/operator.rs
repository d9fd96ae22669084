use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};
use serde::{Deserialize, Serialize};
use thiserror::Error;

use super::{Event, State};
use crate::{config::wording::printable, feed::stamp};

/// An alarm may be shelved for so long at a time: what must be away for longer goes out of service.
pub const LONGEST_SHELVING: TimeDelta = TimeDelta::hours(24);
/// Longest reason and note, characters.
const LONGEST_TEXT: usize = 500;

/// What an operator does with an alarm.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Action {
    /// Says that he has seen it.
    Acknowledge,
    /// Puts it aside for a time, with a reason.
    Shelve {
        /// Its end, in the frames' time.
        #[serde(with = "stamp")]
        until: DateTime<Utc>,
        /// Why.
        reason: String,
    },
    /// Brings it back before that.
    Unshelve,
    /// Takes it out of service, with a reason.
    RemoveFromService {
        /// Why.
        reason: String,
    },
    /// Brings it back into service.
    ReturnToService,
}

/// What was done to alarms between two frames: who does the same has the same.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Act {
    /// When, in the frames' time.
    #[serde(with = "stamp")]
    pub time: DateTime<Utc>,
    /// Who did it, where the program was told.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub by: Option<Arc<str>>,
    /// What.
    pub deed: Deed,
}

/// What may happen to alarms between two frames.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Deed {
    /// Time passed without a frame, and alarms noticed it.
    Silence,
    /// An operator's action.
    Action(Target, Action),
    /// An operator's note.
    Note(Target, Arc<str>),
}

/// One alarm by its names.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Target {
    /// The corridor's name.
    pub corridor: Arc<str>,
    /// The definition's name.
    pub alarm: Arc<str>,
}

/// Why an action cannot be done.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum Refusal {
    /// The state does not allow it.
    #[error("an alarm that is {state} cannot {event}")]
    NotPossible {
        /// What it is in.
        state: State,
        /// What was wanted.
        event: Event,
    },
    /// There is no such alarm: the configuration has changed.
    #[error("there is no such alarm any more; choose it again")]
    NotThere,
    /// The end of a shelving lies in the past or too far away.
    #[error("an alarm can be shelved for at most 24 hours from now; take it out of service for longer")]
    ShelvingTime,
    /// Nothing was written.
    #[error("say why: a few words are enough")]
    NoText,
}

impl Action {
    pub(super) fn event(&self) -> Event {
        match self {
            Self::Acknowledge => Event::Acknowledge,
            Self::Shelve { .. } => Event::Shelve,
            Self::Unshelve => Event::Unshelve,
            Self::RemoveFromService { .. } => Event::RemoveFromService,
            Self::ReturnToService => Event::ReturnToService,
        }
    }

    /// Its reason, if it needs one.
    pub(super) fn reason(&self) -> Result<Option<Arc<str>>, Refusal> {
        match self {
            Self::Shelve { reason, .. } | Self::RemoveFromService { reason } => written(reason).map(Some),
            Self::Acknowledge | Self::Unshelve | Self::ReturnToService => Ok(None),
        }
    }

    /// The end of the shelving, if it is one.
    pub(super) fn until(&self, now: DateTime<Utc>) -> Result<Option<DateTime<Utc>>, Refusal> {
        match self {
            Self::Shelve { until, .. } if *until <= now || *until - now > LONGEST_SHELVING => {
                Err(Refusal::ShelvingTime)
            }
            Self::Shelve { until, .. } => Ok(Some(*until)),
            _ => Ok(None),
        }
    }
}

/// A text of the operator's that can be shown and kept.
pub(super) fn written(text: &str) -> Result<Arc<str>, Refusal> {
    let text: String = printable(text.trim()).chars().take(LONGEST_TEXT).collect();
    if text.is_empty() { Err(Refusal::NoText) } else { Ok(text.into()) }
}
