//! Killed at any instant, nothing that was flushed is lost, nothing is damaged, and it goes on.

use std::{
    env,
    fs::{self, File},
    io::{BufRead, BufReader, Read, Write, stdout},
    path::{Path, PathBuf},
    process::{Command, Stdio},
    thread,
    time::{Duration, Instant},
};

use chrono::TimeDelta;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use serde_json::Value;
use tautline::feed::{Channels, Frame, Quality, Reading};

use super::bed::{INVENTION, Station, at, invented, parse, replayed};

const KILLS: usize = 150;
/// The kills end earlier on a machine that is too busy for all of them; so many there must be.
const FEWEST_KILLS: usize = 30;
const TIME: Duration = Duration::from_secs(20);
const FOLDER: &str = "TAUTLINE_TEST_RECORDING";
const FIRST: &str = "TAUTLINE_TEST_FIRST_FRAME";
const START: &str = "2031-03-14T00:00:00Z";

fn configuration() -> String {
    invented(&INVENTION).0 + "\n[recording]\nflush_s = 0.1\n"
}

/// One frame in two minutes: the day changes after every 720.
fn frame(channels: &Channels, number: u64) -> Frame {
    let value = 400.0 + 1e-3 * number as f64;
    let readings = (0..channels.len()).map(|slot| {
        (slot, Reading { value: if channels.is_status(slot) { 1.0 } else { value }, quality: Quality::Good })
    });
    let readings = readings.filter(|(slot, reading)| channels.is_plausible(*slot, reading.value)).collect();
    Frame { time: at(START) + TimeDelta::minutes(2 * i64::try_from(number).unwrap()), readings, aside: None }
}

/// Not a test of its own: the program that is killed. It says on standard output how many frames are on the disk.
#[test]
#[ignore = "run by the test below"]
fn the_program_that_is_killed() {
    let (Ok(folder), Ok(first)) = (env::var(FOLDER), env::var(FIRST)) else { return };
    let first: u64 = first.parse().unwrap();
    let text = configuration();
    let channels = Channels::new(&parse(&text));
    let mut station = Station::begin(Some(Path::new(&folder)), &text, Default::default());
    // The test harness leaves the start of a line behind.
    println!();
    for number in first.. {
        station.take(&frame(&channels, number));
        let status = station.recorder.as_ref().unwrap().status();
        assert_eq!((status.lost, status.trouble), (0, None));
        writeln!(stdout().lock(), "safe\t{}", first + status.on_disk).unwrap();
        thread::sleep(Duration::from_micros(200));
    }
}

/// Starts it, kills it after a while, and returns how many frames it said are on the disk.
fn safe_until_killed(folder: &Path, first: u64, after: Duration) -> u64 {
    let mut child = Command::new(env::current_exe().unwrap())
        .args(["--ignored", "--exact", "killing::the_program_that_is_killed", "--nocapture", "--test-threads=1"])
        .env(FOLDER, folder)
        .env(FIRST, first.to_string())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let output = BufReader::new(child.stdout.take().unwrap());
    let reader = thread::spawn(move || {
        // A last line may be cut off in its middle.
        let whole = output.split(b'\n').map_while(Result::ok).map(|line| String::from_utf8_lossy(&line).into_owned());
        let safe = whole.filter_map(|line| line.strip_prefix("safe\t")?.parse().ok());
        safe.collect::<Vec<u64>>().into_iter().rev().nth(1)
    });
    thread::sleep(after);
    child.kill().unwrap();
    child.wait().unwrap();
    reader.join().unwrap().unwrap_or(first)
}

/// The days of a folder in order.
fn days(folder: &Path) -> Vec<PathBuf> {
    let entries = fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path());
    let mut days: Vec<_> = entries.filter(|path| path.extension().is_some_and(|ending| ending == "zst")).collect();
    days.sort();
    days
}

/// The whole lines of a file, also of one that breaks off.
fn lines(path: &Path) -> Vec<Value> {
    let (mut bytes, mut chunk) = (Vec::new(), [0; 4096]);
    let mut reader = zstd::Decoder::new(File::open(path).unwrap()).unwrap();
    while let Ok(count @ 1..) = reader.read(&mut chunk) {
        bytes.extend_from_slice(&chunk[..count]);
    }
    let whole = bytes.iter().rposition(|byte| *byte == b'\n').map_or(0, |end| end + 1);
    bytes[..whole].split(|byte| *byte == b'\n').filter_map(|line| serde_json::from_slice(line).ok()).collect()
}

/// Checks the files from the day of a frame on; how many frames there are altogether.
fn checked(folder: &Path, channels: &Channels, text: &str, from: u64) -> u64 {
    let text = tautline::feed::FrameText::new(&parse(text), channels);
    let mut number = from / 720 * 720;
    let first = frame(channels, number).time.date_naive().to_string();
    for day in days(folder).iter().filter(|day| day.file_name().unwrap().to_str().unwrap() >= first.as_str()) {
        for (n, mut line) in lines(day).into_iter().enumerate() {
            assert!(n > 0 || line["tautline"]["start"].is_object(), "{} begins with a start", day.display());
            line.as_object_mut().unwrap().remove("tautline");
            let expected = frame(channels, number);
            let mut written = Vec::new();
            text.write(&expected, &mut written).unwrap();
            assert_eq!(line, serde_json::from_slice::<Value>(&written).unwrap(), "frame {number}");
            assert!(day.file_name().unwrap().to_str().unwrap().starts_with(&expected.time.date_naive().to_string()));
            number += 1;
        }
    }
    number
}

#[test]
fn killed_at_any_instant_nothing_flushed_is_lost() {
    let folder = tempfile::tempdir().unwrap();
    let text = configuration();
    let channels = Channels::new(&parse(&text));
    let mut chance = ChaCha8Rng::seed_from_u64(5);
    let begun = Instant::now();
    let (mut kills, mut count, mut unsafe_frames) = (0, 0, 0);
    while kills < KILLS && begun.elapsed() < TIME {
        let safe = safe_until_killed(folder.path(), count, Duration::from_micros(chance.random_range(0..260_000)));
        kills += 1;
        let found = checked(folder.path(), &channels, &text, count.saturating_sub(1));
        assert!(found >= safe, "after {kills} kills: {found} frames, but {safe} were on the disk");
        unsafe_frames += found - safe;
        count = found;
    }
    println!("{kills} kills, {count} frames, {} days, {unsafe_frames} more than promised", days(folder.path()).len());
    assert!(kills >= FEWEST_KILLS && count > 1000, "{kills} kills, {count} frames");

    // What a kill left is read as far as it goes, and whole once somebody went on.
    let (_, findings) = replayed(&[days(folder.path()).last().unwrap()], &text);
    assert!(findings.iter().all(|finding| !finding.contains("not taken up")), "{findings:?}");
    let mut station = Station::begin(Some(folder.path()), &text, Default::default());
    station.take(&frame(&channels, count));
    station.end();
    let files = days(folder.path());
    let (seen, findings) = replayed(&files.iter().map(PathBuf::as_path).collect::<Vec<_>>(), &text);
    assert_eq!(findings, Vec::<String>::new());
    assert_eq!(seen.records.len() as u64, 2 * (count + 1));
}

#[test]
fn a_truncated_day_is_read_up_to_its_last_whole_line() {
    let folder = tempfile::tempdir().unwrap();
    let text = configuration();
    let channels = Channels::new(&parse(&text));
    let mut station = Station::begin(Some(folder.path()), &text, Default::default());
    (0..700).for_each(|number| station.take(&frame(&channels, number)));
    station.end();
    let path = &days(folder.path())[0];
    let whole = fs::read(path).unwrap();
    fs::write(path, &whole[..whole.len() - whole.len() / 10]).unwrap();
    let (seen, findings) = replayed(&[path], &text);
    assert!((600..1400).contains(&seen.records.len()), "{}", seen.records.len());
    assert!(findings.iter().any(|finding| finding.contains("cannot be read to its end")), "{findings:?}");
}
