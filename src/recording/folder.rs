use std::{
    fs::{self, File, OpenOptions},
    io::{self, Read, Write},
    path::{Path, PathBuf},
    process,
};

use chrono::NaiveDate;
use rustix::fs::{FlockOperation, flock};
use thiserror::Error;

use crate::config::{RecordingSettings, wording::printable};

const ENDING: &str = ".jsonl.zst";
const LOCK: &str = "recording.lock";
const GB: f64 = 1e9;

/// Why nothing can be recorded in a folder.
#[derive(Debug, Error)]
pub enum RecordError {
    /// The folder cannot be made or written to.
    #[error("cannot record in {}: {error}; name a folder that can be written to", folder.display())]
    Folder {
        /// Which.
        folder: PathBuf,
        /// What the system says.
        error: io::Error,
    },
    /// Somebody else records there.
    #[error("cannot record in {}: {by} already does; name another folder", folder.display())]
    Taken {
        /// Which.
        folder: PathBuf,
        /// Who.
        by: String,
    },
}

/// A folder of recorded days that nobody else writes to.
#[derive(Debug)]
pub(super) struct Folder {
    path: PathBuf,
    /// Holds the lock; the system lets it go with the program, however that ends.
    _lock: File,
}

impl Folder {
    /// Makes it where it is not there, and takes it.
    pub fn take(path: &Path) -> Result<Self, RecordError> {
        let failed = |error| RecordError::Folder { folder: path.to_owned(), error };
        fs::create_dir_all(path).map_err(failed)?;
        let mut options = OpenOptions::new();
        let options = options.read(true).write(true).create(true).truncate(false);
        let mut lock = options.open(path.join(LOCK)).map_err(failed)?;
        match flock(&lock, FlockOperation::NonBlockingLockExclusive) {
            Ok(()) => {}
            Err(rustix::io::Errno::WOULDBLOCK) => {
                let mut by = String::new();
                let _unknown = lock.take(200).read_to_string(&mut by);
                let by = match printable(by.trim()) {
                    by if by.is_empty() => "another program".into(),
                    by => by,
                };
                return Err(RecordError::Taken { folder: path.to_owned(), by });
            }
            Err(error) => return Err(failed(error.into())),
        }
        lock.set_len(0).and_then(|()| writeln!(lock, "process {}", process::id())).map_err(failed)?;
        Ok(Self { path: path.to_owned(), _lock: lock })
    }

    /// The file of a day.
    pub fn file(&self, day: NaiveDate) -> PathBuf {
        self.path.join(format!("{}{ENDING}", day.format("%Y-%m-%d")))
    }

    /// Deletes the oldest days beyond the limits, but never `today`, and nothing that is not named like a day; what was
    /// deleted. One that cannot be deleted is tried again the next time.
    pub fn prune(&self, today: NaiveDate, settings: &RecordingSettings) -> Vec<NaiveDate> {
        let Ok(entries) = fs::read_dir(&self.path) else { return Vec::new() };
        let mut days: Vec<_> = entries
            .flatten()
            .filter_map(|entry| {
                let day = day_of(entry.file_name().to_str()?)?;
                let metadata = entry.metadata().ok().filter(fs::Metadata::is_file)?;
                Some((day, metadata.len()))
            })
            .collect();
        days.sort_unstable();
        let mut bytes: u64 = days.iter().map(|(_, bytes)| bytes).sum();
        let is_over = |day: NaiveDate, bytes: u64| {
            settings.keep_days.is_some_and(|keep| (today - day).num_days() as f64 >= keep)
                || settings.keep_gb.is_some_and(|keep| bytes as f64 > keep * GB)
        };
        let mut deleted = Vec::new();
        for (day, size) in days.into_iter().filter(|(day, _)| *day < today) {
            if is_over(day, bytes) && fs::remove_file(self.file(day)).is_ok() {
                bytes -= size;
                deleted.push(day);
            }
        }
        deleted
    }
}

/// The day that a file is of, if it is named exactly like one.
fn day_of(name: &str) -> Option<NaiveDate> {
    let day = NaiveDate::parse_from_str(name.strip_suffix(ENDING)?, "%Y-%m-%d").ok()?;
    (format!("{}{ENDING}", day.format("%Y-%m-%d")) == name).then_some(day)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn day(text: &str) -> NaiveDate {
        text.parse().unwrap()
    }

    fn settings(keep_days: Option<f64>, keep_gb: Option<f64>) -> RecordingSettings {
        RecordingSettings { keep_days, keep_gb, ..RecordingSettings::default() }
    }

    #[test]
    fn a_folder_is_taken_once() {
        let place = tempfile::tempdir().unwrap();
        let first = Folder::take(&place.path().join("deep/inside")).unwrap();
        let second = Folder::take(&first.path).unwrap_err();
        let RecordError::Taken { by, .. } = &second else { panic!("{second}") };
        assert_eq!(*by, format!("process {}", process::id()));
        let path = first.path.clone();
        drop(first);
        Folder::take(&path).unwrap();
        fs::write(place.path().join("file"), "").unwrap();
        let error = Folder::take(&place.path().join("file")).unwrap_err();
        assert!(matches!(error, RecordError::Folder { .. }), "{error}");
    }

    #[test]
    fn the_oldest_days_go_first_and_nothing_else_goes() {
        let place = tempfile::tempdir().unwrap();
        let folder = Folder::take(place.path()).unwrap();
        let strangers = [
            "2031-03-01.jsonl",
            "2031-3-1.jsonl.zst",
            "x2031-03-01.jsonl.zst",
            "2031-03-01.jsonl.zst.damaged-1",
            "notes",
        ];
        for name in strangers {
            fs::write(place.path().join(name), [0; 400]).unwrap();
        }
        fs::create_dir(place.path().join("2031-03-02.jsonl.zst")).unwrap();
        let days = [10, 11, 12, 13, 14, 15].map(|n| NaiveDate::from_ymd_opt(2031, 3, n).unwrap());
        for day in days {
            fs::write(folder.file(day), [0; 100]).unwrap();
        }
        let today = days[4];
        assert_eq!(folder.prune(today, &settings(None, None)), []);
        assert_eq!(folder.prune(today, &settings(Some(4.0), None)), [days[0]], "four days are kept, today included");
        assert_eq!(folder.prune(today, &settings(None, Some(350.0 / GB))), days[1..3]);
        assert_eq!(
            folder.prune(today, &settings(Some(1.0), Some(0.0))),
            [days[3]],
            "never today, nor what comes after"
        );
        assert_eq!(fs::read_dir(place.path()).unwrap().count(), strangers.len() + 4);
        assert_eq!(day_of("2031-03-14.jsonl.zst"), Some(day("2031-03-14")));
    }
}
