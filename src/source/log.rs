//! What was seen: the recent steps, and how the spread shrank.

use chrono::{DateTime, Utc};
use serde::{Deserialize, Serialize};

/// Which side's voltage behind the impedance a step moved.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Moved {
    /// Neither: a switched circuit, a redispatch.
    Neither,
    /// The `from` side.
    From,
    /// The `to` side.
    To,
    /// Both at once.
    Both,
}

/// A sudden step, judged.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Step {
    /// When.
    pub time: DateTime<Utc>,
    /// What most probably happened.
    pub moved: Moved,
    /// Its probability, 0 to 1.
    pub probability: f64,
    /// Change of the voltages behind both impedances, kV.
    pub de_kv: [f64; 2],
    /// Whether a circuit or a bank of the corridor was switched.
    pub topology_changed: bool,
    /// Whether one of the cases fits what was known before.
    pub explained: bool,
    /// Whether the step widened the spread to the configured one again.
    pub widened: bool,
}

/// The spread at one time.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SpreadPoint {
    /// When.
    pub time: DateTime<Utc>,
    /// Reactance `from` and `to`, ohm.
    pub x_ohm: [f64; 2],
    /// Its standard deviation, ohm.
    pub x_sd_ohm: [f64; 2],
}
