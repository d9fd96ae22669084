use std::path::PathBuf;

use thiserror::Error;

/// Why a journal cannot be opened or read.
#[derive(Debug, Error)]
pub enum JournalError {
    /// The file is something else.
    #[error("{}: is not a journal of this program; name another file under [journal]", .0.display())]
    NotAJournal(PathBuf),
    /// The file is of a later version.
    #[error("{}: was written by a later version of this program (schema {version}); use that one, or name another file under [journal]", path.display())]
    TooNew {
        /// The file.
        path: PathBuf,
        /// Its schema.
        version: i64,
    },
    /// There is none yet.
    #[error("{}: there is no journal yet; `tautline watch` begins one", .0.display())]
    NotThere(PathBuf),
    /// The database says no.
    #[error("{}: {error}", path.display())]
    Database {
        /// The file.
        path: PathBuf,
        /// What it says.
        error: rusqlite::Error,
    },
}
