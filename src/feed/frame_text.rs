use std::io::{self, Write};

use super::{Channels, Frame, Quality, Slot, stamp};
use crate::config::Config;

/// Writes frames as JSON Lines; reading them gives the same frames.
#[derive(Debug, Clone)]
pub struct FrameText {
    /// By slot; `None` for a channel that the configuration no longer knows.
    keys: Vec<Option<Key>>,
}

/// The name of a channel in the feed, as it is and as `"name":`.
#[derive(Debug, Clone)]
struct Key {
    name: String,
    json: String,
}

impl FrameText {
    /// With the names that the channels have in the feed.
    pub fn new(config: &Config, channels: &Channels) -> Self {
        let key = |slot| {
            let name = &**channels.name(slot);
            let name = config.channel_names.get(name).map_or(name, String::as_str);
            let json = || format!("{}:", serde_json::Value::from(name));
            (channels.in_feed(name) == Some(slot)).then(|| Key { name: name.to_owned(), json: json() })
        };
        Self { keys: (0..channels.len()).map(key).collect() }
    }

    /// Adds one line.
    pub fn write(&self, frame: &Frame, line: &mut impl Write) -> io::Result<()> {
        self.write_with(frame, None, line)
    }

    /// Adds one line that brings an aside, given as JSON.
    pub fn write_with(&self, frame: &Frame, aside: Option<&str>, line: &mut impl Write) -> io::Result<()> {
        write!(line, "{{\"time\":\"{}\",\"values\":{{", stamp::text(&frame.time))?;
        let known = || frame.readings.iter().filter_map(|(slot, reading)| Some((&*self.key(*slot)?.json, reading)));
        let mut comma = "";
        for (key, reading) in known() {
            match reading.value {
                value if value.is_finite() => write!(line, "{comma}{key}{value}")?,
                _ => write!(line, "{comma}{key}null")?,
            }
            comma = ",";
        }
        comma = "},\"quality\":{";
        for (key, reading) in known().filter(|(_, reading)| reading.quality != Quality::Good) {
            write!(line, "{comma}{key}\"{}\"", reading.quality.word())?;
            comma = ",";
        }
        match aside {
            Some(aside) => writeln!(line, "}},\"tautline\":{aside}}}"),
            None => line.write_all(b"}}\n"),
        }
    }

    /// The name of a channel in force.
    pub(super) fn name(&self, slot: Slot) -> Option<&str> {
        Some(&self.key(slot)?.name)
    }

    fn key(&self, slot: Slot) -> Option<&Key> {
        self.keys.get(slot)?.as_ref()
    }
}
