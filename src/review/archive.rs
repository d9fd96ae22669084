//! Recorded files, in whatever order they are given, as stretches that can be reviewed apart from one another.

use std::{
    collections::{BTreeSet, HashSet},
    fs::{self, File, Metadata},
    io::{self, Read},
    path::{Path, PathBuf},
    sync::Arc,
    time::UNIX_EPOCH,
};

use chrono::{DateTime, NaiveDate, SecondsFormat, Utc};
use rayon::prelude::*;
use serde::{Deserialize, Serialize};
use thiserror::Error;

use super::FileNote;
use crate::feed::{Channels, Format, InputStatus, Monitor, Reader, Recorded};

/// Follows the reading of a file.
pub type Follow = dyn Fn(Deferred) -> Box<dyn Read + Send> + Sync;

/// A file that cannot be reviewed.
#[derive(Debug, Error)]
#[error("cannot open {}: {source}{}", path.display(), advice(source))]
pub struct ArchiveError {
    path: PathBuf,
    source: io::Error,
}

fn advice(error: &io::Error) -> &'static str {
    if error.kind() == io::ErrorKind::IsADirectory { "; name the files in it" } else { "" }
}

/// A recorded file.
#[derive(Debug, Clone)]
pub struct Archive {
    source: Source,
    /// What tells it from others, and from what it was before it changed.
    pub key: ArchiveKey,
    /// Time of the first and the last frame, once they are known.
    span: Option<(DateTime<Utc>, DateTime<Utc>)>,
}

/// Where its bytes are.
#[derive(Debug, Clone)]
enum Source {
    File(PathBuf),
    /// JSON Lines within the program.
    Within(&'static [u8]),
}

/// What tells a file from others.
#[derive(Debug, Clone, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub struct ArchiveKey {
    /// Its name, without the folder.
    pub name: String,
    /// Its size, bytes.
    pub bytes: u64,
    /// When it was written last, ns since 1970.
    pub modified_ns: u64,
}

/// Files that share UTC days with one another, and none with others; the first has those without a frame besides.
#[derive(Debug, Clone)]
pub struct Stretch {
    /// In the order of their first frames.
    pub archives: Vec<Archive>,
    /// The first and the last day, where they are known.
    pub days: Option<(NaiveDate, NaiveDate)>,
    /// What there is to say of the files.
    pub findings: Vec<String>,
}

impl Archive {
    fn new(path: &Path) -> Result<Self, ArchiveError> {
        let failed = |source| ArchiveError { path: path.to_owned(), source };
        let metadata = fs::metadata(path).map_err(failed)?;
        if metadata.is_dir() {
            return Err(failed(io::ErrorKind::IsADirectory.into()));
        }
        // Whether it can be read is known before anything is begun.
        File::open(path).map_err(failed)?;
        Ok(Self { source: Source::File(path.to_owned()), key: ArchiveKey::new(path, &metadata), span: None })
    }

    /// As it was given.
    pub fn name(&self) -> String {
        match &self.source {
            Source::File(path) => path.display().to_string(),
            Source::Within(_) => self.key.name.clone(),
        }
    }

    fn reader(&self, channels: &Arc<Channels>, follow: &Follow) -> Reader {
        match &self.source {
            Source::File(path) => {
                let bytes = follow(Deferred { path: path.clone(), file: None });
                Reader::new(&self.name(), bytes, Format::of(path), channels)
            }
            Source::Within(bytes) => Reader::new(&self.name(), *bytes, Format::JsonLines, channels),
        }
    }

    /// Reads through it for its first and last time.
    fn measured(mut self, follow: &Follow) -> Self {
        let none = Arc::new(Channels::none());
        let frames = Recorded::new(vec![self.reader(&none, follow)], &none);
        for frame in frames {
            self.span = Some((self.span.map_or(frame.time, |(first, _)| first), frame.time));
        }
        self
    }
}

impl ArchiveKey {
    fn new(path: &Path, metadata: &Metadata) -> Self {
        let modified = metadata.modified().ok().and_then(|time| time.duration_since(UNIX_EPOCH).ok());
        Self {
            name: path.file_name().unwrap_or(path.as_os_str()).to_string_lossy().into_owned(),
            bytes: metadata.len(),
            modified_ns: modified.and_then(|modified| u64::try_from(modified.as_nanos()).ok()).unwrap_or(0),
        }
    }
}

impl Stretch {
    /// Sorts files into stretches, in the order of time; for that, several are read through first. `expect` is told how much that is.
    pub fn all(paths: &[PathBuf], follow: &Follow, expect: impl FnOnce(u64)) -> Result<Vec<Self>, ArchiveError> {
        let mut known = HashSet::new();
        let mut twice = BTreeSet::new();
        let mut archives = Vec::new();
        for path in paths {
            let archive = Archive::new(path)?;
            if known.insert(fs::canonicalize(path).unwrap_or_else(|_| path.clone())) {
                archives.push(archive);
            } else {
                twice.insert(format!("{}: given twice, read once", path.display()));
            }
        }
        if archives.len() > 1 {
            expect(archives.iter().map(|archive| archive.key.bytes).sum());
            archives = archives.into_par_iter().map(|archive| archive.measured(follow)).collect();
        }
        archives.sort_by_key(|archive| archive.span);
        let mut stretches: Vec<Self> = Vec::new();
        let (frameless, archives): (Vec<_>, Vec<_>) = archives.into_iter().partition(|archive| archive.span.is_none());
        for archive in archives {
            match stretches.last_mut() {
                Some(stretch) if stretch.shares_a_day_with(&archive) => stretch.add(archive),
                _ => stretches.push(Self::of(archive)),
            }
        }
        // What there is to say of files without a frame, or of one that was not read through, is said with the first.
        match stretches.first_mut() {
            Some(first) => first.archives.extend(frameless),
            None => stretches.extend(frameless.into_iter().map(Self::of)),
        }
        if let Some(first) = stretches.first_mut() {
            first.findings.extend(twice);
        }
        Ok(stretches)
    }

    /// What is within the program.
    pub fn within(name: &str, bytes: &'static [u8]) -> Self {
        let key = ArchiveKey { name: name.into(), bytes: bytes.len() as u64, modified_ns: 0 };
        Self::of(Archive { source: Source::Within(bytes), key, span: None })
    }

    fn of(archive: Archive) -> Self {
        let days = archive.span.map(|(first, last)| (first.date_naive(), last.date_naive()));
        Self { archives: vec![archive], days, findings: Vec::new() }
    }

    fn shares_a_day_with(&self, archive: &Archive) -> bool {
        self.days.zip(archive.span).is_some_and(|((_, last), (first, _))| first.date_naive() <= last)
    }

    fn add(&mut self, archive: Archive) {
        let Some((first, last)) = archive.span else { return };
        let stamp = |time: DateTime<Utc>| time.to_rfc3339_opts(SecondsFormat::AutoSi, true);
        for other in &self.archives {
            if let Some((_, end)) = other.span.filter(|(_, end)| *end >= first) {
                let (other, until) = (other.name(), stamp(end.min(last)));
                let what = "frames of the same time are joined, and of two values the better or else the first stands";
                self.findings.push(format!(
                    "{} overlaps with {other} from {} to {until}: {what}",
                    archive.name(),
                    stamp(first)
                ));
            }
        }
        self.days = self.days.map(|(begin, end)| (begin, end.max(last.date_naive())));
        self.archives.push(archive);
    }

    /// What tells its files from others.
    pub fn keys(&self) -> Vec<ArchiveKey> {
        self.archives.iter().map(|archive| archive.key.clone()).collect()
    }

    /// Size of its files.
    pub fn bytes(&self) -> u64 {
        self.archives.iter().map(|archive| archive.key.bytes).sum()
    }

    /// The files that a day was read from. What of a file could not be used is said on its last day.
    pub(super) fn notes(&self, date: NaiveDate, is_last: bool, monitor: &Monitor) -> Vec<FileNote> {
        let inputs = self.archives.iter().zip(monitor.inputs());
        let on_this_day = inputs.filter(|(archive, _)| {
            archive.span.is_none_or(|(first, last)| (first.date_naive()..=last.date_naive()).contains(&date))
        });
        let note = |(archive, input): (&Archive, InputStatus)| {
            let ends = archive.span.map_or(is_last, |(_, last)| last.date_naive() == date);
            let mut findings = if ends { input.tally.findings() } else { Vec::new() };
            if ends && input.tally.frames == 0 {
                findings.insert(0, "not a single frame in it".into());
            }
            FileNote { name: archive.name(), findings }
        };
        on_this_day.map(note).collect()
    }

    /// The frames of all its files in one order of time, each file opened when its time comes.
    pub fn open(&self, channels: &Arc<Channels>, follow: &Follow) -> Recorded {
        let from = |archive: &Archive| archive.span.map_or(DateTime::<Utc>::MIN_UTC, |(first, _)| first);
        let readers = self.archives.iter().map(|archive| (from(archive), archive.reader(channels, follow)));
        Recorded::in_turn(readers.collect(), channels)
    }
}

/// A file that is opened when it is read for the first time: hundreds of them cost nothing.
#[derive(Debug)]
pub struct Deferred {
    path: PathBuf,
    file: Option<File>,
}

impl Read for Deferred {
    fn read(&mut self, bytes: &mut [u8]) -> io::Result<usize> {
        let file = match &mut self.file {
            Some(file) => file,
            none => none.insert(File::open(&self.path)?),
        };
        file.read(bytes)
    }
}

/// Files that did not bring a frame, and why.
pub(super) fn barren(monitor: &Monitor) -> Vec<FileNote> {
    let note = |input: InputStatus| FileNote { name: input.name.to_string(), findings: input.tally.findings() };
    monitor.inputs().into_iter().map(note).collect()
}
