use chrono::{DateTime, Utc};
use serde::{Deserialize, Serialize};

use super::{Definition, Event, reading::Reading};
use crate::feed::stamp;

/// Whether an alarm's condition holds, after deadband and delays.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub(super) struct Condition {
    pub active: bool,
    /// Since when the value asks for the other.
    #[serde(with = "stamp::optional")]
    pending: Option<DateTime<Utc>>,
}

impl Condition {
    pub fn new(active: bool) -> Self {
        Self { active, pending: None }
    }

    /// Takes a reading in; the event when the condition begins or ends by it.
    pub fn take(&mut self, definition: &Definition, time: DateTime<Utc>, reading: Reading<'_>) -> Option<Event> {
        let wanted = match reading {
            // What is not known changes nothing, and does not count for a delay.
            Reading::Unknown => self.active,
            Reading::Absent => false,
            Reading::Value(value, _) if self.active => !definition.is_clear(value),
            Reading::Value(value, _) => definition.is_beyond(value),
        };
        if wanted == self.active {
            self.pending = None;
            return None;
        }
        let (delay, event) =
            if wanted { (definition.on_delay, Event::Alarm) } else { (definition.off_delay, Event::Return) };
        let since = *self.pending.get_or_insert(time);
        (time - since >= delay).then(|| {
            *self = Self::new(wanted);
            event
        })
    }
}
