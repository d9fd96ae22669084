//! Frames: what they are, where they come from, and what of them still stands.

mod channel;
mod csv;
mod decoder;
mod draft;
mod frame;
mod jsonl;
mod line_error;
mod lines;
mod snapshot;
mod tally;

pub use channel::{Channels, End, Point, Quantity, Slot};
pub use frame::{Frame, Quality, Reading};
pub use snapshot::{Holder, Snapshot};
pub use tally::{Named, Tally};

use chrono::{DateTime, Utc};
use line_error::LineError;

fn rfc3339(text: &str) -> Result<DateTime<Utc>, LineError> {
    DateTime::parse_from_rfc3339(text).map(|time| time.to_utc()).map_err(|_| LineError::Time)
}
