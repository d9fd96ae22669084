//! Days with a restart, a change of the configuration and operators at work: each replayed alone, bit by bit.

use std::{fs, path::Path};

use assert_cmd::cargo::cargo_bin_cmd;
use chrono::{DateTime, TimeDelta, Utc};
use serde_json::Value;
use tautline::{
    alarm::{Act, Action, AlarmId, Deed, State, Target, Transition},
    drill::Scenario,
};

use super::bed::{INVENTION, Seen, Station, at, frames, invented, parse, replayed};

impl Station {
    /// Does something with every alarm that waits for an operator.
    fn operate(&mut self, turn: usize) {
        let time = self.now.unwrap();
        for (n, id) in self.board.abnormal().into_iter().enumerate() {
            let action = match (turn + n) % 4 {
                0 => Action::Shelve { until: time + TimeDelta::minutes(31), reason: "known, \"really\"".into() },
                1 => Action::RemoveFromService { reason: "at work".into() },
                2 => Action::ReturnToService,
                _ => Action::Acknowledge,
            };
            let target = self.target(id);
            if let Ok(transition) = self.board.act(id, &action, time) {
                self.seen.transitions.push(Transition { by: Some("anna".into()), ..transition });
                self.record(Act { time, by: Some("anna".into()), deed: Deed::Action(target, action) });
            }
        }
    }

    fn target(&self, id: AlarmId) -> Target {
        let corridor = self.board.corridors[id.corridor].corridor().clone();
        Target { corridor, alarm: self.board.get(id).unwrap().definition.name.clone() }
    }
}

fn lines(seen: &Seen, from: DateTime<Utc>, until: DateTime<Utc>) -> String {
    let within = seen.records.iter().filter(|(time, _)| (from..until).contains(time));
    within.map(|(_, record)| str::from_utf8(record).unwrap()).collect()
}

const RESTART: &str = "2031-03-14T15:00:00Z";
const CHANGE: &str = "2031-03-15T09:00:00Z";

/// A configuration, and another: other thresholds and alarms, another rating, another name in the feed.
fn configurations() -> ([String; 2], Scenario) {
    let (before, scenario) = invented(&INVENTION);
    let kv = format!("{}.kv", parse(&before).grid.corridors[0].buses[0].name);
    let after = before.replacen("rating_a = 1900", "rating_a = 1700", 1).replace("setpoint = 900", "setpoint = 800");
    assert!(after.contains("= 1700") && after.contains("= 800"));
    let after = after + &format!("\n[channels]\n\"{kv}\" = \"RTU 7/U\"\n");
    ([before, after], scenario)
}

/// What is seen live, recorded or not.
fn live(folder: Option<&Path>) -> Seen {
    let ([before, after], scenario) = configurations();
    let [restart, change] = [RESTART, CHANGE].map(at);
    let mut station = Station::begin(folder, &before, Default::default());
    let mut live = Seen::default();
    let (mut restarted, mut changed) = (false, false);
    for (n, frame) in frames(&before, &scenario).enumerate() {
        // Some minutes pass until it is started again.
        if (restart..restart + TimeDelta::minutes(7)).contains(&frame.time) {
            continue;
        }
        if frame.time > restart && !restarted {
            restarted = true;
            let kept = station.kept();
            let (seen, status) = station.end();
            assert_eq!((status.lost, status.trouble), (0, None));
            live = seen;
            station = Station::begin(folder, &before, kept);
        }
        if frame.time >= change && !changed {
            changed = true;
            station.reconfigure(&after);
        }
        station.take(&frame);
        if n % 50 == 0 {
            station.operate(n / 50);
        } else if n % 777 == 0 {
            // Long enough for the data to be called silent.
            station.wait(15);
            station.wait(70);
        }
    }
    let (seen, status) = station.end();
    assert_eq!((status.lost, status.trouble), (0, None));
    live.records.extend(seen.records);
    live.transitions.extend(seen.transitions);
    live
}

#[test]
fn every_day_alone_gives_what_was_seen_live() {
    let place = tempfile::tempdir().unwrap();
    let days = place.path().join("days");
    let live = live(Some(&days));
    let raised = live.transitions.iter().filter(|transition| transition.to == State::Unacknowledged).count();
    assert!(raised > 20, "{raised} alarms");
    let learned = live.records.iter().filter(|(_, record)| str::from_utf8(record).unwrap().contains("learned")).count();
    assert!(learned > 2000, "{learned} records of learned sources");

    let file = |day: &str| days.join(format!("{day}.jsonl.zst"));
    assert_eq!(fs::read_dir(&days).unwrap().count(), 4, "three days and the lock");
    let ([before, after], _) = configurations();
    let parts = [
        ("2031-03-14", "2031-03-14T00:00:00Z", "2031-03-15T00:00:00Z", &before),
        ("2031-03-15", "2031-03-15T00:00:00Z", CHANGE, &before),
        ("2031-03-15", CHANGE, "2031-03-16T00:00:00Z", &after),
        ("2031-03-16", "2031-03-16T00:00:00Z", "2031-03-17T00:00:00Z", &after),
    ];
    for (day, from, until, text) in parts {
        let [from, until] = [from, until].map(at);
        let (mut again, findings) = replayed(&[&file(day)], text);
        let (expected, found) = (lines(&live, from, until), lines(&again, from, until));
        let differ = expected.lines().zip(found.lines()).position(|(expected, found)| expected != found);
        assert!(!expected.is_empty() && expected == found, "{day} from {from}: the first to differ is {differ:?}");
        again.transitions.retain(|transition| (from..until).contains(&transition.time));
        let mut expected = live.transitions.clone();
        expected.retain(|transition| (from..until).contains(&transition.time));
        assert!(expected.len() > 5, "{}", expected.len());
        assert_eq!(again.transitions, expected, "{day} from {from}");
        let is_one = day != "2031-03-15";
        assert_eq!(findings.iter().any(|finding| finding.contains("another configuration")), !is_one, "{findings:?}");
        if is_one {
            assert_eq!(findings, Vec::<String>::new(), "{day}");
            let config = place.path().join("config.toml");
            fs::write(&config, text).unwrap();
            let mut assess = cargo_bin_cmd!("tautline");
            let output = assess.arg("assess").arg("--config").arg(config).arg(file(day)).output().unwrap();
            assert!(output.status.success() && output.stderr.is_empty());
            assert!(output.stdout == found.as_bytes(), "the command has the same");
        }
    }
}

/// Nothing is lost by taking up what was written: only the gradient behind the spread of the headroom is taken anew.
#[test]
fn recording_changes_nothing_of_what_is_seen() {
    let place = tempfile::tempdir().unwrap();
    let [recorded, plain] = [live(Some(place.path())), live(None)];
    assert_eq!(recorded.transitions, plain.transitions);
    assert_eq!(recorded.records.len(), plain.records.len());
    for ((time, recorded), (_, plain)) in recorded.records.iter().zip(&plain.records) {
        let [mut recorded, mut plain] =
            [recorded, plain].map(|record| serde_json::from_slice::<Value>(record).unwrap());
        let spreads = [&mut recorded, &mut plain].map(|record| record["headroom_sd_mw"].take().as_f64());
        assert_eq!(recorded, plain, "{time}");
        if let [Some(one), Some(other)] = spreads {
            assert!((one - other).abs() <= 0.1 * other, "{time}: {one} MW, {other} MW");
        }
    }
}
