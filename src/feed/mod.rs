//! Frames: what they are, where they come from, and what of them still stands.

mod channel;
mod frame;
mod snapshot;

pub use channel::{Channels, End, Point, Quantity, Slot};
pub use frame::{Frame, Quality, Reading};
pub use snapshot::{Holder, Snapshot};
