use std::{fmt::Write, io, path::PathBuf, sync::Arc};

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

    /// Reads through it for the times of its first and last frame, until told to stop.
    pub(super) fn extent(
        &self,
        channels: &Arc<Channels>,
        stop: impl Fn() -> bool,
    ) -> io::Result<Option<(DateTime<Utc>, DateTime<Utc>)>> {
        let times = self.open(channels)?.map(|frame| frame.time).take_while(|_| !stop());
        Ok(times.fold(None, |extent, time| Some((extent.map_or(time, |(first, _)| first), time))))
    }
}
