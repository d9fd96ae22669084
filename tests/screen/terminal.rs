//! The program on a real (pseudo) terminal: it must give it back whatever happens.

use std::{
    fs::{self, File},
    io::{Read, Write},
    os::fd::OwnedFd,
    path::PathBuf,
    process::{Child, Command, ExitStatus},
    sync::mpsc::{Receiver, channel},
    thread,
    time::{Duration, Instant},
};

use rustix::{
    fs::{Mode, OFlags},
    process::{Pid, Signal, kill_process},
    pty::{OpenptFlags, grantpt, openpt, ptsname, unlockpt},
    termios::{LocalModes, Winsize, tcgetattr, tcsetwinsize},
};

const PATIENCE: Duration = Duration::from_secs(30);

/// A program on a terminal of 80×24.
pub struct Stage {
    pub child: Child,
    pub keyboard: File,
    terminal: OwnedFd,
    output: Receiver<Vec<u8>>,
    pub seen: String,
}

impl Stage {
    pub fn new(mut command: Command) -> Self {
        let master = openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY).unwrap();
        grantpt(&master).unwrap();
        unlockpt(&master).unwrap();
        let name = ptsname(&master, Vec::new()).unwrap();
        let terminal = rustix::fs::open(name, OFlags::RDWR | OFlags::NOCTTY, Mode::empty()).unwrap();
        tcsetwinsize(&terminal, Winsize { ws_row: 24, ws_col: 80, ws_xpixel: 0, ws_ypixel: 0 }).unwrap();
        let end = || terminal.try_clone().unwrap();
        let child = command.stdin(end()).stdout(end()).stderr(end()).env("TERM", "xterm-256color").spawn().unwrap();

        let keyboard = File::from(master);
        let mut screen = keyboard.try_clone().unwrap();
        let (sender, output) = channel();
        thread::spawn(move || {
            let mut bytes = [0; 4096];
            while let Ok(count @ 1..) = screen.read(&mut bytes) {
                if sender.send(bytes[..count].to_vec()).is_err() {
                    break;
                }
            }
        });
        Self { child, keyboard, terminal, output, seen: String::new() }
    }

    fn is_raw(&self) -> bool {
        !tcgetattr(&self.terminal).unwrap().local_modes.contains(LocalModes::ICANON)
    }

    /// Waits until the output contains a text.
    pub fn wait_for(&mut self, text: &str) {
        let start = Instant::now();
        while !self.seen.contains(text) {
            assert!(start.elapsed() < PATIENCE, "no “{text}” in {:?}", self.seen);
            if let Ok(bytes) = self.output.recv_timeout(Duration::from_millis(100)) {
                self.seen += &String::from_utf8_lossy(&bytes);
            }
        }
    }

    pub fn wait_for_end(&mut self) -> ExitStatus {
        let start = Instant::now();
        loop {
            if let Some(status) = self.child.try_wait().unwrap() {
                while let Ok(bytes) = self.output.recv_timeout(Duration::from_millis(200)) {
                    self.seen += &String::from_utf8_lossy(&bytes);
                }
                return status;
            }
            assert!(start.elapsed() < PATIENCE, "it does not end");
            thread::sleep(Duration::from_millis(10));
        }
    }

    fn assert_given_back(&self) {
        assert!(!self.is_raw());
        for sequence in ["\u{1b}[?1049l", "\u{1b}[?25h", "\u{1b}[?1000l"] {
            assert!(self.seen.contains(sequence), "{sequence:?} is missing at the end");
        }
    }
}

fn files() -> (PathBuf, PathBuf) {
    let case = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/cases/corridor-03");
    (case.join("config.toml"), case.join("frames.jsonl"))
}

pub fn tautline() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_tautline"));
    command.env_remove("NO_COLOR");
    command
}

fn replay() -> Stage {
    let (config, frames) = files();
    let mut command = tautline();
    command.arg("replay").arg("--config").arg(config).arg(frames);
    let mut stage = Stage::new(command);
    stage.wait_for("headroom");
    assert!(stage.is_raw());
    stage
}

#[test]
fn keys_and_signals_give_the_terminal_back() {
    for key in ["q", "\u{3}"] {
        let mut stage = replay();
        stage.keyboard.write_all(key.as_bytes()).unwrap();
        assert!(stage.wait_for_end().success(), "{key:?}");
        stage.assert_given_back();
    }
    for signal in [Signal::TERM, Signal::INT, Signal::HUP] {
        let mut stage = replay();
        kill_process(Pid::from_child(&stage.child), signal).unwrap();
        assert!(stage.wait_for_end().success(), "{signal:?}");
        stage.assert_given_back();
    }
}

#[test]
fn watching_a_file_shows_it_and_says_when_it_has_ended() {
    let (config, frames) = files();
    // The journal goes beside the configuration.
    let folder = tempfile::tempdir().unwrap();
    let config = {
        let copy = folder.path().join("config.toml");
        fs::copy(config, &copy).unwrap();
        copy
    };
    let mut command = tautline();
    command.arg("watch").arg("--config").arg(config).arg("--input").arg(frames);
    let mut stage = Stage::new(command);
    stage.wait_for("THE FEED HAS ENDED");
    stage.keyboard.write_all(b"q").unwrap();
    assert!(stage.wait_for_end().success());
    stage.assert_given_back();
}

#[test]
fn a_panic_gives_the_terminal_back_before_it_speaks() {
    let mut command = Command::new(std::env::current_exe().unwrap());
    command.args(["--ignored", "--exact", "terminal::panics_on_purpose", "--nocapture"]).env("RUST_BACKTRACE", "0");
    let mut stage = Stage::new(command);
    stage.wait_for("on purpose");
    stage.wait_for_end();
    stage.assert_given_back();
    assert!(stage.seen.find("\u{1b}[?1049l").unwrap() < stage.seen.find("on purpose").unwrap());
}

#[test]
#[ignore = "runs within the test above"]
fn panics_on_purpose() {
    let _screen = tautline::screen::terminal::Screen::take().unwrap();
    panic!("on purpose");
}

#[test]
fn without_a_terminal_a_replay_is_summed_up_and_a_watch_refuses() {
    let (config, frames) = files();
    let output = tautline().arg("replay").arg("--config").arg(&config).arg(&frames).output().unwrap();
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(output.status.success());
    assert!(text.contains("least headroom  +584 MW at 05:00:00: L10 out, by area"), "{text}");

    let output = tautline().arg("watch").arg("--config").arg(&config).arg("--input").arg(&frames).output().unwrap();
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("tautline assess"));

    let empty = std::env::temp_dir().join(format!("tautline-empty-{}.jsonl", std::process::id()));
    fs::write(&empty, "nonsense\n").unwrap();
    let output = tautline().arg("replay").arg("--config").arg(&config).arg(&empty).output().unwrap();
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("not a single frame was read"));
    fs::remove_file(empty).unwrap();
}

#[test]
fn the_demo_day_opens_and_is_summed_up_anywhere() {
    let mut command = tautline();
    command.current_dir(std::env::temp_dir());
    let mut stage = Stage::new(command);
    stage.wait_for("headroom");
    stage.keyboard.write_all(b"q").unwrap();
    assert!(stage.wait_for_end().success());
    stage.assert_given_back();

    let output = tautline().current_dir(std::env::temp_dir()).output().unwrap();
    assert!(output.status.success());
    let text = String::from_utf8(output.stdout).unwrap();
    assert_eq!(text.matches("least headroom").count(), 3, "{text}");
    assert!(text.contains("spent") && text.contains("tautline advises."), "{text}");
}
