//! Keeps what was learned over a restart: one small JSON file for all corridors.

use std::{
    collections::BTreeMap,
    fs::File,
    io::{self, Read},
    path::{Path, PathBuf},
};

use chrono::{DateTime, Datelike, Utc};
use serde::{Deserialize, Serialize};
use thiserror::Error;

use super::Step;
use crate::whole_file;

/// No state file of sane size is larger.
const LARGEST_BYTES: u64 = 64 << 20;
const VERSION: u32 = 1;

/// What was learned of one corridor.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Memory {
    /// Configured means and variances, which it must still fit: R and X `from`, R and X `to`.
    pub(super) configured: [[f64; 2]; 4],
    pub(super) mean: [f64; 4],
    pub(super) covariance: [[f64; 4]; 4],
    pub(super) steps: [u64; 2],
    pub(super) both: f64,
    pub(super) time: DateTime<Utc>,
    pub(super) recent: Vec<Step>,
}

/// Why what was learned is not taken up again.
#[derive(Debug, Error)]
pub enum StoreError {
    /// The file cannot be read or written.
    #[error("{}: {source}; check that the directory exists and is writable", path.display())]
    File {
        /// Which file.
        path: PathBuf,
        /// Why.
        source: io::Error,
    },
    /// The file is damaged.
    #[error("{}: not a state file ({what}); it is ignored, and learning starts again", path.display())]
    Damaged {
        /// Which file.
        path: PathBuf,
        /// What is wrong.
        what: String,
    },
    /// What was learned belongs to another configuration.
    #[error("learned with other configured sources; learning starts again from the configuration")]
    OtherSources,
    /// The numbers make no sense.
    #[error("impossible impedances or spreads; learning starts again from the configuration")]
    Impossible,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct StateFile {
    version: u32,
    corridors: BTreeMap<String, Memory>,
}

/// Reads what was learned, by corridor; nothing where there is no file yet.
pub fn load(path: &Path) -> Result<BTreeMap<String, Memory>, StoreError> {
    let file = match File::open(path) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(BTreeMap::new()),
        opened => opened.map_err(|source| StoreError::File { path: path.to_owned(), source })?,
    };
    if !file.metadata().is_ok_and(|metadata| metadata.is_file()) {
        let source = io::Error::new(io::ErrorKind::InvalidInput, "not a regular file");
        return Err(StoreError::File { path: path.to_owned(), source });
    }
    let mut bytes = Vec::new();
    file.take(LARGEST_BYTES)
        .read_to_end(&mut bytes)
        .map_err(|source| StoreError::File { path: path.to_owned(), source })?;
    let damaged = |what: String| StoreError::Damaged { path: path.to_owned(), what };
    let state: StateFile = serde_json::from_slice(&bytes).map_err(|error| damaged(error.to_string()))?;
    if state.version != VERSION {
        return Err(damaged(format!("version {} instead of {VERSION}", state.version)));
    }
    // Years that a calendar can show in every time zone.
    let sane = |time: DateTime<Utc>| (1..=9999).contains(&time.year());
    let times = |memory: &Memory| memory.recent.iter().map(|step| step.time).chain([memory.time]).all(sane);
    if !state.corridors.values().all(times) {
        return Err(damaged("a time beyond any calendar".into()));
    }
    Ok(state.corridors)
}

/// Writes what was learned, whole or not at all.
pub fn save(path: &Path, corridors: BTreeMap<String, Memory>) -> Result<(), StoreError> {
    let state = StateFile { version: VERSION, corridors };
    whole_file::write(path, |file| Ok(serde_json::to_writer(file, &state)?))
        .map_err(|source| StoreError::File { path: path.to_owned(), source })
}
