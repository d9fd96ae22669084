//! `tautline assess`, run as a user runs it.

use std::{
    fs,
    io::{BufRead, BufReader, Read, Write},
    net::TcpListener,
    path::PathBuf,
    process::{Child, Command, Stdio},
    sync::LazyLock,
    thread,
    time::Duration,
};

use assert_cmd::{assert::Assert, cargo::cargo_bin};
use chrono::{DateTime, TimeDelta};
use flate2::{Compression, write::GzEncoder};
use serde_json::{Value, json};
use tempfile::TempDir;

const CASES: [&str; 2] = ["two-area", "corridor-01"];
/// More than one batch, so that the order of batches shows too.
const FRAMES: i64 = 150;

fn case(name: &str, file: &str) -> String {
    fs::read_to_string(format!("tests/cases/{name}/{file}")).unwrap()
}

/// Two corridors, and moving frames for both.
struct Bed {
    folder: TempDir,
    frames: String,
}

impl Bed {
    fn new() -> Self {
        let folder = TempDir::new().unwrap();
        let corridors = CASES.map(|name| case(name, "config.toml").split_once("[[corridor]]").unwrap().1.to_owned());
        let config = corridors.map(|corridor| format!("[[corridor]]{corridor}\n")).concat();
        fs::write(folder.path().join("config.toml"), format!("[grid]\nfrequency_hz = 60\n{config}")).unwrap();
        let frames = (0..FRAMES).map(|second| frame(second, &CASES)).collect();
        let bed = Self { folder, frames };
        bed.write("day.jsonl", &bed.frames);
        bed
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn write(&self, name: &str, bytes: impl AsRef<[u8]>) -> PathBuf {
        fs::write(self.path(name), bytes).unwrap();
        self.path(name)
    }

    fn command(&self) -> Command {
        let mut command = Command::new(cargo_bin("tautline"));
        command.current_dir(self.folder.path()).args(["assess", "--config", "config.toml"]);
        command
    }

    fn run(&self, arguments: &[&str]) -> Assert {
        let mut command = assert_cmd::Command::from_std(self.command());
        command.args(arguments).timeout(Duration::from_secs(120)).assert()
    }

    /// Standard output of a run without anything to complain of.
    fn records(&self, arguments: &[&str]) -> String {
        stdout(&self.run(arguments).success().stderr(""))
    }
}

/// Starts from nothing, so that it is made only once.
static BED: LazyLock<Bed> = LazyLock::new(Bed::new);
static RECORDS: LazyLock<String> = LazyLock::new(|| BED.records(&["day.jsonl"]));

/// Time and values of some cases in one, moved a little in time and in voltage.
fn moved(second: i64, cases: &[&str]) -> (String, serde_json::Map<String, Value>) {
    let mut values = serde_json::Map::new();
    let mut time = String::new();
    for name in cases {
        let frame: Value = serde_json::from_str(&case(name, "frames.jsonl")).unwrap();
        let start = DateTime::parse_from_rfc3339(frame["time"].as_str().unwrap()).unwrap();
        time = (start + TimeDelta::seconds(second)).to_rfc3339();
        for (channel, value) in frame["values"].as_object().unwrap() {
            let moved = if channel.split('.').next_back() == Some("kv") { 1.0 + 1e-5 * second as f64 } else { 1.0 };
            values.insert(channel.clone(), (value.as_f64().unwrap() * moved).into());
        }
    }
    (time, values)
}

fn frame(second: i64, cases: &[&str]) -> String {
    let (time, values) = moved(second, cases);
    format!("{}\n", json!({ "time": time, "values": values }))
}

fn stdout(assert: &Assert) -> String {
    String::from_utf8(assert.get_output().stdout.clone()).unwrap()
}

fn stderr(assert: &Assert) -> String {
    String::from_utf8(assert.get_output().stderr.clone()).unwrap()
}

fn spawn(command: &mut Command) -> Child {
    command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap()
}

#[test]
fn there_is_a_record_for_each_frame_and_corridor_in_order() {
    let records: Vec<Value> = RECORDS.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    assert_eq!(records.len(), 2 * usize::try_from(FRAMES).unwrap());
    let start = DateTime::parse_from_rfc3339("2031-03-14T05:00:00Z").unwrap();
    let expected = (0..FRAMES).flat_map(|second| ["Area 1-Area 2", "Arn-Bex"].map(|corridor| (second, corridor)));
    for (record, (second, corridor)) in records.iter().zip(expected) {
        let time = DateTime::parse_from_rfc3339(record["time"].as_str().unwrap()).unwrap();
        assert_eq!((time - start, record["corridor"].as_str()), (TimeDelta::seconds(second), Some(corridor)));
        assert!(record["headroom_mw"].is_number(), "{record}");
    }
}

#[test]
fn any_number_of_threads_writes_the_same_bytes() {
    for threads in ["1", "2", "7"] {
        assert!(BED.records(&["day.jsonl", "--threads", threads]) == *RECORDS, "{threads} threads");
    }
}

#[test]
fn any_way_in_gives_the_same_bytes() {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::fast());
    encoder.write_all(BED.frames.as_bytes()).unwrap();
    BED.write("same.jsonl.gz", encoder.finish().unwrap());
    BED.write("same.jsonl.zst", zstd::encode_all(BED.frames.as_bytes(), 1).unwrap());
    for arguments in
        [&["same.jsonl.gz"][..], &["--input", "same.jsonl.zst"], &["--once", "--input", "follow:day.jsonl"]]
    {
        assert!(BED.records(arguments) == *RECORDS, "{arguments:?}");
    }
    let mut piped = assert_cmd::Command::from_std(BED.command());
    let piped = piped.arg("-").write_stdin(BED.frames.as_str()).timeout(Duration::from_secs(120)).assert();
    assert!(stdout(&piped.success().stderr("")) == *RECORDS, "through a pipe");
}

#[test]
fn tcp_gives_the_same_bytes() {
    let listener = TcpListener::bind("127.0.0.1:0").unwrap();
    let address = listener.local_addr().unwrap();
    let server = thread::spawn(move || {
        let (mut client, _) = listener.accept().unwrap();
        // In pieces that end anywhere.
        for piece in BED.frames.as_bytes().chunks(1234) {
            client.write_all(piece).unwrap();
        }
    });
    assert!(BED.records(&["--once", "--input", &format!("tcp://{address}")]) == *RECORDS);
    server.join().unwrap();
}

#[test]
fn csv_gives_the_same_bytes() {
    let mut rows = Vec::new();
    for second in 0..FRAMES {
        let (time, values) = moved(second, &CASES);
        if rows.is_empty() {
            let names: Vec<&str> = values.keys().map(String::as_str).collect();
            writeln!(rows, "time,{}", names.join(",")).unwrap();
        }
        let values: Vec<String> = values.values().map(Value::to_string).collect();
        writeln!(rows, "{time},{}", values.join(",")).unwrap();
    }
    BED.write("same.csv", rows);
    assert!(BED.records(&["same.csv"]) == *RECORDS);
}

#[test]
fn inputs_are_merged_by_time() {
    let [first, second] = CASES.map(|name| {
        let lines: String = (0..FRAMES).map(|second| frame(second, &[name])).collect();
        let path = BED.write(&format!("{name}.jsonl"), lines);
        path.to_str().unwrap().to_owned()
    });
    assert!(BED.records(&["--input", &first, &second]) == *RECORDS);
}

#[test]
fn last_writes_only_the_last() {
    let lines: Vec<&str> = RECORDS.lines().collect();
    assert_eq!(BED.records(&["day.jsonl", "--last"]).lines().collect::<Vec<_>>(), lines[lines.len() - 2..]);
}

#[test]
fn the_configuration_may_name_the_inputs() {
    let config = fs::read_to_string(BED.path("config.toml")).unwrap();
    BED.write("inputs.toml", format!("{config}\n[feed]\ninputs = [\"day.jsonl\"]\n"));
    let mut command = assert_cmd::Command::new(cargo_bin("tautline"));
    let run = command.current_dir(BED.folder.path()).args(["assess", "--config", "inputs.toml"]).assert();
    assert!(stdout(&run.success().stderr("")) == *RECORDS);
}

#[test]
fn what_cannot_be_used_is_said_once_at_the_end() {
    let (first, rest) = BED.frames.split_once('\n').unwrap();
    let late = first;
    let unknown = r#"{"time":"2031-03-14T05:00:00Z","values":{"\u001b[31m.kv":1,"7.kv":0}}"#;
    BED.write("broken.jsonl", format!("{first}\nnonsense\n{rest}{late}\n{}", &late[..100]));
    BED.write("absurd.jsonl", format!("{unknown}\n{}", BED.frames));
    let broken = BED.run(&["broken.jsonl"]).success();
    assert!(stdout(&broken) == *RECORDS, "the frames themselves are used");
    let findings = stderr(&BED.run(&["broken.jsonl"]).success());
    let findings: Vec<&str> = findings.lines().collect();
    assert_eq!(findings.len(), 2, "{findings:?}");
    assert!(
        findings[0].starts_with("tautline: broken.jsonl: 2 malformed lines skipped, such as line 2: "),
        "{findings:?}"
    );
    assert_eq!(findings[1], "tautline: broken.jsonl: 1 frames dropped, older than one before them");
    let findings = stderr(&BED.run(&["absurd.jsonl"]).success());
    assert_eq!(
        findings,
        "tautline: absurd.jsonl: 1 values of unknown channels ignored, such as \u{fffd}[31m.kv\n\
         tautline: absurd.jsonl: 1 values invalid, such as 7.kv\n"
    );
}

#[test]
fn a_truncated_archive_is_used_and_reported() {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::fast());
    encoder.write_all(BED.frames.as_bytes()).unwrap();
    let packed = encoder.finish().unwrap();
    BED.write("cut.jsonl.gz", &packed[..packed.len() * 3 / 4]);
    let records = stdout(&BED.run(&["cut.jsonl.gz"]).success());
    assert!(records.len() > RECORDS.len() / 2 && RECORDS.starts_with(&records));
    assert!(stderr(&BED.run(&["cut.jsonl.gz"])).contains("cut.jsonl.gz: cannot be read to its end: "));
}

#[test]
fn it_fails_when_there_is_nothing_to_assess() {
    BED.write("empty.jsonl", "");
    BED.write("rubbish.jsonl", "rubbish\n");
    BED.write("wrong.toml", "[grid]\nfrequency_hz = 50\nfrequenzy = 3\n");
    let failures: [(&[&str], &[&str]); 8] = [
        (&["empty.jsonl"], &["not a single frame was read from empty.jsonl"]),
        (&["rubbish.jsonl"], &["not a single frame", "1 malformed lines", "line 1: not a JSON object"]),
        (&["empty.jsonl", "--last"], &["not a single frame"]),
        (&["missing.jsonl"], &["cannot open missing.jsonl: "]),
        (&[], &["no input", "--input", "[feed]"]),
        (&["-", "-"], &["standard input can be read only once"]),
        (&["--input", "http://feed"], &["tcp://HOST:PORT", "follow:PATH"]),
        (&["day.jsonl", "--threads", "0"], &["--threads"]),
    ];
    for (arguments, said) in failures {
        let failure = BED.run(arguments).code(2).stdout("");
        let message = stderr(&failure);
        assert!(said.iter().all(|part| message.contains(part)), "{arguments:?}: {message}");
    }
    let mut wrong = assert_cmd::Command::new(cargo_bin("tautline"));
    let wrong = wrong.args(["assess", "--config"]).arg(BED.path("wrong.toml")).arg("day.jsonl").assert().code(2);
    assert!(stderr(&wrong).contains("wrong.toml:3: grid.frequenzy"));
}

#[test]
fn records_come_as_frames_do_and_an_interrupt_ends_cleanly() {
    let mut child = spawn(BED.command().arg("-"));
    let mut stdin = child.stdin.take().unwrap();
    let mut records = BufReader::new(child.stdout.take().unwrap());
    let mut expected = RECORDS.lines();
    for frame in BED.frames.lines().take(3) {
        writeln!(stdin, "{frame}").unwrap();
        for _ in CASES {
            let mut record = String::new();
            records.read_line(&mut record).unwrap();
            assert_eq!(record.trim_end(), expected.next().unwrap(), "while the input is still open");
        }
    }
    let interrupt = format!("kill -INT {}", child.id());
    assert!(Command::new("sh").args(["-c", &interrupt]).status().unwrap().success());
    let mut rest = String::new();
    records.read_to_string(&mut rest).unwrap();
    let output = child.wait_with_output().unwrap();
    assert!(output.status.success() && rest.is_empty() && output.stderr.is_empty(), "{output:?}");
}

#[test]
fn a_reader_that_leaves_ends_it_quietly() {
    let mut child = spawn(BED.command().arg("day.jsonl"));
    let mut first = String::new();
    BufReader::new(child.stdout.take().unwrap()).read_line(&mut first).unwrap();
    assert_eq!(first.trim_end(), RECORDS.lines().next().unwrap());
    let output = child.wait_with_output().unwrap();
    assert!(output.status.success() && output.stderr.is_empty(), "{output:?}");
}
