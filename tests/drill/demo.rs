//! The bundled demo day is what its scenario makes, and tells the story it should.

use std::{fs, path::Path, process::Command, sync::Arc};

use assert_cmd::cargo::cargo_bin;
use chrono::{DateTime, NaiveTime, TimeDelta, Utc};
use tautline::{
    config::Config,
    desk::{Assessment, Desk, State},
    drill::{Drill, Scenario},
    feed::{Channels, Holder},
};
use tempfile::TempDir;

const CONFIG: &str = "config/demo.toml";
const SCENARIO: &str = "config/demo-day.toml";
const DAY: &str = "replay-data/demo-day.jsonl.zst";
const LARGEST_FILE: usize = 3_000_000;

fn in_project(path: &str) -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

#[test]
fn the_scenario_makes_the_file_to_the_last_byte() {
    let folder = TempDir::new().unwrap();
    let made = folder.path().join("made.jsonl.zst");
    let status = Command::new(cargo_bin("tautline"))
        .arg("drill")
        .arg("--config")
        .arg(in_project(CONFIG))
        .arg("--scenario")
        .arg(in_project(SCENARIO))
        .arg("--output")
        .arg(&made)
        .status()
        .unwrap();
    assert!(status.success());
    let bundled = fs::read(in_project(DAY)).unwrap();
    assert!(fs::read(made).unwrap() == bundled, "make it anew: see the head of {SCENARIO}");
    assert!(bundled.len() <= LARGEST_FILE);
}

/// The day, assessed once a minute.
struct Day(Vec<Assessment>);

impl Day {
    fn play() -> Self {
        let config = Config::load(&in_project(CONFIG)).unwrap();
        let scenario = Scenario::load(&in_project(SCENARIO), &config).unwrap();
        let channels = Arc::new(Channels::new(&config));
        let mut desk = Desk::new(&config, &channels);
        let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
        let drill = Drill::new(&config, &channels, &scenario);
        let minutes = drill.filter(|frame| (frame.time - scenario.start).num_seconds() % 60 == 0);
        Self(minutes.flat_map(|frame| desk.assess(&holder.take(&frame).unwrap())).collect())
    }

    /// A corridor's assessments from a time up to another.
    fn between(&self, corridor: &str, from: &str, until: &str) -> Vec<&Assessment> {
        let [from, until] = [from, until].map(|time| NaiveTime::parse_from_str(time, "%H:%M").unwrap());
        let during = |time: DateTime<Utc>| (from..until).contains(&time.time());
        self.0.iter().filter(|a| &*a.corridor == corridor && during(a.time)).collect()
    }
}

#[test]
fn the_day_has_its_story() {
    let day = Day::play();
    let states = |corridor, from, until| -> Vec<State> {
        day.between(corridor, from, until).iter().map(|assessment| assessment.state).collect()
    };
    let all = |corridor, from, until, state| states(corridor, from, until).iter().all(|s| *s == state);

    // A trip leaves the margin thin; the circuit may not return before the transfer is lowered.
    assert!(all("Torvane-Melskar", "00:00", "09:41", State::Ample));
    assert!(all("Torvane-Melskar", "09:43", "10:35", State::Thin));
    assert!(all("Torvane-Melskar", "10:54", "23:59", State::Ample));
    let may_return = |from, until| -> Vec<_> {
        day.between("Torvane-Melskar", from, until).iter().map(|a| a.reclose[0].allowed).collect()
    };
    assert!(may_return("09:43", "10:15").iter().all(|allowed| *allowed == Some(false)));
    assert!(may_return("10:45", "10:52").iter().all(|allowed| *allowed == Some(true)));

    // The bypassed capacitor is worth its insertion.
    for assessment in day.between("Torvane-Melskar", "13:10", "14:25") {
        let insert = assessment.actions.iter().find(|action| action.action == "insert TM3-SC").unwrap();
        assert!(insert.headroom_mw.unwrap() > assessment.headroom_mw.unwrap() + 60.0);
    }

    // The false meter is named, and nothing else.
    for assessment in day.between("Ulvey-Kestram", "15:05", "15:48") {
        assert_eq!(assessment.fit.suspects.iter().map(|s| &**s).collect::<Vec<_>>(), ["UD2.to.mw"]);
    }
    assert!(day.between("Ulvey-Kestram", "15:50", "18:00").iter().all(|a| a.fit.suspects.is_empty()));

    // No data for some minutes.
    assert!(day.between("Ashkel-Rovanth", "04:12", "04:16").is_empty());

    // Power turns round, and the evening peak spends the margin.
    let exporter = |from, until| day.between("Ashkel-Rovanth", from, until)[0].exporter.clone().unwrap();
    assert_eq!(&*exporter("03:00", "04:00"), "Ashkel");
    assert_eq!(&*exporter("13:00", "14:00"), "Rovanth");
    assert_eq!(&*exporter("20:00", "21:00"), "Ashkel");
    let spent = states("Ashkel-Rovanth", "00:00", "23:59").iter().filter(|state| **state == State::Spent).count();
    assert!((5..40).contains(&spent), "{spent} minutes");
    assert!(all("Ashkel-Rovanth", "19:38", "19:42", State::Spent));
}
