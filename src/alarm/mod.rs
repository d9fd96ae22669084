//! Alarms an operator can live with, after IEC 62682 and ANSI/ISA-18.2: what they watch, when they are raised, and what
//! the operator does with them.
//!
//! A [`Definition`] says what to watch; a [`Board`] keeps the state of each alarm. Assessments, the passing of time and
//! the operator's actions go in, [`Transition`]s come out. Time is the frames' time, so that the same frames give
//! the same transitions, live or replayed.

mod board;
mod built_in;
mod condition;
mod corridor_board;
mod definition;
mod kind;
mod memory;
mod operator;
mod reading;
mod state;
mod transition;
pub mod trial;

pub use board::{AlarmId, Board, Summary};
pub use built_in::{BUILT_IN, built_in};
pub use corridor_board::{Alarm, CorridorBoard, Standing};
pub use definition::{Definition, Priority, Suppression};
pub use kind::{Direction, Kind};
pub use memory::BoardMemory;
pub use operator::{Act, Action, Deed, LONGEST_SHELVING, Refusal, Target};
pub use state::{Event, State};
pub use transition::{Note, Restored, Transition};
