//! What is worth a line: states, switching, steps of the sources, meters, gaps and alarms, as they came, in words.

mod event;
mod flutter;
mod teller;

pub(crate) use event::reason;
pub use event::{Event, EventKind, gap};
pub use teller::Teller;
