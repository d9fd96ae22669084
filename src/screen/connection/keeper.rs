use std::{
    collections::BTreeMap,
    fs,
    path::PathBuf,
    time::{Duration, Instant},
};

use chrono::Utc;

use super::InputReport;
use crate::{
    config::wording::is_unprintable,
    desk::Desk,
    source::store::{self, Memory, StoreError},
};

/// How often what was learned is written down.
const APART: Duration = Duration::from_secs(180);

/// Keeps what a desk learns in a file, over a restart.
#[derive(Debug)]
pub struct Keeper {
    path: PathBuf,
    /// By corridor. Those of other configurations stay as they are.
    kept: BTreeMap<String, Memory>,
    /// The file could not be read, so it is left alone.
    unreadable: bool,
    tried: Instant,
    standing: String,
    findings: Vec<String>,
    /// Why the file could not be written, the last time.
    trouble: Option<String>,
    /// What was not told yet.
    news: Vec<String>,
}

impl Keeper {
    /// Gives a desk what was kept for it, and makes sure that the file can be written.
    pub fn open(path: PathBuf, desk: &mut Desk) -> Self {
        let mut keeper = Self {
            path,
            kept: BTreeMap::new(),
            unreadable: false,
            tried: Instant::now(),
            standing: "nothing kept yet".into(),
            findings: Vec::new(),
            trouble: None,
            news: Vec::new(),
        };
        match store::load(&keeper.path) {
            Ok(kept) => keeper.kept = kept,
            Err(error) => {
                keeper.unreadable = matches!(error, StoreError::File { .. });
                keeper.find(&error.to_string());
            }
        }
        keeper.recall(desk);
        if !keeper.findings.is_empty() && !keeper.unreadable {
            keeper.set_aside();
        }
        keeper.save(desk);
        keeper
    }

    fn recall(&mut self, desk: &mut Desk) {
        for corridor in &mut desk.corridors {
            let name = corridor.corridor().name.clone();
            let Some(memory) = self.kept.get(&*name) else { continue };
            if let Err(error) = corridor.learner_mut().recall(memory) {
                self.kept.remove(&*name);
                self.find(&format!("{}: {name}: {error}", self.path.display()));
            }
        }
    }

    /// Nobody wants to lose months of learning by a slip in the configuration.
    fn set_aside(&mut self) {
        let mut old = self.path.as_os_str().to_owned();
        old.push(".old");
        if fs::copy(&self.path, &old).is_ok() {
            self.find(&format!("the file as it was is now {}", old.display()));
        }
    }

    fn find(&mut self, what: &str) {
        let what: String = what.chars().map(|char| if is_unprintable(char) { '\u{fffd}' } else { char }).collect();
        self.news.push(what.clone());
        self.findings.push(what);
    }

    /// What is wrong with the file, for people.
    pub fn findings(&self) -> impl Iterator<Item = &str> {
        self.findings.iter().chain(&self.trouble).map(String::as_str)
    }

    /// What happened since it was last asked.
    pub fn take_news(&mut self) -> Vec<String> {
        std::mem::take(&mut self.news)
    }

    /// Writes the file when it is due.
    pub fn look(&mut self, desk: &Desk) {
        if self.tried.elapsed() >= APART {
            self.save(desk);
        }
    }

    /// Writes the file; returns why it could not.
    pub fn save(&mut self, desk: &Desk) -> Option<&str> {
        self.tried = Instant::now();
        if self.unreadable {
            return self.findings.first().map(String::as_str);
        }
        for corridor in &desk.corridors {
            if let Some(memory) = corridor.learner().memory() {
                self.kept.insert(corridor.corridor().name.to_string(), memory);
            }
        }
        let trouble = store::save(&self.path, self.kept.clone()).err().map(|error| error.to_string());
        let trouble = trouble.map(|error| format!("what is learned cannot be kept: {error}"));
        match &trouble {
            None => self.standing = format!("written {}", Utc::now().format("%H:%M:%S UTC")),
            Some(new) if self.trouble.is_none() => self.news.push(new.clone()),
            Some(_) => {}
        }
        if trouble.is_none() && self.trouble.is_some() {
            self.news.push("what is learned can be kept again".into());
        }
        self.trouble = trouble;
        self.trouble.as_deref()
    }

    /// How it stands, in words.
    pub fn report(&self) -> InputReport {
        InputReport {
            name: self.path.display().to_string().into(),
            standing: if self.unreadable || self.trouble.is_some() {
                "NOT WRITTEN".into()
            } else {
                self.standing.clone()
            },
            findings: self.findings().map(Into::into).collect(),
        }
    }
}
