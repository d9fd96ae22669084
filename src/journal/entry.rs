use std::{borrow::Cow, sync::Arc};

use chrono::{DateTime, SecondsFormat, Utc};
use serde::{Serialize, Serializer};

use crate::alarm::{Event, Note, Restored, State, Transition};

/// One thing that happened, in the words that the database holds.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Entry {
    /// In the frames' time.
    #[serde(serialize_with = "rfc3339")]
    pub time: DateTime<Utc>,
    /// `transition`, `note`, `configuration`, `start`, `stop` or `lost`.
    pub kind: Cow<'static, str>,
    /// The corridor's name.
    pub corridor: Option<Arc<str>>,
    /// The alarm's name.
    pub alarm: Option<Arc<str>>,
    /// The alarm's priority.
    pub priority: Option<Cow<'static, str>>,
    /// Why it went from one state to another.
    pub event: Option<Cow<'static, str>>,
    /// From where.
    pub from: Option<Cow<'static, str>>,
    /// To where.
    pub to: Option<Cow<'static, str>>,
    /// The watched value.
    pub value: Option<f64>,
    /// What it is of.
    pub about: Option<Arc<str>>,
    /// End of a shelving.
    #[serde(serialize_with = "rfc3339_or_null")]
    pub until: Option<DateTime<Utc>>,
    /// A reason, a note, what changed.
    pub text: Option<Arc<str>>,
    /// Who did it.
    pub by: Option<Arc<str>>,
}

impl Entry {
    /// An alarm went from one state to another.
    pub fn transition(transition: &Transition) -> Self {
        Self {
            corridor: Some(transition.corridor.clone()),
            alarm: Some(transition.alarm.clone()),
            priority: Some(transition.priority.word().into()),
            event: Some(transition.event.word().into()),
            from: Some(transition.from.word().into()),
            to: Some(transition.to.word().into()),
            value: transition.value,
            about: transition.about.clone(),
            until: transition.until,
            text: transition.reason.clone(),
            by: transition.by.clone(),
            ..Self::plain("transition", transition.time)
        }
    }

    /// A note was put on an alarm.
    pub fn note(note: &Note) -> Self {
        Self {
            corridor: Some(note.corridor.clone()),
            alarm: Some(note.alarm.clone()),
            text: Some(note.text.clone()),
            ..Self::plain("note", note.time)
        }
    }

    /// An alarm that was kept is defined no longer.
    pub fn withdrawn(kept: &Restored, time: DateTime<Utc>) -> Self {
        Self {
            corridor: Some(kept.corridor.as_str().into()),
            alarm: Some(kept.alarm.as_str().into()),
            event: Some(Event::Withdraw.word().into()),
            from: Some(kept.standing.state.word().into()),
            to: Some(State::Normal.word().into()),
            ..Self::plain("transition", time)
        }
    }

    /// The configuration changed; the text says what.
    pub fn configuration(time: DateTime<Utc>, what: &str) -> Self {
        Self { text: Some(what.into()), ..Self::plain("configuration", time) }
    }

    /// Watching began.
    pub fn start(time: DateTime<Utc>, how: &str) -> Self {
        Self { text: Some(how.into()), ..Self::plain("start", time) }
    }

    /// Watching ended.
    pub fn stop(time: DateTime<Utc>, how: &str) -> Self {
        Self { text: Some(how.into()), ..Self::plain("stop", time) }
    }

    /// Entries could not be written, and were more than can be held.
    pub(super) fn lost(time: DateTime<Utc>, count: u64) -> Self {
        let text = format!("{count} entries were lost while the journal could not be written");
        Self { text: Some(text.into()), ..Self::plain("lost", time) }
    }

    /// The same, done by somebody.
    #[must_use]
    pub fn by(self, who: &str) -> Self {
        Self { by: Some(who.into()), ..self }
    }

    pub(super) fn plain(kind: impl Into<Cow<'static, str>>, time: DateTime<Utc>) -> Self {
        Self {
            time,
            kind: kind.into(),
            corridor: None,
            alarm: None,
            priority: None,
            event: None,
            from: None,
            to: None,
            value: None,
            about: None,
            until: None,
            text: None,
            by: None,
        }
    }
}

fn rfc3339<S: Serializer>(time: &DateTime<Utc>, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(&time.to_rfc3339_opts(SecondsFormat::AutoSi, true))
}

// The signature is serde's.
#[allow(clippy::ref_option)]
fn rfc3339_or_null<S: Serializer>(time: &Option<DateTime<Utc>>, serializer: S) -> Result<S::Ok, S::Error> {
    match time {
        Some(time) => rfc3339(time, serializer),
        None => serializer.serialize_none(),
    }
}
