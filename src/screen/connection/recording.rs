use std::{
    fmt::Write,
    io,
    path::PathBuf,
    sync::{Arc, OnceLock},
    thread,
};

use chrono::{DateTime, Utc};

use crate::feed::{Channels, Format, Reader, Recorded};

/// Recorded frames that can be read again from their beginning.
#[derive(Debug, Clone)]
pub enum Recording {
    /// Files, merged by time.
    Files(Vec<PathBuf>),
    /// JSON Lines within the program, packed or not.
    Within {
        /// What to call it.
        name: &'static str,
        /// Its bytes.
        bytes: &'static [u8],
    },
}

/// From when to when a recording goes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Extent {
    /// Time of the first frame.
    pub first: DateTime<Utc>,
    /// Time of the last.
    pub last: DateTime<Utc>,
}

impl Recording {
    /// Opens it at its first frame.
    pub fn open(&self, channels: &Arc<Channels>) -> io::Result<Recorded> {
        let readers = match self {
            Self::Files(paths) => paths
                .iter()
                .map(|path| {
                    Reader::open(path, channels)
                        .map_err(|error| io::Error::new(error.kind(), format!("{}: {error}", path.display())))
                })
                .collect::<io::Result<_>>()?,
            Self::Within { name, bytes } => vec![Reader::new(name, *bytes, Format::JsonLines, channels)],
        };
        Ok(Recorded::new(readers, channels))
    }

    /// What to call it.
    pub fn name(&self) -> String {
        match self {
            Self::Files(paths) => {
                let mut name = paths.first().map_or(String::new(), |path| path.display().to_string());
                if paths.len() > 1 {
                    let _ = write!(name, " and {} more", paths.len() - 1);
                }
                name
            }
            Self::Within { name, .. } => (*name).into(),
        }
    }

    /// Reads through it once on a thread of its own, for its extent.
    pub(super) fn measure(&self, channels: &Arc<Channels>) -> Arc<OnceLock<Extent>> {
        let extent = Arc::new(OnceLock::new());
        let (recording, channels, found) = (self.clone(), channels.clone(), extent.clone());
        thread::spawn(move || {
            let frames = recording.open(&channels).into_iter().flatten();
            let whole = frames.map(|frame| frame.time).fold(None, |extent: Option<Extent>, time| {
                Some(Extent { first: extent.map_or(time, |extent| extent.first), last: time })
            });
            if let Some(whole) = whole {
                let _ = found.set(whole);
            }
        });
        extent
    }
}
