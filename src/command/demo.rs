//! The bundled demo day.

use super::{Failure, replay};
use crate::{config::Config, screen::connection::Recording};

/// `config/demo.toml`.
const CONFIG: &str = include_str!("../../config/demo.toml");
/// `replay-data/demo-day.jsonl.zst`.
const DAY: &[u8] = include_bytes!("../../replay-data/demo-day.jsonl.zst");
/// Recorded seconds in a second: the day takes twelve minutes.
const SPEED: u32 = 120;

/// Replays the demo day, or reviews it as text when standard output is not a terminal.
pub fn run() -> Result<(), Failure> {
    let config = Config::parse(CONFIG, "config/demo.toml")?;
    let start = replay::Start { speed: SPEED, at: None, paused: false };
    replay::play(&config, &Recording::Within { name: "the demo day", bytes: DAY }, &start)
}
