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
    let name = |path: &Path| path.file_name().unwrap_or_default().to_string_lossy().into_owned();
    let mut repaired = format!("an unfinished end of {} was taken off", name(path));
    if flaw == Flaw::Damaged {
        let kept = keep_as_it_was(path)?;
        repaired = format!("{} was damaged; what could be read is kept, the rest is in {}", name(path), name(&kept));
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

#[cfg(test)]
mod tests {
    use std::{collections::BTreeSet, fmt::Write as _};

    use chrono::TimeDelta;

    use super::*;
    use crate::recording::day_file::DayFile;

    fn time(second: i64) -> DateTime<Utc> {
        DateTime::UNIX_EPOCH + TimeDelta::seconds(second)
    }

    fn line(second: i64) -> String {
        let mut line = format!("{{\"time\":\"{}\",\"values\":{{", stamp::text(&time(second)));
        for n in 0..20 {
            let _ = write!(line, "\"{n}\":{},", (second * 7919 + n * 104_729) % 99_991);
        }
        line + "\"x\":1}}\n"
    }

    /// Three zstd frames of a few lines, the last of which is flushed twice and not ended; what is in it after each flush.
    fn recorded(path: &Path) -> Vec<(usize, i64)> {
        let mut flushed = Vec::new();
        let (mut file, _) = DayFile::open(path).unwrap();
        for second in 0..40 {
            file.take(line(second).as_bytes(), time(second)).unwrap();
            if second % 5 == 4 {
                if second == 14 || second == 29 { file.end() } else { file.flush() }.unwrap();
                flushed.push((fs::metadata(path).unwrap().len().try_into().unwrap(), second + 1));
            }
        }
        flushed
    }

    fn read(path: &Path) -> String {
        String::from_utf8(zstd::decode_all(File::open(path).unwrap()).unwrap()).unwrap()
    }

    #[test]
    fn cut_anywhere_it_keeps_what_was_flushed_and_goes_on() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("2031-03-14.jsonl.zst");
        let flushed = recorded(&path);
        let whole = fs::read(&path).unwrap();
        let mut unfinished = 0;
        // At and about every flush, and now and then between.
        let about = flushed.iter().flat_map(|(bytes, _)| bytes - 2..bytes + 3);
        let cuts: BTreeSet<_> = (0..40).chain((0..whole.len()).step_by(41)).chain(about).collect();
        for &cut in cuts.iter().filter(|cut| **cut <= whole.len()) {
            fs::write(&path, &whole[..cut]).unwrap();
            let (mut file, repaired) = DayFile::open(&path).unwrap_or_else(|error| panic!("{cut}: {error}"));
            unfinished += usize::from(repaired.is_some());
            let least = flushed.iter().rev().find(|(bytes, _)| *bytes <= cut).map_or(0, |(_, lines)| *lines);
            let kept = file.latest.map_or(0, |latest| (latest - time(0)).num_seconds() + 1);
            assert!(kept >= least, "cut at {cut}: {kept} of {least} lines");
            file.take(line(kept).as_bytes(), time(kept)).unwrap();
            file.end().unwrap();
            let expected: String = (0..=kept).map(line).collect();
            assert!(read(&path) == expected, "cut at {cut}");
        }
        assert!(unfinished > cuts.len() / 2 && unfinished < cuts.len());
        assert_eq!(fs::read_dir(place.path()).unwrap().count(), 1, "an unfinished end is no damage");
    }

    #[test]
    fn what_is_damaged_is_also_kept_as_it_was() {
        let place = tempfile::tempdir().unwrap();
        let path = place.path().join("2031-03-14.jsonl.zst");
        let flushed = recorded(&path);
        let whole = fs::read(&path).unwrap();
        let first_ends = flushed[2].0;
        let mut other = whole.clone();
        other[first_ends + 60] ^= 0x55;
        for (n, damaged) in
            [other, [&whole[..first_ends], &[0; 100][..]].concat(), [&whole[..first_ends], b"no zstd at all"].concat()]
                .into_iter()
                .enumerate()
        {
            fs::write(&path, &damaged).unwrap();
            let settled = settle(&path).unwrap();
            let (lines, kept) = (read(&path), path.with_extension(format!("zst.damaged-{}", n + 1)));
            assert!(settled.latest >= Some(time(14)), "{:?}", settled.latest);
            assert!(
                (0..30).map(line).collect::<String>().starts_with(&lines) && lines.len() >= 15 * line(0).len() - 99
            );
            assert!(fs::read(&kept).unwrap() == damaged, "{}", kept.display());
            assert!(settled.repaired.unwrap().contains("damaged"));
        }
    }
}
