//! The journal: what the alarms did and what was done with them, in an embedded SQLite database.
//!
//! An entry is durable before [`Journal::write`] says so (write-ahead log, `synchronous = FULL`). Any tool that reads
//! SQLite can open the database read-only, also while the program runs. Its `application_id` is 1952544116 ("taut"), its
//! `user_version` the version of this schema, 1:
//!
//! `entry`, one row for everything that happened, in the order of `id`:
//!
//! | column | meaning |
//! | --- | --- |
//! | `id` | ascending |
//! | `time` | when, in the frames' time: UTC, `2031-03-14T05:00:00.000000Z`, which sorts as text |
//! | `written` | when it was written, by the clock of the machine, likewise |
//! | `kind` | `transition`, `note`, `configuration`, `start`, `stop`, `lost` |
//! | `corridor`, `alarm` | the names; null where it is about none |
//! | `priority` | `low`, `medium`, `high`, `urgent` |
//! | `event` | why it went from one state to another: the words of [`Event`](crate::alarm::Event) |
//! | `from_state`, `to_state` | the words of [`State`](crate::alarm::State) |
//! | `value`, `about` | the watched value, and the outage, circuit, channel or bus it is of |
//! | `until` | end of a shelving |
//! | `text` | a reason, a note, what a configuration changed |
//! | `by` | who did it, where the program was told |
//!
//! `standing`, one row for each alarm that ever was in another state than normal (key: `corridor`, `alarm`): its `state`,
//! `since` when, when it was `raised` last with which `value` `about` what, `until` when it is shelved and for which
//! `reason`, and the last `note`. Each row is changed together with the entry that changes it.

mod database;
mod entry;
mod error;
mod keeper;
mod reading;

pub use entry::Entry;
pub use error::JournalError;
pub use keeper::{Journal, LONGEST_BACKLOG, Status};
pub use reading::{Entries, ReadOnly};

use chrono::{DateTime, NaiveDateTime, Utc};

/// Fixed width, so that it sorts as text.
const TIME_FORMAT: &str = "%Y-%m-%dT%H:%M:%S%.6fZ";

fn stamp(time: DateTime<Utc>) -> String {
    time.format(TIME_FORMAT).to_string()
}

fn time_of(stamp: &str) -> Option<DateTime<Utc>> {
    NaiveDateTime::parse_from_str(stamp, TIME_FORMAT).ok().map(|time| time.and_utc())
}
