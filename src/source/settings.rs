use serde::{Deserialize, Serialize};

/// How steps are found and how fast what was learned ages (`[learning]`).
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Settings {
    /// Whether to learn at all.
    pub enabled: bool,
    /// Length of the means before and after a step, s.
    pub window_s: f64,
    /// Time between these means, s: long enough for swings and for the skew between channels.
    pub gap_s: f64,
    /// A step is this many times its background.
    pub step_threshold: f64,
    /// How far back the background reaches, s.
    pub background_s: f64,
    /// How fast the spread of a reactance grows without steps, ohm per square root of a day.
    pub aging_ohm_per_sqrt_day: f64,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            enabled: true,
            window_s: 10.0,
            gap_s: 6.0,
            step_threshold: 5.0,
            background_s: 1800.0,
            aging_ohm_per_sqrt_day: 1.0,
        }
    }
}
