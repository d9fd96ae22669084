use std::{
    collections::VecDeque,
    fmt,
    fs::File,
    io::{self, Cursor, Read},
    path::Path,
    sync::Arc,
};

use chrono::{DateTime, Utc};

use super::{
    Channels, Format, Frame, InputState, Monitor,
    merge::{Lane, Merger},
    monitor::Gauge,
    stream::{CHUNK_BYTES, Stream},
    switch::Switch,
};

/// Recorded frames of one or more sources, merged by time, read as they are asked for.
#[derive(Debug)]
pub struct Recorded {
    lanes: Vec<Lane<Reader>>,
    /// Sources that begin later, the latest first, with the time from when they are needed.
    later: Vec<(DateTime<Utc>, Reader)>,
    merger: Merger,
    monitor: Monitor,
}

impl Recorded {
    /// Reads recorded sources.
    pub fn new(readers: Vec<Reader>, channels: &Channels) -> Self {
        Self::in_turn(readers.into_iter().map(|reader| (DateTime::<Utc>::MIN_UTC, reader)).collect(), channels)
    }

    /// Reads recorded sources that bring nothing before a time each: they are opened when it comes.
    pub fn in_turn(mut readers: Vec<(DateTime<Utc>, Reader)>, channels: &Channels) -> Self {
        let monitor = Monitor(readers.iter().map(|(_, reader)| reader.gauge().clone()).collect());
        // Among equals the first stays the first.
        readers.sort_by_key(|(from, _)| *from);
        readers.reverse();
        Self { lanes: Vec::new(), later: readers, merger: Merger::new(channels), monitor }
    }

    /// Opens those that may bring the next frame.
    fn open(&mut self) {
        loop {
            for lane in &mut self.lanes {
                while lane.frames.is_empty()
                    && let Some(frames) = lane.source.next_frames()
                {
                    lane.frames = VecDeque::from(frames);
                }
            }
            self.lanes.retain(|lane| !lane.frames.is_empty());
            let earliest = self.lanes.iter().filter_map(|lane| lane.frames.front()).map(|frame| frame.time).min();
            let is_due = |(from, _): &mut (_, _)| earliest.is_none_or(|earliest| *from <= earliest);
            let Some((_, reader)) = self.later.pop_if(is_due) else { return };
            self.lanes.push(Lane::new(reader.gauge().clone(), reader));
        }
    }

    /// What was read so far, and what of it could not be used.
    pub fn monitor(&self) -> &Monitor {
        &self.monitor
    }
}

impl Iterator for Recorded {
    type Item = Frame;

    fn next(&mut self) -> Option<Frame> {
        loop {
            self.open();
            if self.lanes.is_empty() {
                return None;
            }
            if let Some(frame) = self.merger.take(&mut self.lanes, None) {
                return Some(frame);
            }
        }
    }
}

/// Reads the frames of one recorded source, unpacking gzip and zstd.
pub struct Reader {
    bytes: Bytes,
    chunk: Vec<u8>,
    stream: Stream,
}

/// How far the reading of a source has come.
enum Bytes {
    Unopened(Box<dyn Read + Send>),
    Open(Box<dyn Read + Send>),
    Ended,
}

impl Reader {
    /// Opens a file; CSV by its ending, packed or not by its first bytes.
    pub fn open(path: &Path, channels: &Arc<Channels>) -> io::Result<Self> {
        let file = File::open(path)?;
        if file.metadata()?.is_dir() {
            return Err(io::ErrorKind::IsADirectory.into());
        }
        Ok(Self::new(&path.to_string_lossy(), file, Format::of(path), channels))
    }

    /// Reads from anything else, which is not touched before the first frame is asked for.
    pub fn new(name: &str, bytes: impl Read + Send + 'static, format: Format, channels: &Arc<Channels>) -> Self {
        let stream = Stream::new(format, channels.clone(), Gauge::new(name));
        Self { bytes: Bytes::Unopened(Box::new(bytes)), chunk: Vec::new(), stream }
    }

    /// The same, reading with the channels in force.
    pub(super) fn with(self, switch: Switch) -> Self {
        Self { stream: self.stream.with(switch), ..self }
    }

    pub(super) fn gauge(&self) -> &Arc<Gauge> {
        &self.stream.gauge
    }

    /// The next frames, perhaps none; `None` at the end. A source that breaks ends there, and its tally says so.
    pub(super) fn next_frames(&mut self) -> Option<Vec<Frame>> {
        match self.read() {
            Ok(Some(count)) => Some(self.stream.push(&self.chunk[..count])),
            _ if matches!(self.bytes, Bytes::Ended) => None,
            end => {
                self.bytes = Bytes::Ended;
                let frames = self.stream.finish();
                let mut status = self.stream.gauge.lock();
                status.state = InputState::Ended;
                if let Err(error) = end {
                    status.tally.trouble(&format!("cannot be read to its end: {error}"));
                }
                Some(frames)
            }
        }
    }

    /// The bytes read into the chunk; `None` at the end.
    fn read(&mut self) -> io::Result<Option<usize>> {
        loop {
            match &mut self.bytes {
                Bytes::Unopened(bytes) => {
                    let bytes = std::mem::replace(bytes, Box::new(io::empty()));
                    self.stream.gauge.set(InputState::Connected);
                    self.chunk.resize(CHUNK_BYTES, 0);
                    self.bytes = Bytes::Open(unpacked(bytes)?);
                }
                Bytes::Open(bytes) => match bytes.read(&mut self.chunk) {
                    Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                    read => return read.map(|count| (count > 0).then_some(count)),
                },
                Bytes::Ended => return Ok(None),
            }
        }
    }
}

/// Unpacks what begins like gzip (RFC 1952) or zstd (RFC 8878), any number of members one after another.
fn unpacked(mut bytes: Box<dyn Read + Send>) -> io::Result<Box<dyn Read + Send>> {
    let mut first = Vec::new();
    bytes.by_ref().take(4).read_to_end(&mut first)?;
    let whole = Cursor::new(first.clone()).chain(bytes);
    Ok(match first[..] {
        [0x1f, 0x8b, ..] => Box::new(flate2::read::MultiGzDecoder::new(whole)),
        // A frame, or one to be skipped.
        [0x28, 0xb5, 0x2f, 0xfd] | [0x50..=0x5f, 0x2a, 0x4d, 0x18] => Box::new(zstd::Decoder::new(whole)?),
        _ => Box::new(whole),
    })
}

impl fmt::Debug for Reader {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Reader").field("stream", &self.stream).finish_non_exhaustive()
    }
}
