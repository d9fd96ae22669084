//! `[journal]`.

use std::path::{Path, PathBuf};

use chrono::TimeDelta;

use super::{limits::Limits, section::Section};

/// Where the journal is kept and for how long (`[journal]`).
#[derive(Debug, Clone, PartialEq)]
pub struct JournalSettings {
    /// The database, from the folder of the configuration (`file`); `None`: beside the configuration, with its name.
    pub file: Option<PathBuf>,
    /// Entries that were written longer ago are deleted, days (`keep_days`).
    pub keep_days: f64,
}

impl Default for JournalSettings {
    fn default() -> Self {
        Self { file: None, keep_days: 400.0 }
    }
}

impl JournalSettings {
    /// How long entries are kept.
    pub fn keep(&self) -> TimeDelta {
        // Limited to a century.
        #[allow(clippy::cast_possible_truncation)]
        TimeDelta::seconds((86_400.0 * self.keep_days) as i64)
    }

    /// The database that belongs to a configuration file.
    pub fn path(&self, config: &Path) -> PathBuf {
        match &self.file {
            Some(file) => config.parent().unwrap_or(Path::new("")).join(file),
            None => config.with_extension("journal.db"),
        }
    }
}

pub(super) fn read(mut section: Section<'_>) -> JournalSettings {
    let default = JournalSettings::default();
    JournalSettings {
        file: section.text("file").map(PathBuf::from),
        keep_days: section.number("keep_days", Limits::at_least(1.0).up_to(36_500.0)).unwrap_or(default.keep_days),
    }
}
