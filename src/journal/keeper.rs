use std::{
    collections::VecDeque,
    path::{Path, PathBuf},
    time::{Duration, Instant},
};

use chrono::{TimeDelta, Utc};
use rusqlite::Connection;

use super::{Entry, JournalError, database, reading};
use crate::alarm::Restored;

/// Entries held while they cannot be written; beyond it the oldest are lost, and counted.
pub const LONGEST_BACKLOG: usize = 20_000;
/// Time between two attempts while writing fails.
const PAUSE: Duration = Duration::from_secs(1);
/// Time between two looks for entries that are too old.
const PRUNING: Duration = Duration::from_secs(3600);

/// The journal as the program that watches keeps it. A disk that fails never stops it: see [`Status`].
#[derive(Debug)]
pub struct Journal {
    path: PathBuf,
    keep: TimeDelta,
    database: Option<Connection>,
    /// What is still to be written, in order.
    backlog: VecDeque<Entry>,
    status: Status,
    last_attempt: Option<Instant>,
    last_pruning: Option<Instant>,
}

/// How the journal is doing.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Status {
    /// Why it cannot be written at present.
    pub trouble: Option<String>,
    /// Entries that wait for it.
    pub waiting: usize,
    /// Entries that were too many to wait, since the trouble began.
    pub lost: u64,
}

impl Status {
    /// Whether everything handed over is durable.
    pub fn is_durable(&self) -> bool {
        self.waiting == 0 && self.lost == 0
    }
}

impl Journal {
    /// Opens the journal, and begins one where there is none. A file that is no journal is an error; where none can be
    /// written now, it is tried again with every entry.
    pub fn open(path: &Path, keep: TimeDelta) -> Result<Self, JournalError> {
        let mut journal = Self {
            path: path.to_owned(),
            keep,
            database: None,
            backlog: VecDeque::new(),
            status: Status::default(),
            last_attempt: None,
            last_pruning: None,
        };
        match database::open(path) {
            Ok(database) => journal.database = Some(database),
            Err(error @ JournalError::Database { .. }) => journal.status.trouble = Some(error.to_string()),
            Err(error) => return Err(error),
        }
        journal.prune();
        Ok(journal)
    }

    /// How the alarms stood when the last entry was written; empty where the journal cannot be read.
    pub fn standing(&self) -> Result<Vec<Restored>, JournalError> {
        let failed = |error| JournalError::Database { path: self.path.clone(), error };
        match &self.database {
            Some(database) => reading::standing(database).map_err(failed),
            // On a disk that is read-only the past can still be told.
            None => reading::ReadOnly::open(&self.path).and_then(|journal| journal.standing()).or(Ok(Vec::new())),
        }
    }

    /// Writes entries, together or not at all. When this returns with [`Status::is_durable`], they are safe.
    pub fn write(&mut self, entries: impl IntoIterator<Item = Entry>) -> &Status {
        for entry in entries {
            if self.backlog.len() == LONGEST_BACKLOG {
                self.backlog.pop_front();
                self.status.lost += 1;
            }
            self.backlog.push_back(entry);
        }
        let must_pause = self.status.trouble.is_some() && self.last_attempt.is_some_and(|last| last.elapsed() < PAUSE);
        if must_pause {
            self.status.waiting = self.backlog.len();
            return &self.status;
        }
        self.flush()
    }

    /// Tries to write what waits, now.
    pub fn flush(&mut self) -> &Status {
        if !self.backlog.is_empty() || self.status.trouble.is_some() {
            self.last_attempt = Some(Instant::now());
            match self.attempt() {
                Ok(()) => {
                    self.backlog.clear();
                    self.status = Status::default();
                }
                Err(error) => {
                    // Opened while the file could not be written, it would stay so.
                    self.database = None;
                    self.status.trouble = Some(error.to_string());
                }
            }
        }
        self.status.waiting = self.backlog.len();
        if self.last_pruning.is_none_or(|last| last.elapsed() >= PRUNING) {
            self.prune();
        }
        &self.status
    }

    /// How it is doing.
    pub fn status(&self) -> &Status {
        &self.status
    }

    fn attempt(&mut self) -> Result<(), JournalError> {
        let database = match &mut self.database {
            Some(database) => database,
            none => none.insert(database::open(&self.path)?),
        };
        let written = Utc::now();
        let lost = (self.status.lost > 0).then(|| {
            let time = self.backlog.front().map_or(written, |entry| entry.time);
            Entry::lost(time, self.status.lost)
        });
        let mut write = || {
            let transaction = database.transaction()?;
            for entry in lost.iter().chain(&self.backlog) {
                database::insert(&transaction, entry, written)?;
            }
            transaction.commit()
        };
        write().map_err(|error| JournalError::Database { path: self.path.clone(), error })
    }

    /// Deletes what is too old; what fails here is tried again later.
    fn prune(&mut self) {
        if let (Some(database), Some(before)) = (&self.database, Utc::now().checked_sub_signed(self.keep)) {
            self.last_pruning = Some(Instant::now());
            while database::prune(database, before).unwrap_or(false) {}
        }
    }
}
