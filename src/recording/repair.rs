//! What a kill, a full disk or a lost machine leaves of a day's file, made whole again.

use std::{
    fs::{self, File, OpenOptions},
    io::{self, BufReader, BufWriter, Read, Seek, SeekFrom, Write},
    path::{Path, PathBuf},
};

use chrono::{DateTime, Utc};
use serde::Deserialize;
use zstd::stream::{read::Decoder, write::Encoder};

use crate::feed::{MAX_LINE_BYTES, stamp};

const LEVEL: i32 = 3;
const CHUNK_BYTES: usize = 1 << 16;

/// A file that can be appended to.
#[derive(Debug, Default)]
pub(super) struct Settled {
    /// Time of its last frame.
    pub latest: Option<DateTime<Utc>>,
    /// What had to be repaired, in words.
    pub repaired: Option<String>,
}

/// How far a file can be read.
#[derive(Default)]
struct Extent {
    /// Bytes of the file up to the end of the last zstd frame that is whole and ends with a line.
    whole: u64,
    /// Bytes of whole lines that can be read beyond that.
    beyond: u64,
    /// The last whole line, as far as it is not too long.
    last: Vec<u8>,
    flaw: Option<Flaw>,
}

/// What is wrong with the end of a file.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Flaw {
    /// It breaks off: the program ended before it did.
    Unfinished,
    /// It holds something else.
    Damaged,
}

/// Looks through a file, and keeps what can be read of it: the file is replaced as a whole, or not at all. Where it is
/// damaged rather than unfinished, it is also kept as it was.
pub(super) fn settle(path: &Path) -> io::Result<Settled> {
    let extent = Extent::of(path)?;
    let latest = extent.latest();
    let Some(flaw) = extent.flaw else { return Ok(Settled { latest, repaired: None }) };
    let beside = path.with_extension("zst.new");
    extent.write(path, &beside)?;
    let mut repaired = format!("{}: an unfinished end was taken off", path.display());
    if flaw == Flaw::Damaged {
        let kept = keep_as_it_was(path)?;
        repaired =
            format!("{}: damaged; what could be read is kept, and the file is {}", path.display(), kept.display());
    }
    fs::rename(&beside, path)?;
    if let Some(folder) = path.parent().filter(|folder| !folder.as_os_str().is_empty()) {
        File::open(folder)?.sync_all()?;
    }
    Ok(Settled { latest, repaired: Some(repaired) })
}

fn keep_as_it_was(path: &Path) -> io::Result<PathBuf> {
    for number in 1.. {
        let kept = path.with_extension(format!("zst.damaged-{number}"));
        match fs::hard_link(path, &kept) {
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists => {}
            linked => return linked.map(|()| kept),
        }
    }
    Err(io::ErrorKind::AlreadyExists.into())
}

impl Extent {
    fn of(path: &Path) -> io::Result<Self> {
        let mut file = BufReader::with_capacity(CHUNK_BYTES, File::open(path)?);
        let length = file.get_ref().metadata()?.len();
        let (mut extent, mut line, mut chunk) = (Self::default(), Vec::new(), vec![0; CHUNK_BYTES]);
        while extent.whole < length {
            let mut decoder = Decoder::with_buffer(file)?.single_frame();
            let mut bytes = 0;
            let flaw = loop {
                match decoder.read(&mut chunk) {
                    Ok(0) => break (!line.is_empty()).then_some(Flaw::Damaged),
                    Ok(count) => extent.take(&chunk[..count], &mut bytes, &mut line),
                    Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
                    // The disk itself: nothing can be said about the file.
                    Err(error) if error.raw_os_error().is_some() => return Err(error),
                    Err(error) if error.kind() == io::ErrorKind::UnexpectedEof => break Some(Flaw::Unfinished),
                    Err(_) => break Some(Flaw::Damaged),
                }
            };
            if flaw.is_some() {
                return Ok(Self { flaw, ..extent });
            }
            extent.beyond = 0;
            file = decoder.finish();
            extent.whole = file.stream_position()?;
        }
        Ok(extent)
    }

    /// Takes what was read of a zstd frame: counts its bytes, and those of its whole lines.
    fn take(&mut self, read: &[u8], bytes: &mut u64, line: &mut Vec<u8>) {
        for piece in read.split_inclusive(|byte| *byte == b'\n') {
            *bytes += piece.len() as u64;
            if line.len() + piece.len() <= MAX_LINE_BYTES {
                line.extend_from_slice(piece);
            }
            if piece.ends_with(b"\n") {
                self.beyond = *bytes;
                self.last.clear();
                self.last.append(line);
            }
        }
    }

    fn latest(&self) -> Option<DateTime<Utc>> {
        #[derive(Deserialize)]
        struct Timed {
            #[serde(with = "stamp")]
            time: DateTime<Utc>,
        }
        serde_json::from_slice(&self.last).ok().map(|Timed { time }| time)
    }

    /// Writes what can be read of a file to another.
    fn write(&self, from: &Path, to: &Path) -> io::Result<()> {
        let mut file = File::open(from)?;
        let mut out = BufWriter::new(OpenOptions::new().write(true).create(true).truncate(true).open(to)?);
        io::copy(&mut (&mut file).take(self.whole), &mut out)?;
        if self.beyond > 0 {
            file.seek(SeekFrom::Start(self.whole))?;
            let mut lines = Decoder::new(file)?.single_frame().take(self.beyond);
            let mut encoder = Encoder::new(&mut out, LEVEL)?;
            encoder.include_checksum(true)?;
            io::copy(&mut lines, &mut encoder)?;
            encoder.finish()?;
        }
        out.flush()?;
        out.get_ref().sync_all()
    }
}
