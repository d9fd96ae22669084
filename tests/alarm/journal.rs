//! The journal: what is kept, how it is read, and disks that fail.

use std::{
    fs,
    path::{Path, PathBuf},
};

use assert_cmd::cargo::cargo_bin_cmd;
use chrono::TimeDelta;
use rusqlite::Connection;
use tautline::{
    alarm::{Action, Board, State, Transition},
    journal::{Entry, Journal, JournalError, LONGEST_BACKLOG, ReadOnly},
};
use tempfile::TempDir;

use super::bed::{at, config, headroom, id, text};

const KEEP: TimeDelta = TimeDelta::days(400);

fn place() -> (TempDir, PathBuf) {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("alarms.db");
    (folder, path)
}

fn entries(transitions: &[Transition]) -> Vec<Entry> {
    transitions.iter().map(Entry::transition).collect()
}

fn read(path: &Path) -> Vec<Entry> {
    let journal = ReadOnly::open(path).unwrap();
    let mut entries = journal.entries(None, None).unwrap();
    entries.read().unwrap().collect::<Result<_, _>>().unwrap()
}

/// A board with an alarm in every state but withdrawn, and the transitions that brought it there.
fn busy() -> (Board, Vec<Transition>) {
    let mut board = Board::new(&config("", ""));
    let mut seen: Vec<Transition> = Vec::new();
    for s in 0..=120 {
        let mut assessment = headroom(s, -10.0);
        assessment.fit.suspects = vec!["SV1.to.mw".into()];
        assessment.minutes_to_spent = Some(1.0);
        seen.extend(board.observe(&[assessment]));
    }
    let actions = [
        ("headroom spent", Action::Acknowledge),
        ("suspect meter", Action::Shelve { until: at(3600), reason: "being mended".into() }),
        ("blind", Action::RemoveFromService { reason: "no meters there yet".into() }),
    ];
    for (alarm, action) in actions {
        seen.push(board.act(id(&board, alarm), &action, at(121)).unwrap());
    }
    (board, seen)
}

#[test]
fn what_is_written_is_read_back_in_order() {
    let (_folder, path) = place();
    let (mut board, seen) = busy();
    let note = board.note(id(&board, "headroom thin"), "told the neighbour", at(122)).unwrap();
    let mut written = vec![Entry::start(at(0), "tautline 0.1.0")];
    written.extend(entries(&seen));
    written.push(Entry::note(&note).by("shift 2"));
    written.push(Entry::configuration(at(123), "Skarn-Velm: headroom thin: setpoint 200 to 300"));
    written.push(Entry::stop(at(124), "asked to"));
    let mut journal = Journal::open(&path, KEEP).unwrap();
    assert!(journal.write(written.clone()).is_durable());
    assert_eq!(read(&path), written, "also while it is open");
    drop(journal);
    assert_eq!(read(&path), written);

    let journal = ReadOnly::open(&path).unwrap();
    let mut some = journal.entries(Some(at(121)), Some(at(123))).unwrap();
    let some: Vec<Entry> = some.read().unwrap().collect::<Result<_, _>>().unwrap();
    assert_eq!(some, written.iter().filter(|e| (at(121)..at(123)).contains(&e.time)).cloned().collect::<Vec<_>>());
    let history = journal.history("Skarn-Velm", "headroom thin").unwrap();
    assert_eq!(history.iter().map(|entry| &*entry.kind).collect::<Vec<_>>(), ["transition", "note"]);
}

#[test]
fn a_restart_finds_every_alarm_as_it_was() {
    let (_folder, path) = place();
    let (board, seen) = busy();
    let mut journal = Journal::open(&path, KEEP).unwrap();
    journal.write(entries(&seen));
    drop(journal);
    let mut again = Board::new(&config("", ""));
    let unknown = again.restore(Journal::open(&path, KEEP).unwrap().standing().unwrap());
    assert_eq!(unknown, []);
    for ((_, before), (_, after)) in board.alarms().zip(again.alarms()) {
        assert_eq!(before.standing, after.standing, "{}", before.definition.name);
    }
    // The first frame after the restart brings nothing back that was acknowledged.
    let quiet = again.observe(&[headroom(130, -10.0)]);
    assert_eq!(quiet.iter().filter(|t| t.is_annunciated()).collect::<Vec<_>>(), Vec::<&Transition>::new());

    // An alarm that the configuration no longer has is handed back, to be written down as withdrawn.
    let mut without = Board::new(&config("[[alarm]]\nname = \"headroom spent\"\nenabled = false", ""));
    let unknown = without.restore(Journal::open(&path, KEEP).unwrap().standing().unwrap());
    assert_eq!(unknown.iter().map(|kept| &*kept.alarm).collect::<Vec<_>>(), ["headroom spent"]);
    let mut journal = Journal::open(&path, KEEP).unwrap();
    journal.write([Entry::withdrawn(&unknown[0], at(200))]);
    let kept = journal.standing().unwrap();
    let spent = kept.iter().find(|kept| kept.alarm == "headroom spent").unwrap();
    assert_eq!(spent.standing.state, State::Normal);
}

#[test]
fn a_disk_that_fails_is_written_when_it_can() {
    // The folder is not there: nothing can be opened, as on a disk that is away.
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("away/alarms.db");
    let (_, seen) = busy();
    let written = entries(&seen);
    let mut journal = Journal::open(&path, KEEP).unwrap();
    assert_eq!(journal.standing().unwrap(), []);
    for entry in &written {
        let status = journal.write([entry.clone()]);
        assert!(!status.is_durable() && status.trouble.as_ref().is_some_and(|said| said.contains("alarms.db")));
    }
    assert_eq!(journal.status().waiting, written.len());
    fs::create_dir(folder.path().join("away")).unwrap();
    assert!(journal.flush().is_durable());
    assert_eq!(journal.status().trouble, None);
    assert_eq!(read(&path), written);
}

#[test]
fn a_full_disk_holds_what_it_can_and_counts_the_rest() {
    let (_folder, path) = place();
    drop(Journal::open(&path, KEEP).unwrap());
    let mut journal = Journal::open(&path, KEEP).unwrap();
    // SQLite's own name for a disk without room: a limit of pages, which lasts as long as the trigger that stands in.
    let other = Connection::open(&path).unwrap();
    let full = "CREATE TRIGGER full BEFORE INSERT ON entry BEGIN SELECT RAISE(ABORT, 'disk is full'); END";
    other.execute_batch(full).unwrap();
    let entry = |n: usize| Entry::configuration(at(0) + TimeDelta::milliseconds(i64::try_from(n).unwrap()), "busy");
    let count = LONGEST_BACKLOG + 7;
    journal.write((0..count).map(entry));
    let status = journal.flush().clone();
    assert_eq!((status.waiting, status.lost), (LONGEST_BACKLOG, 7));
    assert!(status.trouble.is_some_and(|said| said.contains("disk is full")));
    assert_eq!(read(&path), [], "all together or nothing");
    other.execute_batch("DROP TRIGGER full").unwrap();
    assert!(journal.flush().is_durable());
    let found = read(&path);
    assert_eq!(found.len(), LONGEST_BACKLOG + 1);
    assert_eq!(found.iter().find(|e| e.kind == "lost").unwrap().text.as_deref().unwrap()[..9], *"7 entries");
}

#[test]
fn a_file_that_is_something_else_is_left_alone() {
    let (folder, path) = place();
    fs::write(&path, "[grid]\nfrequency_hz = 50\n# not a database at all, by no means, and long enough").unwrap();
    assert!(matches!(Journal::open(&path, KEEP), Err(JournalError::NotAJournal(_))));
    assert!(matches!(ReadOnly::open(&path), Err(JournalError::NotAJournal(_))));
    assert!(fs::read_to_string(&path).unwrap().starts_with("[grid]"));
    let other = folder.path().join("other.db");
    Connection::open(&other).unwrap().execute_batch("CREATE TABLE shopping (item TEXT)").unwrap();
    assert!(matches!(Journal::open(&other, KEEP), Err(JournalError::NotAJournal(_))));
    let later = folder.path().join("later.db");
    drop(Journal::open(&later, KEEP).unwrap());
    Connection::open(&later).unwrap().pragma_update(None, "user_version", 9).unwrap();
    assert!(matches!(Journal::open(&later, KEEP), Err(JournalError::TooNew { version: 9, .. })));
    assert!(matches!(ReadOnly::open(&folder.path().join("none.db")), Err(JournalError::NotThere(_))));
}

#[test]
fn entries_are_kept_for_their_time() {
    let (_folder, path) = place();
    let mut journal = Journal::open(&path, KEEP).unwrap();
    journal.write((0..2500).map(|n| Entry::configuration(at(n), "old")));
    drop(journal);
    let old = "UPDATE entry SET written = '2020-01-01T00:00:00.000000Z' WHERE id <= 2400";
    Connection::open(&path).unwrap().execute_batch(old).unwrap();
    drop(Journal::open(&path, KEEP).unwrap());
    assert_eq!(read(&path).len(), 100);
}

#[test]
fn the_command_prints_and_exports_a_span() {
    let (folder, path) = place();
    let config_path = folder.path().join("grid.toml");
    fs::write(&config_path, text("[journal]\nfile = \"alarms.db\"", "")).unwrap();
    let run = |arguments: &[&str]| {
        let mut command = cargo_bin_cmd!("tautline");
        command.args(["journal", "--config"]).arg(&config_path).args(arguments).assert()
    };
    let failure = run(&[]).code(2);
    assert!(String::from_utf8_lossy(&failure.get_output().stderr).contains("there is no journal yet"));

    let (_, seen) = busy();
    let mut written = entries(&seen);
    written.push(Entry { about: Some("a\u{1b}[31m, \"b\"".into()), ..entries(&seen[..1])[0].clone() });
    Journal::open(&path, KEEP).unwrap().write(written.clone());
    let out = |arguments: &[&str]| String::from_utf8(run(arguments).success().get_output().stdout.clone()).unwrap();

    let lines = out(&[]);
    assert_eq!(lines.lines().count(), written.len());
    assert!(!lines.contains('\u{1b}'));
    let first = "2031-03-14 05:00:05  Skarn-Velm  headroom spent (urgent)  alarm: normal to unacknowledged  at -10.0";
    assert!(lines.lines().any(|line| line == first), "{lines}");
    assert!(lines.contains("shelve: unacknowledged to shelved  until 2031-03-14 06:00:00  being mended"), "{lines}");

    let objects = out(&["--format", "json"]);
    let objects: Vec<serde_json::Value> = objects.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(objects.len(), written.len());
    assert_eq!(objects[0]["event"], "alarm");
    assert_eq!(objects[0]["time"], "2031-03-14T05:00:05Z");

    let table = out(&["--format", "csv"]);
    let mut rows = csv::Reader::from_reader(table.as_bytes());
    assert_eq!(rows.headers().unwrap().iter().take(4).collect::<Vec<_>>(), ["time", "kind", "corridor", "alarm"]);
    assert_eq!(rows.records().collect::<Result<Vec<_>, _>>().unwrap().len(), written.len());

    assert_eq!(out(&["--from", "2031-03-14T05:02"]).lines().count(), 3);
    assert_eq!(out(&["--from", "2031-03-15"]), "");
    assert_eq!(out(&["--to", "2031-03-14T05:00:06Z"]).lines().count(), 2);
    run(&["--from", "yesterday"]).code(2);
}
