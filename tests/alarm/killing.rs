//! Killed at any instant, nothing that was shown is lost.

use std::{
    collections::BTreeMap,
    env,
    io::{BufRead, BufReader, Write, stdout},
    path::Path,
    process::{Command, Stdio},
    thread,
    time::{Duration, Instant},
};

use chrono::TimeDelta;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rusqlite::Connection;
use tautline::{
    alarm::{Action, Board, State},
    journal::{Entry, Journal, ReadOnly},
};
use tempfile::TempDir;

use super::bed::{at, config, headroom};

const KILLS: usize = 300;
/// The kills end earlier on a machine that is too busy for all of them; so many there must be.
const FEWEST_KILLS: usize = 60;
const TIME: Duration = Duration::from_secs(25);
const PATH: &str = "TAUTLINE_TEST_JOURNAL";
const KEEP: TimeDelta = TimeDelta::days(400);

const BUSY: &str =
    "[[alarm]]\nname = \"busy\"\non = \"headroom_mw\"\nsetpoint = 100\ndeadband = 0\non_delay_s = 0\noff_delay_s = 0\n";

/// Not a test of its own: the program that is killed. It says on standard output what it shows, once that is durable.
#[test]
#[ignore = "run by the test below"]
fn the_program_that_is_killed() {
    let Ok(path) = env::var(PATH) else { return };
    let mut journal = Journal::open(Path::new(&path), KEEP).unwrap();
    let mut board = Board::new(&config(BUSY, ""));
    let kept = journal.standing().unwrap();
    // The test harness leaves the start of a line behind.
    println!();
    // Goes on where the one before it was killed.
    let mut second = kept.iter().filter_map(|kept| kept.standing.since).max().map_or(0, |t| (t - at(0)).num_seconds());
    board.restore(kept);
    for round in 0_usize.. {
        second += 1;
        let mut seen = board.observe(&[headroom(second, if round % 3 == 0 { 50.0 } else { 500.0 })]);
        let waiting = board.abnormal();
        if round % 2 == 0 {
            seen.extend(board.acknowledge_all(waiting, at(second)));
        } else if round % 7 == 3
            && let Some(id) = waiting.first()
        {
            let shelve = Action::Shelve { until: at(second + 5), reason: "busy".into() };
            seen.extend(board.act(*id, &shelve, at(second)).ok());
        }
        assert!(journal.write(seen.iter().map(Entry::transition)).is_durable());
        let mut out = stdout().lock();
        for transition in seen {
            let time = (transition.time - at(0)).num_seconds();
            writeln!(out, "shown\t{time}\t{}\t{}\t{}", transition.alarm, transition.event, transition.to).unwrap();
        }
    }
}

/// Starts it, kills it after a while, and returns what it showed.
fn shown_until_killed(path: &Path, after: Duration) -> Vec<String> {
    let mut child = Command::new(env::current_exe().unwrap())
        .args(["--ignored", "--exact", "killing::the_program_that_is_killed", "--nocapture", "--test-threads=1"])
        .env(PATH, path)
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let output = BufReader::new(child.stdout.take().unwrap());
    let reader = thread::spawn(move || {
        // A last line may be cut off in its middle: the entry is checked by what comes before it.
        let lines = output.split(b'\n').map_while(Result::ok).map(|line| String::from_utf8_lossy(&line).into_owned());
        lines.filter(|line| line.starts_with("shown\t") && line.split('\t').count() == 5).collect::<Vec<_>>()
    });
    thread::sleep(after);
    child.kill().unwrap();
    child.wait().unwrap();
    reader.join().unwrap()
}

#[test]
fn killed_at_any_instant_nothing_shown_is_lost() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("alarms.db");
    let mut chance = ChaCha8Rng::seed_from_u64(4);
    let begun = Instant::now();
    let (mut kills, mut shown, mut seen) = (0, 0, 0);
    while kills < KILLS && begun.elapsed() < TIME {
        let lines = shown_until_killed(&path, Duration::from_micros(chance.random_range(0..60_000)));
        kills += 1;
        if !path.exists() {
            continue;
        }
        // The next start opens it for writing first, which brings the log in.
        drop(Journal::open(&path, KEEP).unwrap());
        let journal = ReadOnly::open(&path).unwrap();
        let whole: String =
            Connection::open(&path).unwrap().query_row("PRAGMA quick_check", [], |row| row.get(0)).unwrap();
        assert_eq!(whole, "ok", "after {kills} kills");

        let mut entries = journal.entries(None, None).unwrap();
        let entries: Vec<Entry> = entries.read().unwrap().collect::<Result<_, _>>().unwrap();
        let written: Vec<String> = entries.iter().skip(seen).map(line).collect();
        let cut = lines.len().saturating_sub(1);
        assert!(written.len() >= lines.len(), "{} shown, {} written", lines.len(), written.len());
        assert_eq!(written[..cut], lines[..cut], "shown in the order in which it was written");
        (seen, shown) = (entries.len(), shown + lines.len());

        let mut last: BTreeMap<&str, &str> = BTreeMap::new();
        for entry in &entries {
            let from = entry.from.as_deref().unwrap();
            let alarm = entry.alarm.as_deref().unwrap();
            assert_eq!(from, last.get(alarm).copied().unwrap_or(State::Normal.word()), "each goes on from the last");
            last.insert(alarm, entry.to.as_deref().unwrap());
        }
        let standing = journal.standing().unwrap();
        let standing: BTreeMap<&str, &str> = standing.iter().map(|s| (&*s.alarm, s.standing.state.word())).collect();
        assert_eq!(standing, last);
    }
    println!("{kills} kills, {shown} transitions shown, {seen} written");
    assert!(kills >= FEWEST_KILLS && shown > 10 * FEWEST_KILLS, "{kills} kills, {shown} shown");
}

fn line(entry: &Entry) -> String {
    let word = |word: &Option<std::borrow::Cow<'static, str>>| word.as_deref().unwrap().to_owned();
    let time = (entry.time - at(0)).num_seconds();
    format!("shown\t{time}\t{}\t{}\t{}", entry.alarm.as_deref().unwrap(), word(&entry.event), word(&entry.to))
}
