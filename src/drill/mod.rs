//! Made-up feeds with known truth, to commission the program and to try an alarm chain from end to end.
//!
//! A [`Scenario`] says what is true and what happens; a [`Drill`] plays it, frame by frame, the same to the last byte
//! for the same seed. Each corridor is a network between two sources E∠δ behind Z; its machines are the classical
//! two-machine equivalent, damped. A source has one face here: a drill knows no difference between the settled
//! impedance and that of the first swing.
//!
//! A scenario file says everything that can be said like this:
//! ```toml
#![doc = include_str!("keys.toml")]
//! ```

mod agenda;
mod chance;
mod corridor_feed;
mod happen;
mod invent;
mod meter;
mod output;
mod plan;
mod plant;
mod play;
mod reader;
mod scenario;
mod shape;
mod swing;
mod truth;
mod world;

pub use invent::{Invented, Invention};
pub use output::{Output, OutputError};
pub use play::Drill;
pub use scenario::{
    Action, Change, CorridorTruth, Dispatch, Event, FalseMeter, Gap, LoadTruth, Metering, PerKind, RandomSteps,
    Scenario, SideTruth, Span, Wander,
};
pub use shape::Shape;
pub use swing::{Inertia, Swing};
pub use truth::{Says, Source, Truth, What};
