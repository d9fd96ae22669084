//! The program on a real (pseudo) terminal: it must give it back whatever happens.

use std::{fs, io::Write, path::PathBuf, process::Command};

use rustix::process::Signal;

use crate::pty::Stage;

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
        stage.signal(signal);
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
    command.arg("watch").arg("--no-state").arg("--config").arg(config).arg("--input").arg(frames);
    let mut stage = Stage::new(command);
    stage.wait_for("THE FEED HAS ENDED");
    stage.keyboard.write_all(b"q").unwrap();
    assert!(stage.wait_for_end().success());
    stage.assert_given_back();
}

#[test]
fn it_can_be_suspended_and_brought_back() {
    for suspend in ["\u{1a}", "signal"] {
        let mut stage = replay();
        stage.seen.clear();
        if suspend == "signal" {
            stage.signal(Signal::TSTP);
        } else {
            stage.keyboard.write_all(suspend.as_bytes()).unwrap();
        }
        stage.wait_for_stop();
        assert!(!stage.is_raw());
        stage.seen.clear();
        stage.signal(Signal::CONT);
        stage.wait_for("headroom");
        assert!(stage.is_raw());
        stage.keyboard.write_all(b"q").unwrap();
        assert!(stage.wait_for_end().success());
        stage.assert_given_back();
    }
}

#[test]
fn marks_and_exports_are_where_the_screen_says() {
    let (config, frames) = files();
    let folder = tempfile::tempdir().unwrap();
    let day = folder.path().join("day.jsonl");
    fs::copy(frames, &day).unwrap();
    let mut command = tautline();
    command.arg("replay").arg("--paused").arg("--config").arg(&config).arg(&day).current_dir(folder.path());
    let mut stage = Stage::new(command);
    stage.wait_for("headroom");
    stage.press("nodd\r");
    stage.wait_for_redrawn("day.marks.json");
    for key in ["pj", "pj", "pt", "ps"] {
        stage.press(key);
        stage.wait_for_redrawn("Written:");
    }
    stage.keyboard.write_all(b"q").unwrap();
    assert!(stage.wait_for_end().success());

    let records = tautline().arg("assess").arg("--config").arg(&config).arg(&day).output().unwrap().stdout;
    let mut names: Vec<_> = fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    names.sort_unstable();
    let names: Vec<_> = names.iter().map(|name| name.to_str().unwrap()).collect();
    let [record, again, ..] = names[..] else { panic!("{names:?}") };
    assert!(record.ends_with("Z-2.json") && again.ends_with("Z.json"), "{names:?}");
    assert_eq!(fs::read(folder.path().join(record)).unwrap(), records);
    assert!(names.contains(&"day.marks.json"), "{names:?}");
    let of = |ending: &str| {
        let name = names.iter().find(|name| name.ends_with(ending)).unwrap_or_else(|| panic!("{names:?}"));
        fs::read_to_string(folder.path().join(name)).unwrap()
    };
    assert!(of(".marks.json").contains("\"note\": \"odd\""));
    assert!(of(".txt").starts_with("tautline") && of(".svg").starts_with("<svg "));
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
fn without_a_terminal_a_replay_is_reviewed_and_a_watch_refuses() {
    let (config, frames) = files();
    let output = tautline().arg("replay").arg("--config").arg(&config).arg(&frames).output().unwrap();
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(output.status.success());
    assert!(text.contains("least headroom  584"), "{text}");

    let output = tautline().arg("watch").arg("--config").arg(&config).arg("--input").arg(&frames).output().unwrap();
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("tautline assess"));

    let empty = std::env::temp_dir().join(format!("tautline-empty-{}.jsonl", std::process::id()));
    fs::write(&empty, "nonsense\n").unwrap();
    let output = tautline().arg("replay").arg("--config").arg(&config).arg(&empty).output().unwrap();
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("not a single frame"));
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
