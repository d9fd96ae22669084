//! `tautline watch` keeps what it learned over a restart, as a user sees it: on a terminal, with frames over TCP.
#![cfg(unix)]

#[path = "screen/pty.rs"]
mod pty;

use std::{
    fs::{self, File},
    io::{Read, Write},
    net::{TcpListener, TcpStream},
    path::{Path, PathBuf},
    process::Command,
    thread,
    time::Duration,
};

use flate2::read::GzDecoder;
use pty::Stage;
use rustix::process::Signal;
use serde_json::Value;
use tempfile::TempDir;

const CORRIDOR: &str = "Orrin-Tesk";
/// Two and a half hours at one frame in two seconds.
const FRAMES: usize = 4500;

/// A folder with a configuration, and the lines of a recorded day.
struct Desk {
    folder: TempDir,
    frames: Vec<String>,
    listener: TcpListener,
}

impl Desk {
    fn new() -> Self {
        let feed = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/feeds/orrin-tesk");
        let folder = tempfile::tempdir().unwrap();
        fs::copy(feed.join("config.toml"), folder.path().join("grid.toml")).unwrap();
        let mut day = String::new();
        GzDecoder::new(File::open(feed.join("day.jsonl.gz")).unwrap()).read_to_string(&mut day).unwrap();
        let frames = day.lines().take(FRAMES + 10).map(str::to_owned).collect();
        Self { folder, frames, listener: TcpListener::bind("127.0.0.1:0").unwrap() }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn watch(&self, options: &[&str]) -> Stage {
        let mut command = Command::new(env!("CARGO_BIN_EXE_tautline"));
        command.arg("watch").arg("--config").arg(self.path("grid.toml"));
        command.arg("--input").arg(format!("tcp://{}", self.listener.local_addr().unwrap())).args(options);
        Stage::new(command)
    }

    /// Sends the first frames, or with `later` some that come after them, and waits until the last is on the screen.
    fn send(&self, stage: &mut Stage, later: bool) -> TcpStream {
        let frames = if later { &self.frames[FRAMES..] } else { &self.frames[..FRAMES] };
        let (mut stream, _) = self.listener.accept().unwrap();
        for frame in frames {
            stream.write_all(frame.as_bytes()).unwrap();
            stream.write_all(b"\n").unwrap();
        }
        let last: Value = serde_json::from_str(frames.last().unwrap()).unwrap();
        let clock = last["time"].as_str().unwrap()[11..19].to_owned();
        stage.wait_for_redrawn(&clock);
        stream
    }
}

/// Steps that each side was learned from.
fn steps(path: &Path) -> [u64; 2] {
    let state: Value = serde_json::from_slice(&fs::read(path).unwrap()).unwrap();
    [0, 1].map(|side| state["corridors"][CORRIDOR]["steps"][side].as_u64().unwrap())
}

#[test]
fn what_was_learned_is_there_after_a_restart() {
    let desk = Desk::new();
    let kept = desk.path("grid.learned.json");
    let mut stage = desk.watch(&[]);
    let stream = desk.send(&mut stage, false);
    stage.signal(Signal::TERM);
    assert!(stage.wait_for_end().success());
    stage.assert_given_back();
    drop(stream);
    let learned = steps(&kept);
    assert!(learned[1] > 5, "{learned:?}");

    let mut stage = desk.watch(&[]);
    let _stream = desk.send(&mut stage, true);
    stage.press("\t\t\t");
    stage.wait_for_redrawn(&format!("{} steps", learned[1]));
    stage.press("m");
    stage.wait_for("grid.learned.json:");
    stage.press("q");
    assert!(stage.wait_for_end().success());
    let later = steps(&kept);
    assert!((0..2).all(|side| (learned[side]..learned[side] + 3).contains(&later[side])), "{learned:?} {later:?}");
    assert_eq!(fs::read_dir(desk.folder.path()).unwrap().count(), 3, "only the journal is beside them");
}

/// Lines of a recorded day, also of one that was not ended.
fn recorded(path: &Path) -> Vec<String> {
    let (mut reader, mut bytes, mut chunk) =
        (zstd::Decoder::new(File::open(path).unwrap()).unwrap(), Vec::new(), [0; 4096]);
    while let Ok(count @ 1..) = reader.read(&mut chunk) {
        bytes.extend_from_slice(&chunk[..count]);
    }
    let whole = bytes.iter().rposition(|byte| *byte == b'\n').map_or(0, |end| end + 1);
    str::from_utf8(&bytes[..whole]).unwrap().lines().map(str::to_owned).collect()
}

/// Numbers by channel.
fn values(lines: &[String]) -> Vec<Vec<(String, Option<f64>)>> {
    let object = |line: &String| serde_json::from_str::<Value>(line).unwrap()["values"].as_object().unwrap().clone();
    lines.iter().map(|line| object(line).into_iter().map(|(name, value)| (name, value.as_f64())).collect()).collect()
}

#[test]
fn a_killed_watch_has_recorded_every_frame() {
    let desk = Desk::new();
    let config = fs::read_to_string(desk.path("grid.toml")).unwrap();
    fs::write(desk.path("grid.toml"), config + "\n[recording]\nfolder = \"days\"\nflush_s = 0.2\n").unwrap();
    let time: Value = serde_json::from_str(&desk.frames[0]).unwrap();
    let file = desk.path("days").join(format!("{}.jsonl.zst", &time["time"].as_str().unwrap()[..10]));
    let mut stage = desk.watch(&[]);
    let stream = desk.send(&mut stage, false);
    let mut other = desk.watch(&["--record", desk.path("days").to_str().unwrap()]);
    other.wait_for("already does");
    assert_eq!(other.wait_for_end().code(), Some(2));
    // Far more than the flush interval.
    thread::sleep(Duration::from_secs(2));
    stage.child.kill().unwrap();
    stage.wait_for_end();
    drop(stream);
    let lines = recorded(&file);
    assert!(values(&lines) == values(&desk.frames[..FRAMES]), "{} lines", lines.len());

    let mut stage = desk.watch(&[]);
    let _stream = desk.send(&mut stage, true);
    stage.press("m");
    stage.wait_for_redrawn("unfinished");
    stage.press("q");
    assert!(stage.wait_for_end().success());
    let lines = recorded(&file);
    assert!(values(&lines) == values(&desk.frames), "{} lines", lines.len());
    let starts: Vec<_> = lines.iter().map(|line| line.contains("\"start\":{")).collect();
    assert!(starts[0] && starts[FRAMES] && starts.iter().filter(|start| **start).count() == 2);
    let mut assess = Command::new(env!("CARGO_BIN_EXE_tautline"));
    let output = assess.args(["assess", "--config"]).arg(desk.path("grid.toml")).arg(&file).output().unwrap();
    assert!(output.status.success() && output.stderr.is_empty(), "{}", String::from_utf8_lossy(&output.stderr));
    assert_eq!(str::from_utf8(&output.stdout).unwrap().lines().count(), desk.frames.len());
}

#[test]
fn a_damaged_file_is_named_and_set_aside() {
    let desk = Desk::new();
    let kept = desk.path("kept.json");
    fs::write(&kept, "{\"version\":1,\"corridors\":{\"\u{1b}[31m").unwrap();
    let mut stage = desk.watch(&["--state", kept.to_str().unwrap()]);
    stage.wait_for("not a state file");
    let _stream = desk.send(&mut stage, true);
    stage.press("m");
    stage.wait_for("ignored");
    assert!(!stage.seen.contains("\u{1b}[31m"));
    stage.press("q");
    assert!(stage.wait_for_end().success());
    assert_eq!(steps(&kept), [0, 0]);
    assert!(fs::read_to_string(desk.path("kept.json.old")).unwrap().contains("[31m"));
}

#[test]
fn another_configuration_begins_anew_and_says_so() {
    let desk = Desk::new();
    let kept = desk.path("grid.learned.json");
    let mut stage = desk.watch(&[]);
    let stream = desk.send(&mut stage, false);
    stage.press("q");
    assert!(stage.wait_for_end().success());
    drop(stream);
    assert!(steps(&kept)[1] > 5);

    let config = fs::read_to_string(desk.path("grid.toml")).unwrap();
    let other = config.replacen("spread = 0.", "spread = 0.1", 1);
    assert_ne!(config, other);
    fs::write(desk.path("grid.toml"), other).unwrap();
    let mut stage = desk.watch(&[]);
    stage.wait_for("learned with other configured sources");
    let _stream = desk.send(&mut stage, true);
    stage.press("q");
    assert!(stage.wait_for_end().success());
    assert_eq!(steps(&kept), [0, 0]);
    assert!(steps(&desk.path("grid.learned.json.old"))[1] > 5);
}

#[test]
fn where_nothing_can_be_written_it_says_so_and_goes_on() {
    let desk = Desk::new();
    let nowhere = desk.path("missing/kept.json");
    let mut stage = desk.watch(&["--state", nowhere.to_str().unwrap()]);
    stage.wait_for("what is learned cannot be kept");
    let _stream = desk.send(&mut stage, true);
    stage.press("m");
    stage.wait_for("WRITTEN");
    stage.press("q");
    assert!(stage.wait_for_end().success());
    let end = stage.seen.rfind("\u{1b}[?1049l").unwrap();
    assert!(stage.seen[end..].contains("cannot be kept"), "it is said once more at the end");
}

#[test]
fn nothing_is_kept_where_nobody_asks() {
    let desk = Desk::new();
    for options in [&["--no-state"][..], &["--sources", "configured"]] {
        let mut stage = desk.watch(options);
        let _stream = desk.send(&mut stage, true);
        stage.press("q");
        assert!(stage.wait_for_end().success());
    }
    let frames = desk.path("day.jsonl");
    fs::write(&frames, desk.frames.join("\n")).unwrap();
    for command in ["replay", "assess"] {
        let mut run = Command::new(env!("CARGO_BIN_EXE_tautline"));
        let output = run.arg(command).arg("--config").arg(desk.path("grid.toml")).arg(&frames).output().unwrap();
        assert!(output.status.success());
    }
    assert_eq!(fs::read_dir(desk.folder.path()).unwrap().count(), 3);

    let config = desk.path("grid.toml");
    let mut stage = desk.watch(&["--state", config.to_str().unwrap()]);
    stage.wait_for("is the configuration");
    assert_eq!(stage.wait_for_end().code(), Some(2));
}

#[test]
fn the_configuration_names_the_file_from_its_own_folder() {
    let desk = Desk::new();
    let config = fs::read_to_string(desk.path("grid.toml")).unwrap();
    assert!(!config.contains("[learning]"));
    fs::write(desk.path("grid.toml"), config + "\n[learning]\nstate_file = \"kept.json\"\n").unwrap();
    let mut stage = desk.watch(&[]);
    let _stream = desk.send(&mut stage, true);
    stage.signal(Signal::HUP);
    assert!(stage.wait_for_end().success());
    assert_eq!(steps(&desk.path("kept.json")), [0, 0]);
}
