//! The screen: three rooms and a loop.
//!
//! - [`connection`] runs feed and desk and sends what came of it: the only room of the screen that knows them;
//! - [`state`] is everything the screen remembers, with no terminal: keys and parcels go in, orders come out;
//! - [`view`] draws the state onto a frame and computes nothing of the physics;
//! - [`export`] writes what was drawn to a file.
//!
//! [`run()`] is the loop between them, keys first, and [`terminal`] sees to it that the terminal comes back whole.

pub mod connection;
pub mod export;
mod pace;
mod run;
pub mod state;
pub mod terminal;
pub mod view;

pub use run::{Ending, run};
