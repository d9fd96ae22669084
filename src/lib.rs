//! How many more megawatts may a long AC corridor carry so that the next outage is still survived?
//!
//! A frame of measurements flows one way through these rooms:
//!
//! 1. [`feed`] reads frames from files, pipes and sockets,
//! 2. [`desk`] takes each corridor of a frame through [`fit`] (measurements to a state), [`source`] (what
//!    stands behind each terminal) and [`margin`] (every outage, the headroom), on top of [`network`]
//!    (two-ports, admittance, reduction),
//! 3. [`alarm`] watches them, [`journal`] keeps what the alarms did, [`recording`] the frames, and [`events`] puts what
//!    happened into words,
//! 4. [`review`] sums recorded days up,
//! 5. [`screen`] and [`report`] show all of it, and [`command`] ties a feed, a desk and one of these together.
//!
//! [`grid`] says what a corridor is, [`config`] reads one from a file, and [`drill`] makes feeds with known truth.
//!
//! ```
//! use std::sync::Arc;
//! use tautline::{config::Config, desk::Desk, feed::{Channels, Decoder, Format, Holder, Tally}};
//!
//! let config = Config::parse(include_str!("../tests/cases/two-area/config.toml"), "config.toml")?;
//! let channels = Arc::new(Channels::new(&config));
//! let (mut tally, mut frames) = (Tally::default(), Vec::new());
//! let mut decoder = Decoder::new(Format::JsonLines, channels.clone());
//! decoder.push(include_bytes!("../tests/cases/two-area/frames.jsonl"), &mut tally, &mut frames);
//! decoder.finish(&mut tally, &mut frames);
//!
//! let mut holder = Holder::new(&channels, chrono::TimeDelta::seconds(10));
//! let mut desk = Desk::new(&config, &channels);
//! let snapshot = holder.take(&frames[0]).expect("the first frame is not older than any");
//! let assessment = &desk.assess(&snapshot)[0];
//! assert!((assessment.headroom_mw.expect("a state") - 47.65).abs() < 0.01);
//! assert_eq!(assessment.binding.as_ref().and_then(|binding| binding.outage.as_deref()), Some("7-8 a"));
//! # Ok::<(), Box<dyn std::error::Error>>(())
//! ```
#![forbid(unsafe_code)]

pub mod alarm;
pub mod command;
pub mod config;
pub mod desk;
pub mod drill;
pub mod events;
pub mod feed;
pub mod fit;
pub mod grid;
pub mod journal;
pub mod margin;
pub mod network;
pub mod recording;
pub mod report;
pub mod review;
pub mod screen;
pub mod source;
mod whole_file;
