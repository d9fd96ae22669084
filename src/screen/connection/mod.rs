//! Where assessments come from: a live feed or a recording, each on a thread of its own.
//!
//! What is sent is always the whole present, in a [`Parcel`] that is cheap to clone. Only the newest is kept, so a
//! slow screen never slows the desk, and a fast desk never floods the screen.

mod alarms;
mod duty;
mod keeper;
mod live;
mod marks;
mod parcel;
mod player;
mod recording;
mod replay;
mod report;
mod revision;
mod survey;

pub use alarms::{AlarmKey, AlarmOrder, AlarmReport, Alarms, LOG_KEPT, Seen, Wish};
pub use duty::Duty;
pub use keeper::Keeper;
pub use live::Live;
pub use marks::{MARKS_MAX, Mark, MarkBook, MarkReport, MarkWish};
pub use parcel::{FeedReport, InputReport, Order, Origin, Parcel, Playback, SPEEDS, Scene, Seeking, Setting};
pub use player::{Beginning, Goal, Place, Player};
pub use recording::Recording;
pub use replay::Replay;
pub use revision::{Change, Revision};
pub use survey::Surveyor;
