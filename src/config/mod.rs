//! TOML to a [`Grid`] and settings; all errors at once, each with file, line and key.

use std::collections::BTreeMap;

use chrono_tz::Tz;

use crate::grid::Grid;

/// Everything a configuration file says.
#[derive(Debug, Clone, PartialEq)]
pub struct Config {
    /// The corridors.
    pub grid: Grid,
    /// Zone for display; records are always UTC.
    pub time_zone: Tz,
    /// Standard deviations of the measurements.
    pub measurement: MeasurementSettings,
    /// Inputs and how long a value lasts.
    pub feed: FeedSettings,
    /// Default channel name to the name it has in the feed.
    pub channel_names: BTreeMap<String, String>,
}

/// Measurement classes (`[measurement]`): common metering practice by default.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeasurementSettings {
    /// Standard deviation of a voltage, % of nominal (`kv_sigma_pct`).
    pub kv_sigma_pct: f64,
    /// Standard deviation of an angle, degrees (`angle_sigma_deg`).
    pub angle_sigma_deg: f64,
    /// Standard deviation of MW and Mvar, % of the circuit's thermal MVA or surge impedance loading (`power_sigma_pct`).
    pub power_sigma_pct: f64,
}

impl Default for MeasurementSettings {
    fn default() -> Self {
        Self { kv_sigma_pct: 0.15, angle_sigma_deg: 0.1, power_sigma_pct: 0.3 }
    }
}

/// Where frames come from (`[feed]`).
#[derive(Debug, Clone, PartialEq)]
pub struct FeedSettings {
    /// Inputs to open when the command line names none (`inputs`).
    pub inputs: Vec<String>,
    /// How long a value stands when no newer one comes, s (`max_age_s`).
    pub max_age_s: f64,
}

impl Default for FeedSettings {
    fn default() -> Self {
        Self { inputs: Vec::new(), max_age_s: 10.0 }
    }
}
