//! Frames: what they are, where they come from, and what of them still stands.

mod aside;
mod channel;
mod connect;
mod csv;
mod decoder;
mod draft;
mod follow;
mod frame;
mod frame_text;
mod inlet;
mod input;
mod jsonl;
mod line_error;
mod lines;
mod listen;
mod live;
mod merge;
mod monitor;
mod opening;
mod places;
mod recorded;
mod snapshot;
pub(crate) mod stamp;
mod stream;
mod switch;
mod tally;

pub use crate::grid::End;
pub use aside::{Aside, Start, Untaken, Why};
pub(crate) use aside::{Kept, Present};
pub use channel::{Channels, Point, Quantity, Slot};
pub use decoder::{Decoder, Format};
pub use frame::{Frame, Quality, Reading};
pub use frame_text::FrameText;
pub use input::{Address, Input, InputError};
pub use live::{Feed, OpenError, Patience};
pub use monitor::{InputState, InputStatus, Monitor};
pub use recorded::{Reader, Recorded};
pub use snapshot::{Holder, Snapshot};
pub use tally::{Named, Tally};

use chrono::{DateTime, Datelike, Utc};
use line_error::LineError;
pub(crate) use lines::MAX_LINE_BYTES;

fn rfc3339(text: &str) -> Result<DateTime<Utc>, LineError> {
    let time = DateTime::parse_from_rfc3339(text).map(|time| time.to_utc()).map_err(|_| LineError::Time)?;
    // An offset can carry a year over the edge of what RFC 3339 can write.
    if (0..=9999).contains(&time.year()) { Ok(time) } else { Err(LineError::Time) }
}
