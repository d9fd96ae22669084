use std::{path::Path, sync::Arc};

use super::{Channels, Frame, Tally, csv::Rows, draft::Draft, jsonl, line_error::LineError, lines::Lines};

/// How frames are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Format {
    /// One JSON object a line.
    JsonLines,
    /// A header, then one row a frame.
    Csv,
}

impl Format {
    /// By the file's ending, a compression's put aside.
    pub fn of(path: &Path) -> Self {
        let ends_in =
            |path: &Path, ending: &str| path.extension().is_some_and(|found| found.eq_ignore_ascii_case(ending));
        let is_packed = ends_in(path, "gz") || ends_in(path, "zst");
        let unpacked = if is_packed { &path.with_extension("") } else { path };
        if ends_in(unpacked, "csv") { Self::Csv } else { Self::JsonLines }
    }
}

/// Turns the bytes of one stream into frames. Pure: no I/O, and memory bounded by the longest line looked at.
#[derive(Debug)]
pub struct Decoder {
    lines: Lines,
    parser: Parser,
}

#[derive(Debug)]
struct Parser {
    channels: Arc<Channels>,
    draft: Draft,
    /// `None`: JSON Lines.
    rows: Option<Rows>,
}

impl Decoder {
    /// At the beginning of a stream.
    pub fn new(format: Format, channels: Arc<Channels>) -> Self {
        let draft = Draft::new(&channels);
        let rows = (format == Format::Csv).then(Rows::new);
        Self { lines: Lines::default(), parser: Parser { channels, draft, rows } }
    }

    /// Reads what follows with other channels, whose slots have the same meaning.
    pub(super) fn rewire(&mut self, channels: Arc<Channels>) {
        let parser = &mut self.parser;
        parser.draft = Draft::new(&channels);
        parser.rows.iter_mut().for_each(|rows| rows.rewire(&channels));
        parser.channels = channels;
    }

    /// Takes the next piece of the stream and adds the frames it completes.
    pub fn push(&mut self, bytes: &[u8], tally: &mut Tally, frames: &mut Vec<Frame>) {
        self.lines.push(bytes, |line| self.parser.line(line, tally, frames));
    }

    /// Ends the stream, or a datagram, and with it the last line.
    pub fn finish(&mut self, tally: &mut Tally, frames: &mut Vec<Frame>) {
        self.lines.finish(|line| self.parser.line(line, tally, frames));
    }
}

impl Parser {
    fn line(&mut self, (number, line): (u64, Option<&[u8]>), tally: &mut Tally, frames: &mut Vec<Frame>) {
        let Self { channels, draft, rows } = self;
        let frame = line.ok_or(LineError::TooLong).and_then(|line| match rows {
            None => jsonl::frame(line, channels, draft, tally).map(Some),
            Some(rows) => rows.frame(line, channels, draft, tally),
        });
        match frame {
            Ok(frame) => {
                tally.frames += u64::from(frame.is_some());
                frames.extend(frame);
            }
            Err(error) => tally.malformed(number, &error),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::config::Config;

    const VALID: &str = include_str!("../../tests/config/valid.toml");

    /// A channel comes in, another changes its name in the feed: from the next line on, in both formats.
    #[test]
    fn what_follows_is_read_with_other_channels() {
        let config = Config::parse(VALID, "test.toml").unwrap();
        let mut less = config.clone();
        let last = less.grid.corridors.pop().unwrap();
        less.channel_names.clear();
        less.alarms.pop();
        let (old, new) = (Channels::new(&less), Channels::new(&less).extended(&config));
        let renamed = config.channel_names.iter().next().unwrap();
        let kv = format!("{}.kv", last.buses[1].name);
        assert!(old.in_feed(&kv).is_none() && new.in_feed(&kv).is_some());
        assert!((0..old.len()).all(|slot| old.name(slot) == new.name(slot)), "slots keep their meaning");
        assert_eq!(new.in_feed(renamed.0), None, "the old name is read no more");
        assert!(new.in_feed(renamed.1).is_some());
        assert_eq!(new.extended(&less).extended(&config).len(), new.len(), "what comes back has its old slot");

        let time = "2031-03-14T05:00:00Z";
        for (format, lines) in [
            (Format::JsonLines, [String::new(), format!("{{\"time\":\"{time}\",\"values\":{{\"{kv}\":400}}}}\n")]),
            (Format::Csv, [format!("time,{kv}\n"), format!("{time},400\n")]),
        ] {
            let mut decoder = Decoder::new(format, Arc::new(old.clone()));
            let (mut tally, mut frames) = (Tally::default(), Vec::new());
            decoder.push(lines.concat().as_bytes(), &mut tally, &mut frames);
            decoder.rewire(Arc::new(new.clone()));
            decoder.push(lines[1].as_bytes(), &mut tally, &mut frames);
            let read: Vec<_> = frames.iter().map(|frame| frame.readings.len()).collect();
            assert_eq!(read, [0, 1], "{format:?}");
        }
    }
}
