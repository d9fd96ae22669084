//! Recorded days on paper: how close each corridor came, when, because of what, and what a change would have made of it.
//!
//! A [`Day`] is one UTC day, reviewed on its own: all its times are whole milliseconds and all its figures belong to it alone,
//! so that it does not matter where and in which order days are reviewed. A [`Review`] is any number of them put
//! together, always in the order of their dates.

mod archive;
mod bench;
mod course;
mod day;
mod durations;
mod job;
mod part;
mod run;
mod series;
mod tallied;
mod whole;

pub use archive::{Archive, ArchiveError, ArchiveKey, Deferred, Follow, Stretch};
pub use bench::{Bench, Rows, Task};
pub use course::{AlarmCount, Binding, Course, Least, Unbalanced};
pub use day::{Beginning, CorridorDay, Day, FileNote, MeterNote, SourceNote};
pub use durations::Durations;
pub use job::Job;
pub use part::{Part, PartError, Terms};
pub use run::{Done, Output, Reviewed, Run};
pub use series::{Series, Slot};
pub use tallied::{Share, Tallied};
pub use whole::{Brief, CorridorReview, DayFigures, Review};
