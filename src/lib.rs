//! How many more megawatts may a long AC corridor carry so that the next outage is still survived?
//!
//! A frame of measurements flows one way through these rooms:
//!
//! 1. [`feed`] reads frames from files, pipes and sockets,
//! 2. [`desk`] takes each corridor of a frame through [`fit`] (measurements to a state), [`source`] (what
//!    stands behind each terminal) and [`margin`] (every outage, the headroom), on top of [`network`]
//!    (two-ports, admittance, reduction),
//! 3. [`alarm`] watches them, and [`journal`] keeps what the alarms did,
//! 4. [`screen`] and [`report`] show the assessments, and [`command`] ties a feed, a desk and one of these together.
//!
//! [`grid`] says what a corridor is, [`config`] reads one from a file, and [`drill`] makes feeds with known truth.
#![forbid(unsafe_code)]

pub mod alarm;
pub mod command;
pub mod config;
pub mod desk;
pub mod drill;
pub mod feed;
pub mod fit;
pub mod grid;
pub mod journal;
pub mod margin;
pub mod network;
pub mod report;
pub mod screen;
pub mod source;
