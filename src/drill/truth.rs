//! The truth beside the frames, one JSON object a line.

use std::sync::Arc;

use chrono::{DateTime, SecondsFormat, Utc};
use serde::{Serialize, Serializer};

/// Something true of one corridor.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Truth {
    /// When.
    #[serde(serialize_with = "rfc3339")]
    pub time: DateTime<Utc>,
    /// The corridor's name.
    pub corridor: Arc<str>,
    /// What.
    #[serde(flatten)]
    pub what: What,
}

/// What is true.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(tag = "what", rename_all = "kebab-case")]
pub enum What {
    /// How the corridor stands, once a minute.
    State {
        /// Behind the `from` and the `to` bus.
        sources: [Source; 2],
        /// Between them, `from` minus `to`, degrees.
        internal_angle_deg: f64,
        /// From the `from` terminal into the circuits, MW.
        transfer_mw: f64,
    },
    /// A voltage behind a terminal moved, or both did.
    Step {
        /// By how many kV, behind `from` and `to`.
        kv: [f64; 2],
    },
    /// An impedance behind a terminal changed.
    Impedance {
        /// The terminal bus.
        bus: Arc<str>,
        /// New resistance, ohm.
        r_ohm: f64,
        /// New reactance, ohm.
        x_ohm: f64,
    },
    /// A circuit or a bank was switched.
    Switched {
        /// Its name.
        name: Arc<str>,
        /// Closed or inserted.
        in_service: bool,
    },
    /// A circuit was to be closed, and the synchronism check refused.
    CloseRefused {
        /// Its name.
        name: Arc<str>,
        /// Standing angle across it, degrees.
        angle_deg: f64,
        /// Voltage difference across it, % of nominal.
        voltage_pct: f64,
    },
    /// A fault began on a circuit.
    Fault {
        /// Its name.
        name: Arc<str>,
    },
    /// A channel's meter began to say something else than before.
    Meter {
        /// The channel's default name.
        channel: Arc<str>,
        /// What it says.
        says: Says,
    },
    /// The two sides fell out of step, and every circuit opened.
    OutOfStep,
}

/// What a meter says.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Says {
    /// The truth, but for noise and the like.
    #[default]
    Truth,
    /// Something else.
    Falsehood,
    /// Nothing: its channel is missing.
    Nothing,
}

/// A source as it really is.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Source {
    /// The terminal bus.
    pub bus: Arc<str>,
    /// Voltage behind the impedance, kV line-to-line.
    pub e_kv: f64,
    /// Resistance, ohm.
    pub r_ohm: f64,
    /// Reactance, ohm.
    pub x_ohm: f64,
}

fn rfc3339<S: Serializer>(time: &DateTime<Utc>, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(&time.to_rfc3339_opts(SecondsFormat::AutoSi, true))
}

/// A value without the digits in which two machines may differ.
pub(super) fn rounded(value: f64) -> f64 {
    (value * 1e6).round() / 1e6
}
