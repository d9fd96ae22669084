use std::{
    fs::{File, OpenOptions},
    io::{self, Write},
    mem,
    os::unix::fs::MetadataExt,
    path::Path,
    time::{Duration, Instant},
};

use chrono::{DateTime, Utc};
use zstd::stream::write::Encoder;

use super::repair;

/// Fast enough for any feed.
const LEVEL: i32 = 3;
/// A zstd frame, which can be read without those before it, ends after so much.
const LONGEST_FRAME: Duration = Duration::from_secs(60);
const LARGEST_FRAME: usize = 4 << 20;
/// Compressed bytes that wait for a disk that fails.
const MOST_WAITING: usize = 8 << 20;

/// Where compressed bytes go.
pub(super) trait Sink: Send {
    /// Takes some of the bytes.
    fn append(&mut self, bytes: &[u8]) -> io::Result<usize>;
    /// Makes sure that they outlast the machine.
    fn sync(&mut self) -> io::Result<()>;
}

impl Sink for File {
    fn append(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.write(bytes)
    }

    fn sync(&mut self) -> io::Result<()> {
        self.sync_data()?;
        // What is written to a deleted file is kept nowhere, and no write says so.
        if self.metadata()?.nlink() == 0 {
            return Err(io::Error::new(io::ErrorKind::NotFound, "its file was deleted"));
        }
        Ok(())
    }
}

/// The file of one day, being written.
pub(super) struct DayFile {
    /// Time of the last frame in it.
    pub latest: Option<DateTime<Utc>>,
    sink: Box<dyn Sink>,
    /// Compresses into memory: what a full disk does not take stays whole.
    encoder: Option<Encoder<'static, Vec<u8>>>,
    begun: Instant,
    raw_bytes: usize,
    waiting: Vec<u8>,
    /// Frames that are not on the disk yet.
    pub unsynced: u64,
}

impl DayFile {
    /// Opens a day's file to go on with it, repaired where it has to be; what was, in words.
    pub fn open(path: &Path) -> io::Result<(Self, Option<String>)> {
        let settled = if path.exists() { repair::settle(path)? } else { repair::Settled::default() };
        let file = OpenOptions::new().append(true).create(true).open(path)?;
        Ok((Self { latest: settled.latest, ..Self::new(Box::new(file)) }, settled.repaired))
    }

    pub fn new(sink: Box<dyn Sink>) -> Self {
        let begun = Instant::now();
        Self { latest: None, sink, encoder: None, begun, raw_bytes: 0, waiting: Vec::new(), unsynced: 0 }
    }

    /// Whether more waits for the disk than can be held.
    pub fn is_full(&self) -> bool {
        self.waiting.len() >= MOST_WAITING
    }

    /// Takes a line.
    pub fn take(&mut self, line: &[u8], time: DateTime<Utc>) -> io::Result<()> {
        let encoder = match &mut self.encoder {
            Some(encoder) => encoder,
            none => {
                let mut encoder = Encoder::new(Vec::new(), LEVEL)?;
                encoder.include_checksum(true)?;
                (self.begun, self.raw_bytes) = (Instant::now(), 0);
                none.insert(encoder)
            }
        };
        encoder.write_all(line)?;
        self.raw_bytes += line.len();
        self.latest = Some(time);
        self.unsynced += 1;
        if self.raw_bytes >= LARGEST_FRAME { self.end_frame() } else { Ok(()) }
    }

    fn end_frame(&mut self) -> io::Result<()> {
        if let Some(encoder) = self.encoder.take() {
            self.waiting.append(&mut encoder.finish()?);
        }
        Ok(())
    }

    /// Brings everything to the disk; what it does not take now waits for the next time.
    pub fn flush(&mut self) -> io::Result<()> {
        if self.begun.elapsed() >= LONGEST_FRAME {
            self.end_frame()?;
        }
        if self.unsynced == 0 && self.waiting.is_empty() {
            return Ok(());
        }
        if let Some(encoder) = &mut self.encoder {
            encoder.flush()?;
            self.waiting.append(&mut mem::take(encoder.get_mut()));
        }
        let mut taken = 0;
        let outcome = loop {
            if taken == self.waiting.len() {
                break self.sink.sync();
            }
            match self.sink.append(&self.waiting[taken..]) {
                Ok(0) => break Err(io::ErrorKind::WriteZero.into()),
                Ok(count) => taken += count,
                Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                Err(error) => break Err(error),
            }
        };
        self.waiting.drain(..taken);
        if outcome.is_ok() {
            self.unsynced = 0;
        }
        outcome
    }

    /// Ends it, complete.
    pub fn end(&mut self) -> io::Result<()> {
        self.end_frame()?;
        self.flush()
    }
}
