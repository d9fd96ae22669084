//! Where assessments come from: a live feed or a recording, each on a thread of its own.
//!
//! What is sent is always the whole present, in a [`Parcel`] that is cheap to clone. Only the newest is kept, so a
//! slow screen never slows the desk, and a fast desk never floods the screen.

mod parcel;

pub use parcel::{FeedReport, Order, Origin, Parcel, Playback, SPEEDS, Seeking};
