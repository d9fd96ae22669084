//! Watching with a journal, on a real (pseudo) terminal: what was shown as done is there after a kill.

use std::{
    fs::{self, File},
    io::Write,
    path::Path,
};

use crate::{pty::Stage, terminal::tautline};

const CONFIG: &str = r#"
[grid]
frequency_hz = 50

[[corridor]]
name = "Skarn-Velm"
thin_mw = 100
from = { bus = "Skarn", nominal_kv = 400, source = { r_ohm = 1.5, x_ohm = 22.0, spread = 0.3 } }
to = { bus = "Velm", nominal_kv = 400, source = { r_ohm = 1.0, x_ohm = 14.0, spread = 0.3 } }
circuit = [
    { name = "A", r_ohm = 7.0, x_ohm = 75.0, b_us = 880 },
    { name = "B", r_ohm = 7.0, x_ohm = 75.0, b_us = 880 },
]

[[alarm]]
name = "busy"
on = "headroom_mw"
priority = "urgent"
setpoint = 100000
on_delay_s = 0
message = "Everything is too much"
"#;

fn frame(second: u32) -> String {
    let values =
        r#"{"Skarn.kv":404.0,"Velm.kv":400.5,"A.from.mw":300,"A.from.mvar":10,"B.from.mw":300,"B.from.mvar":10}"#;
    format!("{{\"time\":\"2031-03-14T05:00:{second:02}Z\",\"values\":{values}}}\n")
}

fn watch(folder: &Path) -> (Stage, File) {
    let feed = folder.join("feed.jsonl");
    let file = File::options().create(true).append(true).open(&feed).unwrap();
    let mut command = tautline();
    command.arg("watch").arg("--config").arg(folder.join("day.toml"));
    command.arg("--input").arg(format!("follow:{}", feed.display())).env("USER", "nilsen");
    (Stage::new(command), file)
}

fn journal(folder: &Path) -> String {
    let output = tautline().arg("journal").arg("--config").arg(folder.join("day.toml")).output().unwrap();
    String::from_utf8(output.stdout).unwrap()
}

fn press(stage: &mut Stage, keys: &str) {
    stage.seen.clear();
    stage.keyboard.write_all(keys.as_bytes()).unwrap();
}

#[test]
fn an_acknowledgement_outlives_a_kill() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("day.toml"), CONFIG).unwrap();
    let (mut stage, mut feed) = watch(folder.path());
    feed.write_all(frame(0).as_bytes()).unwrap();
    stage.wait_for("URGENT");
    press(&mut stage, "a");
    stage.wait_for("UNACKNOWLEDGED");
    press(&mut stage, "y");
    stage.wait_for("no unacknowledged alarms");
    stage.child.kill().unwrap();
    stage.wait_for_end();

    let (mut stage, mut feed) = watch(folder.path());
    feed.write_all(frame(1).as_bytes()).unwrap();
    stage.wait_for("no unacknowledged alarms");
    press(&mut stage, "a");
    stage.wait_for("acknowledged");
    press(&mut stage, "\t");
    stage.wait_for("from the journal");
    stage.wait_for("nilsen");
    press(&mut stage, "q");
    assert!(stage.wait_for_end().success());
    let told = journal(folder.path());
    for (words, times) in [("Everything", 0), ("by nilsen", 1), ("start", 2), ("stop", 1), ("busy", 2)] {
        assert_eq!(told.lines().filter(|line| line.contains(words)).count(), times, "{words} in\n{told}");
    }
}

#[test]
fn a_changed_configuration_is_applied_and_a_broken_one_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("day.toml");
    fs::write(&path, CONFIG).unwrap();
    let (mut stage, mut feed) = watch(folder.path());
    feed.write_all(frame(0).as_bytes()).unwrap();
    stage.wait_for("URGENT");
    stage.press("a");
    stage.press("y");
    stage.wait_for_redrawn("no unacknowledged alarms");

    fs::write(&path, CONFIG.replace("on_delay_s = 0", "on_delay_s = zero")).unwrap();
    stage.wait_for_redrawn("is refused, what was in force stays");
    stage.press("c");
    stage.wait_for_redrawn("on_delay_s");

    fs::write(&path, CONFIG.replace("setpoint = 100000", "setpoint = 90000").replace("thin_mw = 100", "thin_mw = 90"))
        .unwrap();
    stage.wait_for_redrawn("100000 MW → 90000 MW");
    stage.press("\r");
    feed.write_all(frame(1).as_bytes()).unwrap();
    stage.press("a");
    stage.wait_for_redrawn("≤ 90000");
    stage.wait_for_redrawn("no unacknowledged alarms");
    stage.press("q");
    assert!(stage.wait_for_end().success());
    let told = journal(folder.path());
    let changes: Vec<_> = told.lines().filter(|line| line.contains("configuration")).collect();
    assert_eq!(changes.len(), 1, "{told}");
    for words in ["setpoint 100000 MW → 90000 MW", "thin threshold, MW 100 → 90", "by nilsen"] {
        assert!(changes[0].contains(words), "{words} in {told}");
    }
}
