//! `tautline drill` as a user runs it.

use std::{
    fs,
    io::{BufRead, BufReader, Read},
    net::{TcpListener, TcpStream},
    path::Path,
    process::{Command, Stdio},
    thread,
    time::{Duration, Instant},
};

use assert_cmd::cargo::cargo_bin;
use tempfile::TempDir;

use super::CONFIG;

const SCENARIO: &str = "start = 2031-03-14T00:00:00Z\nhours = 0.1\ninterval_s = 1\n\
    [metering]\nnoise = { kv = 0.3, mw = 1, mvar = 1 }\n\
    [[corridor]]\nname = \"Hask-Prell\"\ntransfer_mw = 700\nfrom = { steps = { per_hour = 60, kv = [1, 3] } }\n\
    [[corridor]]\nname = \"Olt-Ume\"\ntransfer_mw = 200\n[[event]]\nat = 00:01:00\ntrip = \"OM1\"\n";

struct Folder(TempDir);

impl Folder {
    fn with(scenario: &str) -> Self {
        let folder = TempDir::new().unwrap();
        fs::write(folder.path().join("config.toml"), CONFIG).unwrap();
        fs::write(folder.path().join("day.toml"), scenario).unwrap();
        Self(folder)
    }

    fn path(&self, name: &str) -> String {
        self.0.path().join(name).display().to_string()
    }

    fn drill(&self, more: &[&str]) -> Command {
        let mut command = Command::new(cargo_bin("tautline"));
        command.args(["drill", "--config", &self.path("config.toml"), "--scenario", &self.path("day.toml")]).args(more);
        command
    }

    fn frames(&self, more: &[&str]) -> Vec<u8> {
        let output = self.drill(more).output().unwrap();
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        output.stdout
    }
}

#[test]
fn the_same_seed_gives_the_same_bytes_and_another_gives_others() {
    let folder = Folder::with(SCENARIO);
    let first = folder.frames(&[]);
    assert_eq!(first.lines().count(), 360);
    assert_eq!(folder.frames(&[]), first);
    assert_ne!(folder.frames(&["--seed", "2"]), first);
    let line: serde_json::Value = serde_json::from_slice(first.split(|byte| *byte == b'\n').next().unwrap()).unwrap();
    assert_eq!(line["time"], "2031-03-14T00:00:00Z");
    assert_eq!(line["values"]["OM1.closed"], 1);
    assert!((line["values"]["Hask.kv"].as_f64().unwrap() - 420.0).abs() < 20.0);
}

#[test]
fn compressed_files_hold_the_same_lines() {
    let folder = Folder::with(SCENARIO);
    let plain = folder.frames(&[]);
    for (name, unpack) in
        [("day.jsonl", read as fn(&Path) -> Vec<u8>), ("day.jsonl.gz", gunzip), ("day.jsonl.zst", unzstd)]
    {
        let path = folder.path(name);
        folder.frames(&["--output", &path]);
        assert!(unpack(Path::new(&path)) == plain, "{name}");
    }
}

fn read(path: &Path) -> Vec<u8> {
    fs::read(path).unwrap()
}

fn gunzip(path: &Path) -> Vec<u8> {
    let mut bytes = Vec::new();
    flate2::read::GzDecoder::new(&*read(path)).read_to_end(&mut bytes).unwrap();
    bytes
}

fn unzstd(path: &Path) -> Vec<u8> {
    zstd::decode_all(&*read(path)).unwrap()
}

#[test]
fn the_truth_is_written_beside_the_frames() {
    let folder = Folder::with(SCENARIO);
    folder.frames(&["--truth", &folder.path("truth.jsonl")]);
    let truth = fs::read_to_string(folder.path("truth.jsonl")).unwrap();
    let facts: Vec<serde_json::Value> = truth.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    let of = |what: &str| facts.iter().filter(|fact| fact["what"] == what).collect::<Vec<_>>();
    assert_eq!(of("state").len(), 12);
    assert_eq!(of("state")[0]["sources"][0]["x_ohm"], 20.0);
    assert!(!of("step").is_empty());
    assert_eq!(of("switched")[0]["name"], "OM1");
    assert_eq!(of("switched")[0]["time"], "2031-03-14T00:01:00Z");
}

#[test]
fn a_listening_reader_gets_every_line() {
    let folder = Folder::with(SCENARIO);
    let listener = TcpListener::bind("127.0.0.1:0").unwrap();
    let target = format!("tcp://{}", listener.local_addr().unwrap());
    let reader = thread::spawn(move || {
        let mut bytes = Vec::new();
        listener.accept().unwrap().0.read_to_end(&mut bytes).unwrap();
        bytes
    });
    folder.frames(&["--output", &target]);
    assert!(reader.join().unwrap() == folder.frames(&[]));
}

#[test]
fn readers_may_come_by_themselves_and_leave() {
    let folder = Folder::with(SCENARIO);
    let mut drill = folder.drill(&["--output", "tcp-listen://:0"]).stderr(Stdio::piped()).spawn().unwrap();
    let mut said = String::new();
    BufReader::new(drill.stderr.take().unwrap()).read_line(&mut said).unwrap();
    let address = said.trim().rsplit(' ').next().unwrap().to_owned();
    assert!(address.starts_with("127.0.0.1:"), "{said}");
    let mut bytes = Vec::new();
    TcpStream::connect(address).unwrap().read_to_end(&mut bytes).unwrap();
    assert!(drill.wait().unwrap().success());
    assert!(bytes == folder.frames(&[]));
}

#[test]
fn real_time_keeps_the_pace_and_says_what_time_it_is() {
    let quick = SCENARIO.replace("hours = 0.1\ninterval_s = 1", "hours = 0.0002\ninterval_s = 0.1");
    let folder = Folder::with(&quick.replace("00:01:00", "00:00:00.3"));
    let began = Instant::now();
    let frames = folder.frames(&["--real-time"]);
    let lines: Vec<serde_json::Value> = frames
        .split(|b| *b == b'\n')
        .filter(|line| !line.is_empty())
        .map(|line| serde_json::from_slice(line).unwrap())
        .collect();
    // Eight frames have seven intervals.
    assert_eq!(lines.len(), 8);
    assert!(began.elapsed() >= Duration::from_millis(700));
    let first: chrono::DateTime<chrono::Utc> = lines[0]["time"].as_str().unwrap().parse().unwrap();
    assert!((chrono::Utc::now() - first).num_seconds() < 60);
}

#[cfg(unix)]
#[test]
fn an_interrupt_ends_the_file_well() {
    let folder = Folder::with(&SCENARIO.replace("interval_s = 1", "interval_s = 0.05"));
    let path = folder.path("live.jsonl.zst");
    let mut drill = folder.drill(&["--real-time", "--output", &path]).spawn().unwrap();
    thread::sleep(Duration::from_millis(1500));
    assert!(Command::new("kill").args(["-INT", &drill.id().to_string()]).status().unwrap().success());
    assert!(drill.wait().unwrap().success());
    assert!(unzstd(Path::new(&path)).ends_with(b"}}\n"));
}

#[test]
fn mistakes_end_with_status_two_and_their_place() {
    let fails = |scenario: &str, arguments: &[&str], message: &str| {
        let output = Folder::with(scenario).drill(arguments).output().unwrap();
        assert_eq!(output.status.code(), Some(2));
        let said = String::from_utf8(output.stderr).unwrap();
        assert!(said.contains(message), "{said}");
    };
    fails(&SCENARIO.replace("OM1", "OM9"), &[], "day.toml:15: event[0].trip: \"OM9\" is no circuit");
    fails(SCENARIO, &["--output", "/nowhere/at/all.jsonl"], "cannot write to /nowhere/at/all.jsonl");
    fails(SCENARIO, &["--output", "tcp://127.0.0.1:1"], "cannot connect to 127.0.0.1:1");
    fails(SCENARIO, &["--output", "tcp-listen://nonsense"], "cannot listen on nonsense");
}

#[test]
fn what_is_made_up_plays() {
    let folder = TempDir::new().unwrap();
    let tautline = || Command::new(cargo_bin("tautline"));
    let made = tautline().args(["drill", "--corridors", "3", "--invent"]).arg(folder.path()).output().unwrap();
    assert!(made.status.success());
    let path = |name: &str| folder.path().join(name);
    let played = tautline()
        .args(["drill", "--config"])
        .arg(path("config.toml"))
        .arg("--scenario")
        .arg(path("scenario.toml"))
        .arg("--output")
        .arg(path("day.jsonl.zst"))
        .output()
        .unwrap();
    assert!(played.status.success(), "{}", String::from_utf8_lossy(&played.stderr));
    assert_eq!(unzstd(&path("day.jsonl.zst")).lines().count(), 86_400);
}
