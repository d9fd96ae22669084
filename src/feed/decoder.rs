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
