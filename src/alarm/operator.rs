use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};
use thiserror::Error;

use super::{Event, State};
use crate::config::wording::printable;

/// An alarm may be shelved for so long at a time: what must be away for longer goes out of service.
pub const LONGEST_SHELVING: TimeDelta = TimeDelta::hours(24);
/// Longest reason and note, characters.
const LONGEST_TEXT: usize = 500;

/// What an operator does with an alarm.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Action {
    /// Says that he has seen it.
    Acknowledge,
    /// Puts it aside for a time, with a reason.
    Shelve {
        /// Its end, in the frames' time.
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
