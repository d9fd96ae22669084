//! Recorded files: plain, packed, broken; the same frames however they are read.

use std::{fs, io::Write, path::Path, sync::Arc};

use flate2::{Compression, write::GzEncoder};
use tautline::feed::{Feed, Format, Frame, InputState, Patience, Reader, Recorded};
use tempfile::TempDir;

use crate::bed::{channels, lines, open, rest, seconds, status};

fn gzip(text: &str) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::fast());
    encoder.write_all(text.as_bytes()).unwrap();
    encoder.finish().unwrap()
}

fn zst(text: &str) -> Vec<u8> {
    zstd::encode_all(text.as_bytes(), 1).unwrap()
}

/// Frames of a file by both ways, and its findings.
async fn read(name: &str, bytes: impl AsRef<[u8]>) -> (Vec<Frame>, Vec<String>) {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join(name);
    fs::write(&path, bytes).unwrap();
    let mut feed = open(&[path.to_str().unwrap()], false).await;
    let frames = rest(&mut feed).await;
    assert_eq!(status(&feed).state, InputState::Ended);
    let (again, findings) = recorded(&[&path]);
    assert_eq!(format!("{again:?}"), format!("{frames:?}"));
    assert_eq!(findings, status(&feed).tally.findings());
    (frames, findings)
}

fn recorded(paths: &[&Path]) -> (Vec<Frame>, Vec<String>) {
    let channels = channels();
    let readers = paths.iter().map(|path| Reader::open(path, &channels).unwrap()).collect();
    let mut recorded = Recorded::new(readers, &channels);
    let frames = recorded.by_ref().collect();
    let inputs = recorded.monitor().inputs();
    (frames, inputs.iter().flat_map(|input| input.tally.findings()).collect())
}

#[tokio::test]
async fn every_packing_gives_the_same_frames() {
    let (first, second) = (lines(0..5000), lines(5000..6000));
    let whole = format!("{first}{second}");
    let members = [gzip(&first), gzip(&second)].concat();
    let frames_of_zst = [zst(&first), zst(&second)].concat();
    let files: [(&str, Vec<u8>); 7] = [
        ("day.jsonl", whole.clone().into_bytes()),
        ("day", whole.trim_end().as_bytes().to_vec()),
        ("day.jsonl.gz", gzip(&whole)),
        ("members.jsonl.gz", members),
        ("day.jsonl.zst", zst(&whole)),
        ("frames.jsonl.zst", frames_of_zst),
        ("packed under another name", zst(&whole)),
    ];
    for (name, bytes) in files {
        let (frames, findings) = read(name, bytes).await;
        assert_eq!(seconds(&frames), (0..6000).collect::<Vec<_>>(), "{name}");
        assert_eq!(findings, [""; 0], "{name}");
    }
}

#[tokio::test]
async fn csv_is_known_by_its_ending() {
    let csv = "time,Skarn.kv\n2031-03-15T10:00:00Z,400\n2031-03-15T10:00:01Z,401\n";
    for (name, bytes) in [
        ("day.csv", csv.as_bytes().to_vec()),
        ("DAY.CSV", csv.as_bytes().to_vec()),
        ("day.csv.gz", gzip(csv)),
        ("day.csv.zst", zst(csv)),
    ] {
        let (frames, findings) = read(name, bytes).await;
        assert_eq!((frames.len(), findings.len()), (2, 0), "{name}: {findings:?}");
    }
}

#[tokio::test]
async fn a_truncated_archive_gives_what_it_holds_and_says_so() {
    for (name, packed) in [("day.jsonl.gz", gzip(&lines(0..9000))), ("day.jsonl.zst", zst(&lines(0..9000)))] {
        let (frames, findings) = read(name, &packed[..packed.len() * 9 / 10]).await;
        assert!(frames.len() > 4000 && frames.len() < 9000, "{name}: {}", frames.len());
        assert_eq!(seconds(&frames), (0..i64::try_from(frames.len()).unwrap()).collect::<Vec<_>>());
        assert!(findings.last().unwrap().starts_with("cannot be read to its end: "), "{name}: {findings:?}");
    }
}

#[tokio::test]
async fn a_damaged_archive_never_panics() {
    let packed = [gzip(&lines(0..500)), zst(&lines(0..500))];
    for packed in packed {
        for place in (4..packed.len()).step_by(37) {
            let mut damaged = packed.clone();
            damaged[place] ^= 0x55;
            let (frames, _) = read("damaged", damaged).await;
            assert!(frames.len() <= 500);
        }
    }
}

#[tokio::test]
async fn empty_files_are_files_without_frames() {
    for name in ["day.jsonl", "day.jsonl.gz", "day.csv"] {
        assert_eq!(read(name, "").await, (vec![], vec![]), "{name}");
    }
    assert_eq!(read("day.jsonl.gz", gzip("")).await, (vec![], vec![]));
}

#[tokio::test]
async fn what_cannot_be_opened_is_named() {
    let folder = TempDir::new().unwrap();
    let missing = folder.path().join("missing.jsonl");
    for path in [folder.path(), &missing] {
        let input = path.to_str().unwrap().parse().unwrap();
        let error = Feed::open(&[input], &channels(), Patience::default()).await.unwrap_err();
        assert!(error.to_string().starts_with(&format!("cannot open {}: ", path.display())), "{error}");
    }
}

#[test]
fn memory_stays_flat_over_an_endless_line() {
    let endless = std::io::repeat(b'{');
    let reader = Reader::new("endless", std::io::Read::take(endless, 200 << 20), Format::JsonLines, &channels());
    let before = resident_bytes();
    let channels: Arc<_> = channels();
    let mut recorded = Recorded::new(vec![reader], &channels);
    assert_eq!(recorded.next(), None);
    assert_eq!(recorded.monitor().inputs()[0].tally.malformed, 1);
    let grown = resident_bytes().saturating_sub(before);
    assert!(grown < 50 << 20, "grown by {grown} bytes");
}

fn resident_bytes() -> usize {
    let status = fs::read_to_string("/proc/self/status").expect("this test needs Linux");
    let line = status.lines().find_map(|line| line.strip_prefix("VmRSS:")).unwrap();
    line.trim().strip_suffix(" kB").unwrap().parse::<usize>().unwrap() << 10
}
