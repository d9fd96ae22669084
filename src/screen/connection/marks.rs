//! Keeps the marks of a recording in a small JSON file beside it.

use std::{
    fs::{self, File},
    io::{self, Read},
    path::{Path, PathBuf},
    sync::Arc,
};

use chrono::{DateTime, Datelike, Utc};
use serde::{Deserialize, Serialize};

use super::Recording;
use crate::whole_file;

/// Marks of a recording at most.
pub const MARKS_MAX: usize = 1000;
/// Characters of a note that are kept.
const NOTE_MAX: usize = 500;
/// No file with so many marks is larger.
const LARGEST_BYTES: u64 = 4 << 20;
const VERSION: u32 = 1;

/// A moment that somebody wants to find again. There is one at most at any time.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Mark {
    /// When, by the frames.
    pub time: DateTime<Utc>,
    /// The corridor it is about; `None`: all of them.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub corridor: Option<Arc<str>>,
    /// What there is to say; may be empty.
    #[serde(default)]
    pub note: String,
}

/// What can be done with marks.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum MarkWish {
    /// Sets one, in the place of any at the same time.
    Set(Mark),
    /// Takes the one at this time away.
    Remove(DateTime<Utc>),
}

/// The marks, and how they are kept.
#[derive(Debug, Clone, Default)]
pub struct MarkReport {
    /// In order of time.
    pub marks: Arc<Vec<Mark>>,
    /// Where they are kept, in words.
    pub place: Arc<str>,
    /// Why they are not kept there, or what else was not as it should be.
    pub trouble: Option<Arc<str>>,
    /// Wishes answered so far.
    pub answered: u64,
}

/// Keeps the marks of one recording.
#[derive(Debug)]
pub struct MarkBook {
    path: Option<PathBuf>,
    /// What is in memory is in the file, too.
    written: bool,
    report: MarkReport,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct MarkFile {
    version: u32,
    marks: Vec<Mark>,
}

/// Why a file of marks is not taken up.
enum Unreadable {
    /// It is not what it should be: it can be set aside.
    Damaged(String),
    /// Nobody knows what it is: it must be left alone.
    Closed(io::Error),
}

impl MarkBook {
    /// Takes up the marks beside a recording.
    pub fn beside(recording: &Recording) -> Self {
        match recording {
            Recording::Files(paths) => Self::open(paths.first().map(|path| beside(path))),
            Recording::Within { .. } => Self::open(None),
        }
    }

    fn open(path: Option<PathBuf>) -> Self {
        let place = path
            .as_ref()
            .map_or("in memory only: this recording is no file".into(), |path| format!("in {}", path.display()));
        let mut book =
            Self { path, written: true, report: MarkReport { place: place.into(), ..MarkReport::default() } };
        book.read();
        book
    }

    /// What a screen shows of it.
    pub fn report(&self) -> &MarkReport {
        &self.report
    }

    /// Does what is wished for, and writes it down at once.
    pub fn obey(&mut self, wish: MarkWish) {
        self.report.answered += 1;
        self.report.trouble = None;
        // Somebody else may have put marks there meanwhile.
        if self.written {
            self.read();
        }
        let marks = Arc::make_mut(&mut self.report.marks);
        let time = match &wish {
            MarkWish::Set(mark) => mark.time,
            MarkWish::Remove(time) => *time,
        };
        let place = marks.binary_search_by_key(&time, |mark| mark.time);
        match (wish, place) {
            (MarkWish::Set(mark), Ok(place)) => marks[place] = mark,
            (MarkWish::Set(_), Err(_)) if marks.len() >= MARKS_MAX => {
                self.report.trouble = Some(format!("not set: there are {MARKS_MAX} marks, no more are kept").into());
                return;
            }
            (MarkWish::Set(mark), Err(place)) => marks.insert(place, mark),
            (MarkWish::Remove(_), Ok(place)) => drop(marks.remove(place)),
            (MarkWish::Remove(_), Err(_)) => {}
        }
        self.write();
    }

    fn read(&mut self) {
        let Some(path) = &self.path else { return };
        match read(path) {
            Ok(marks) => self.report.marks = Arc::new(marks),
            Err(Unreadable::Damaged(what)) => match set_aside(path) {
                Ok(aside) => {
                    let said = format!("{} was damaged ({what}) and is now {}", path.display(), aside.display());
                    self.report.trouble = Some(said.into());
                }
                Err(error) => self.leave(&format!("is damaged ({what}) and cannot be set aside: {error}")),
            },
            Err(Unreadable::Closed(error)) => self.leave(&format!("cannot be read: {error}")),
        }
    }

    /// A file that might be worth something must not be written over.
    fn leave(&mut self, why: &str) {
        if let Some(path) = self.path.take() {
            let name = path.display();
            self.report.trouble = Some(format!("marks are kept in memory only, {name} {why}").into());
            self.report.place = format!("in memory only: {name} {why}").into();
        }
    }

    fn write(&mut self) {
        let Some(path) = &self.path else { return };
        let written = write(path, &self.report.marks);
        self.written = written.is_ok();
        if let Err(error) = written {
            let said = format!("kept in memory only, {} cannot be written: {error}", path.display());
            self.report.trouble = Some(said.into());
        }
    }
}

/// Where the marks of a recorded file are: `day.marks.json` for `day.jsonl.zst`.
fn beside(recorded: &Path) -> PathBuf {
    let name = recorded.file_name().map_or(String::new(), |name| name.to_string_lossy().into_owned());
    let bare = [".gz", ".zst"].iter().find_map(|packed| name.strip_suffix(packed)).unwrap_or(&name);
    let bare = [".jsonl", ".csv"].iter().find_map(|format| bare.strip_suffix(format)).unwrap_or(bare);
    recorded.with_file_name(format!("{bare}.marks.json"))
}

fn read(path: &Path) -> Result<Vec<Mark>, Unreadable> {
    match fs::metadata(path) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(Vec::new()),
        Err(error) => return Err(Unreadable::Closed(error)),
        Ok(metadata) if !metadata.is_file() => {
            return Err(Unreadable::Closed(io::Error::new(io::ErrorKind::InvalidInput, "it is not a regular file")));
        }
        Ok(_) => {}
    }
    let mut bytes = Vec::new();
    let file = File::open(path).map_err(Unreadable::Closed)?;
    file.take(LARGEST_BYTES + 1).read_to_end(&mut bytes).map_err(Unreadable::Closed)?;
    let file: MarkFile = serde_json::from_slice(&bytes).map_err(|error| Unreadable::Damaged(error.to_string()))?;
    let damaged = |what: String| Err(Unreadable::Damaged(what));
    if file.version != VERSION {
        return damaged(format!("version {} instead of {VERSION}", file.version));
    }
    if file.marks.len() > MARKS_MAX {
        return damaged(format!("{} marks, more than {MARKS_MAX}", file.marks.len()));
    }
    let mut marks = file.marks;
    // Years that a calendar can show in every time zone.
    if !marks.iter().all(|mark| (1..=9999).contains(&mark.time.year())) {
        return damaged("a time beyond any calendar".into());
    }
    for mark in &mut marks {
        if let Some((end, _)) = mark.note.char_indices().nth(NOTE_MAX) {
            mark.note.truncate(end);
        }
    }
    marks.sort_by_key(|mark| mark.time);
    marks.dedup_by_key(|mark| mark.time);
    Ok(marks)
}

/// Gives the file a name under which nothing else is lost.
fn set_aside(path: &Path) -> io::Result<PathBuf> {
    let named = |number: usize| {
        let mut name = path.as_os_str().to_owned();
        name.push(if number == 1 { ".old".into() } else { format!(".old{number}") });
        PathBuf::from(name)
    };
    let aside = (1..100).map(named).find(|aside| !aside.exists());
    let aside = aside.ok_or_else(|| io::Error::other("too many were set aside already"))?;
    fs::rename(path, &aside)?;
    Ok(aside)
}

/// Writes the file, whole or not at all.
fn write(path: &Path, marks: &[Mark]) -> io::Result<()> {
    whole_file::write(path, |file| {
        serde_json::to_writer_pretty(&mut *file, &MarkFile { version: VERSION, marks: marks.to_vec() })?;
        file.write_all(b"\n")
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample::time;

    fn mark(second: i64, note: &str) -> Mark {
        Mark { time: time(second), corridor: Some("Skarn-Velm".into()), note: note.into() }
    }

    fn book(folder: &tempfile::TempDir) -> (MarkBook, PathBuf) {
        let recorded = folder.path().join("day.jsonl.zst");
        (
            MarkBook::beside(&Recording::Files(vec![recorded, "/elsewhere/more.csv".into()])),
            folder.path().join("day.marks.json"),
        )
    }

    #[test]
    fn they_are_kept_beside_the_first_file() {
        for (recorded, expected) in [
            ("a/day.jsonl.zst", "a/day.marks.json"),
            ("day.csv.gz", "day.marks.json"),
            ("day.jsonl", "day.marks.json"),
            ("2031.03.14", "2031.03.14.marks.json"),
        ] {
            assert_eq!(beside(Path::new(recorded)), Path::new(expected));
        }
    }

    #[test]
    fn what_is_wished_for_is_in_the_file_at_once() {
        let folder = tempfile::tempdir().unwrap();
        let (mut book, path) = book(&folder);
        book.obey(MarkWish::Set(mark(60, "second")));
        book.obey(MarkWish::Set(mark(0, "first, “quoted” \u{1b}[2J")));
        book.obey(MarkWish::Set(mark(60, "mended")));
        book.obey(MarkWish::Set(mark(90, "")));
        book.obey(MarkWish::Remove(time(90)));
        assert_eq!(book.report().trouble, None);
        let kept = read(&path).ok().unwrap();
        assert_eq!(kept, [mark(0, "first, “quoted” \u{1b}[2J"), mark(60, "mended")]);
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 1, "nothing else is left there");
    }

    #[test]
    fn two_screens_on_one_recording_keep_each_others_marks() {
        let folder = tempfile::tempdir().unwrap();
        let ((mut one, path), (mut other, _)) = (book(&folder), book(&folder));
        one.obey(MarkWish::Set(mark(0, "one")));
        other.obey(MarkWish::Set(mark(60, "other")));
        one.obey(MarkWish::Remove(time(30)));
        assert_eq!(read(&path).ok().unwrap(), [mark(0, "one"), mark(60, "other")]);
        assert_eq!(*one.report().marks, [mark(0, "one"), mark(60, "other")]);
    }

    #[test]
    fn a_damaged_file_is_set_aside_and_nothing_set_aside_is_lost() {
        let folder = tempfile::tempdir().unwrap();
        let far = r#"{"version":1,"marks":[{"time":"+262000-01-01T00:00:00Z"}]}"#;
        let many = format!(
            r#"{{"version":1,"marks":[{}]}}"#,
            vec![r#"{"time":"2031-03-14T05:00:00Z","note":"x"}"#; MARKS_MAX + 1].join(",")
        );
        for (number, damage) in
            ["", "{", "[]", r#"{"version":2,"marks":[]}"#, r#"{"version":1,"marks":[{"time":"noon"}]}"#, far, &many]
                .into_iter()
                .enumerate()
        {
            let path = folder.path().join("day.marks.json");
            fs::write(&path, damage).unwrap();
            let (mut book, _) = book(&folder);
            let said = book.report().trouble.clone().unwrap();
            assert!(said.contains("was damaged") && said.contains(".old"), "{said}");
            let aside = if number == 0 { ".old".into() } else { format!(".old{}", number + 1) };
            assert_eq!(fs::read_to_string(folder.path().join(format!("day.marks.json{aside}"))).unwrap(), damage);
            book.obey(MarkWish::Set(mark(0, "new")));
            assert_eq!(book.report().trouble, None);
        }
    }

    #[test]
    fn where_nothing_can_be_written_marks_live_in_memory_and_it_is_said() {
        let folder = tempfile::tempdir().unwrap();
        // A folder that is not there refuses everybody, root too.
        let gone = folder.path().join("gone/day.jsonl");
        let mut book = MarkBook::beside(&Recording::Files(vec![gone]));
        for second in [0, 60] {
            book.obey(MarkWish::Set(mark(second, "kept")));
            assert!(book.report().trouble.as_ref().unwrap().contains("kept in memory only"));
        }
        assert_eq!(book.report().marks.len(), 2);
        fs::create_dir(folder.path().join("gone")).unwrap();
        book.obey(MarkWish::Remove(time(0)));
        assert_eq!(book.report().trouble, None);
        assert_eq!(read(&folder.path().join("gone/day.marks.json")).ok().unwrap(), [mark(60, "kept")]);
    }

    #[test]
    fn what_is_no_file_is_left_alone() {
        let folder = tempfile::tempdir().unwrap();
        fs::create_dir(folder.path().join("day.marks.json")).unwrap();
        let (mut book, path) = book(&folder);
        book.obey(MarkWish::Set(mark(0, "kept")));
        assert!(book.report().place.contains("not a regular file"), "{:?}", book.report());
        assert!(path.is_dir() && book.report().marks.len() == 1);
        let mut demo = MarkBook::beside(&Recording::Within { name: "the demo day", bytes: b"" });
        demo.obey(MarkWish::Set(mark(0, "kept")));
        assert!(demo.report().place.contains("in memory only") && demo.report().marks.len() == 1);
    }

    #[test]
    fn there_are_only_so_many() {
        let mut book = MarkBook::open(None);
        for second in 0..i64::try_from(MARKS_MAX).unwrap() + 5 {
            book.obey(MarkWish::Set(mark(second, "")));
        }
        assert_eq!(book.report().marks.len(), MARKS_MAX);
        assert!(book.report().trouble.as_ref().unwrap().contains("not set"));
    }
}
