//! Notices that the configuration file was changed, and says what that would change.

use std::{
    fs,
    path::{Path, PathBuf},
    sync::Arc,
    time::SystemTime,
};

use crate::{
    config::{Config, ConfigErrors},
    report::change,
};

/// Errors of a broken file that are shown.
const ERRORS_SHOWN: usize = 8;

/// Tells one content of a file from another.
type Stamp = (SystemTime, u64);

/// The configuration in force, and the file it came from.
pub struct Revision {
    path: PathBuf,
    /// What the command line has to say on top of a file.
    adjust: Box<dyn Fn(&mut Config) + Send>,
    running: Config,
    /// Its text.
    text: String,
    /// Of the file as it was read last.
    read: Option<Stamp>,
    /// Of the file as it was seen last.
    seen: Option<Stamp>,
    offered: Option<(Config, String)>,
    change: Option<Arc<Change>>,
    count: u64,
}

/// What a changed file would bring.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Change {
    /// Counts up: what was shown is what is applied.
    pub number: u64,
    /// Whether it can be applied; if not, the lines say why.
    pub is_sound: bool,
    /// A line for each difference, or for each error.
    pub lines: Vec<String>,
}

impl Revision {
    /// Begins with the configuration that the file had just now.
    pub fn new(path: &Path, running: Config, text: String, adjust: impl Fn(&mut Config) + Send + 'static) -> Self {
        let stamp = stamp(path);
        Self {
            path: path.to_owned(),
            adjust: Box::new(adjust),
            running,
            text,
            read: stamp,
            seen: stamp,
            offered: None,
            change: None,
            count: 0,
        }
    }

    /// The configuration in force.
    pub fn running(&self) -> &Config {
        &self.running
    }

    /// The text of the configuration in force.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// What the file would change, if it is another than the one in force.
    pub fn change(&self) -> Option<&Arc<Change>> {
        self.change.as_ref()
    }

    /// Looks at the file, and reads it once it has stopped changing: half a file may look whole. True when there is
    /// something new to tell.
    pub fn look(&mut self) -> bool {
        let now = stamp(&self.path);
        let is_settled = now == self.seen;
        self.seen = now;
        if !is_settled || now == self.read {
            return false;
        }
        self.read = now;
        self.count += 1;
        let outcome = Config::read(&self.path).map(|(mut config, text)| {
            (self.adjust)(&mut config);
            (config, text)
        });
        let change = |is_sound, lines| Some(Arc::new(Change { number: self.count, is_sound, lines }));
        (self.offered, self.change) = match outcome {
            Ok((config, _)) if config == self.running => (None, None),
            Ok((config, text)) => {
                let lines = change::lines(&self.running, &config);
                (Some((config, text)), change(true, lines))
            }
            Err(errors) => (None, change(false, told(&errors))),
        };
        true
    }

    /// Takes the change of that number into force; the configuration before it. `None` where the file says something
    /// else by now.
    pub fn apply(&mut self, number: u64) -> Option<Config> {
        let fits = self.change.as_ref().is_some_and(|change| change.number == number);
        let (config, text) = self.offered.take_if(|_| fits)?;
        self.change = None;
        self.text = text;
        Some(std::mem::replace(&mut self.running, config))
    }
}

fn stamp(path: &Path) -> Option<Stamp> {
    let metadata = fs::metadata(path).ok()?;
    Some((metadata.modified().ok()?, metadata.len()))
}

fn told(errors: &ConfigErrors) -> Vec<String> {
    let mut lines: Vec<_> = errors.to_string().lines().map(ToOwned::to_owned).collect();
    let more = lines.len().saturating_sub(ERRORS_SHOWN + 1);
    if more > 0 {
        lines.truncate(ERRORS_SHOWN + 1);
        lines.push(format!("... and {more} more; tautline check lists them"));
    }
    lines
}
