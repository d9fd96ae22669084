//! Days that were reviewed, in files of their own: to go on later, or to put together what several machines did.

use std::{
    ffi::OsStr,
    fs::{self, File},
    io::{self, Write},
    path::{Path, PathBuf},
    sync::Arc,
};

use chrono::NaiveDate;
use serde::{Deserialize, Serialize};
use serde_json::value::RawValue;
use thiserror::Error;

use super::{ArchiveKey, Day, Reviewed};
use crate::whole_file;

const VERSION: u32 = 1;
const ENDING: &str = ".review.json.zst";
/// No day is larger, unpacked.
const LARGEST_BYTES: u64 = 1 << 30;

/// A reviewed day with what it was made by.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Part {
    version: u32,
    /// How it was reviewed.
    pub terms: Terms,
    /// The files it was read from.
    pub archives: Vec<ArchiveKey>,
    /// The day.
    pub day: Day,
    end: Option<Box<RawValue>>,
}

/// How a day was reviewed: only days under the same terms go together.
#[derive(Debug, Clone, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Terms {
    /// Version of the program.
    pub program: String,
    /// The configuration's text.
    pub configuration: Arc<str>,
    /// The changes that were asked for, as they were given.
    pub changes: Vec<String>,
    /// Whether sources are learned; `None`: as the configuration says.
    pub learning: Option<bool>,
    /// Whether days without a recorded start began with what the day before them ended with.
    pub carried: bool,
}

/// A part that cannot be used.
#[derive(Debug, Error)]
pub enum PartError {
    /// It cannot be read or written.
    #[error("{}: {source}; check that the folder exists and is writable", path.display())]
    File {
        /// Which file.
        path: PathBuf,
        /// Why.
        source: io::Error,
    },
    /// It is no part.
    #[error("{}: not a reviewed day ({what}); review that day again", path.display())]
    Damaged {
        /// Which file.
        path: PathBuf,
        /// What is wrong.
        what: String,
    },
    /// There is nothing.
    #[error("{}: no reviewed day in there (files ending in {ENDING})", path.display())]
    Empty {
        /// Which folder.
        path: PathBuf,
    },
    /// Parts do not go together.
    #[error("{} and {} were reviewed with another {what}; review them the same way", one.display(), other.display())]
    Terms {
        /// One file.
        one: PathBuf,
        /// The other.
        other: PathBuf,
        /// What differs.
        what: &'static str,
    },
    /// A day is there twice, and not the same.
    #[error("{date} is in {} and in {}, reviewed from different files; review that day in one run", one.display(), other.display())]
    Twice {
        /// Which day.
        date: NaiveDate,
        /// One file.
        one: PathBuf,
        /// The other.
        other: PathBuf,
    },
}

impl Part {
    /// A day as it was reviewed.
    pub fn new(terms: Terms, archives: Vec<ArchiveKey>, Reviewed { day, end }: Reviewed) -> Self {
        Self { version: VERSION, terms, archives, day, end }
    }

    /// The day alone.
    pub fn reviewed(self) -> Reviewed {
        Reviewed { day: self.day, end: self.end }
    }

    /// Where the part of a day is kept.
    pub fn path(folder: &Path, date: NaiveDate) -> PathBuf {
        folder.join(format!("{date}{ENDING}"))
    }

    /// Reads a part.
    pub fn load(path: &Path) -> Result<Self, PartError> {
        let failed = |source| PartError::File { path: path.to_owned(), source };
        let damaged = |what: String| PartError::Damaged { path: path.to_owned(), what };
        let file = File::open(path).map_err(failed)?;
        let unpacked = zstd::Decoder::new(file).map_err(failed)?;
        let text =
            io::read_to_string(io::Read::take(unpacked, LARGEST_BYTES)).map_err(|error| damaged(error.to_string()))?;
        let part: Self = serde_json::from_str(&text).map_err(|error| damaged(error.to_string()))?;
        if part.version == VERSION { Ok(part) } else { Err(damaged(format!("version {}", part.version))) }
    }

    /// Writes it into a folder, whole or not at all.
    pub fn save(&self, folder: &Path) -> Result<(), PartError> {
        let path = Self::path(folder, self.day.date);
        let write = |file: &mut dyn Write| {
            let mut packed = zstd::Encoder::new(file, 0)?;
            serde_json::to_writer(&mut packed, self)?;
            packed.finish().map(drop)
        };
        whole_file::write(&path, write).map_err(|source| PartError::File { path: path.clone(), source })
    }

    /// The parts named: files, and all in folders.
    pub fn find(paths: &[PathBuf]) -> Result<Vec<PathBuf>, PartError> {
        let mut found = Vec::new();
        for path in paths {
            let failed = |source| PartError::File { path: path.clone(), source };
            if !fs::metadata(path).map_err(failed)?.is_dir() {
                found.push(path.clone());
                continue;
            }
            let before = found.len();
            for entry in fs::read_dir(path).map_err(failed)? {
                let file = entry.map_err(failed)?.path();
                if file.file_name().map(OsStr::to_string_lossy).is_some_and(|name| name.ends_with(ENDING)) {
                    found.push(file);
                }
            }
            if found.len() == before {
                return Err(PartError::Empty { path: path.clone() });
            }
        }
        Ok(found)
    }
}

impl Terms {
    /// What differs between the two, if anything does.
    pub fn difference(&self, other: &Self) -> Option<&'static str> {
        let compared = [
            (self.program == other.program, "version of the program"),
            (self.configuration == other.configuration, "configuration"),
            (self.changes == other.changes, "--with or --without"),
            (self.learning == other.learning, "--sources"),
            (self.carried == other.carried, "--carry"),
        ];
        compared.into_iter().find(|(same, _)| !same).map(|(_, what)| what)
    }
}
