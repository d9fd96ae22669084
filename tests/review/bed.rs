//! Recorded days of two made-up corridors, and short ways to review them.

use std::{
    fs,
    io::Write,
    num::NonZeroUsize,
    path::{Path, PathBuf},
};

use chrono::NaiveDate;
use tautline::{
    config::Config,
    desk::Alternative,
    drill::{Drill, Invention},
    feed::{Channels, FrameText},
    review::{Day, Review, Run, Stretch, Task},
};
use tempfile::TempDir;

/// A folder with a configuration and the frames that belong to it, as lines in order.
pub struct Bed {
    pub folder: TempDir,
    pub config: Config,
    configuration: String,
    pub lines: Vec<String>,
}

impl Bed {
    /// So many hours from midnight, a frame every ten seconds.
    pub fn new(hours: f64) -> Self {
        let invention =
            Invention { seed: 5, corridors: 2, hours, interval_s: 10.0, with_trip: true, ..Invention::default() };
        let invented = invention.invent();
        let (config, scenario) = invented.read().unwrap();
        let channels = Channels::new(&config);
        let text = FrameText::new(&config, &channels);
        let mut lines = Vec::new();
        for frame in Drill::new(&config, &channels, &scenario) {
            let mut line = Vec::new();
            text.write(&frame, &mut line).unwrap();
            lines.push(String::from_utf8(line).unwrap());
        }
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("config.toml"), &invented.config).unwrap();
        Self { folder, config, configuration: invented.config, lines }
    }

    pub fn configuration(&self) -> &str {
        &self.configuration
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// Writes some of the lines into a file, packed where its name says so.
    pub fn file<'a>(&self, name: &str, lines: impl IntoIterator<Item = &'a String>) -> PathBuf {
        let text: String = lines.into_iter().map(String::as_str).collect();
        let path = self.path(name);
        let bytes = if path.extension().is_some_and(|ending| ending == "zst") {
            zstd::encode_all(text.as_bytes(), 3).unwrap()
        } else {
            text.into_bytes()
        };
        fs::File::create(&path).unwrap().write_all(&bytes).unwrap();
        path
    }

    /// The lines of one hour since the beginning.
    pub fn hours(&self, hours: std::ops::Range<usize>) -> &[String] {
        &self.lines[360 * hours.start..(360 * hours.end).min(self.lines.len())]
    }

    pub fn task(&self, alternatives: Vec<Option<Alternative>>) -> Task {
        let text = self.configuration.as_str().into();
        Task { alternatives, ..Task::new(self.config.clone(), text, tautline::report::change::lines) }
    }

    /// The days in these files.
    pub fn days(&self, files: &[PathBuf], threads: usize, carry: bool) -> Vec<Day> {
        let stretches = Stretch::all(files, &|file| Box::new(file), |_| {}).unwrap();
        let run = Run {
            task: &self.task(vec![None; 2]),
            stretches: &stretches,
            threads: NonZeroUsize::new(threads),
            carry,
            output: &self.config.grid.corridors.len(),
            known: &|_: &Stretch, _: NaiveDate| None,
            follow: &|file| Box::new(file),
        };
        let mut days = Vec::new();
        run.go(|done| -> std::io::Result<()> {
            days.push(done.reviewed.day);
            Ok(())
        })
        .unwrap();
        days
    }

    pub fn review(&self, files: &[PathBuf]) -> Review {
        let mut review = Review::new(self.config.feed.max_age());
        self.days(files, 2, false).into_iter().for_each(|day| review.add(day));
        review
    }
}

/// The same days, whatever files they came from.
pub fn without_files(mut days: Vec<Day>) -> Vec<Day> {
    for day in &mut days {
        day.files.clear();
        day.findings.clear();
    }
    days
}

pub fn name(path: &Path) -> String {
    path.display().to_string()
}
