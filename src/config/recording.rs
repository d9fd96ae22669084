//! `[recording]`.

use std::path::PathBuf;

use super::{limits::Limits, section::Section};

/// Whether and how `watch` records frames (`[recording]`).
#[derive(Debug, Clone, PartialEq)]
pub struct RecordingSettings {
    /// The folder of recorded days, from the folder of the configuration (`folder`); `None`: not recorded.
    pub folder: Option<PathBuf>,
    /// Everything older is on the disk, s (`flush_s`).
    pub flush_s: f64,
    /// Days kept, today included; older ones are deleted (`keep_days`).
    pub keep_days: Option<f64>,
    /// Size kept, GB; the oldest days beyond it are deleted (`keep_gb`).
    pub keep_gb: Option<f64>,
}

impl Default for RecordingSettings {
    fn default() -> Self {
        Self { folder: None, flush_s: 2.0, keep_days: None, keep_gb: None }
    }
}

pub(super) fn read(mut section: Section<'_>) -> RecordingSettings {
    let default = RecordingSettings::default();
    RecordingSettings {
        folder: section.text("folder").filter(|name| !name.is_empty()).map(PathBuf::from),
        flush_s: section.number("flush_s", Limits::at_least(0.1).up_to(60.0)).unwrap_or(default.flush_s),
        keep_days: section.number("keep_days", Limits::at_least(1.0).up_to(36_500.0)),
        keep_gb: section.number("keep_gb", Limits::above(0.0).up_to(1e6)),
    }
}
