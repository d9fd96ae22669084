//! What a recording says besides frames: strange, broken and hostile.

use std::{
    fs,
    path::{Path, PathBuf},
    sync::Arc,
};

use serde_json::{Value, json};
use tautline::{
    alarm::State,
    drill::{Invention, Scenario},
    feed::Channels,
    recording::Recorder,
};

use super::bed::{INVENTION, Seen, Station, frames, invented, parse, replayed};

const SHORT: Invention = Invention { hours: 3.0, ..INVENTION };

/// The lines of three recorded hours that begin after one of learning; what was seen of them; and the configuration.
fn recorded() -> (Vec<Value>, Vec<u8>, String) {
    let place = tempfile::tempdir().unwrap();
    let (text, scenario): (String, Scenario) = invented(&SHORT);
    let mut station = Station::begin(None, &text, Default::default());
    let mut begun = false;
    for frame in frames(&text, &scenario) {
        if !begun && frame.time.format("%H").to_string() == "01" {
            begun = true;
            let config = parse(&text);
            let channels = Arc::new(Channels::new(&config));
            let recorder = Recorder::open(place.path(), &config, &text, &channels);
            station.recorder = Some(recorder.unwrap());
            station.seen = Seen::default();
        }
        station.take(&frame);
    }
    let records = station.end().0.records.into_iter().flat_map(|(_, record)| record).collect();
    let packed = fs::read(place.path().join("2031-03-14.jsonl.zst")).unwrap();
    let lines = String::from_utf8(zstd::decode_all(&packed[..]).unwrap()).unwrap();
    (lines.lines().map(|line| serde_json::from_str(line).unwrap()).collect(), records, text)
}

fn written(place: &Path, lines: &[Value]) -> PathBuf {
    let path = place.join("day.jsonl");
    let lines: Vec<_> = lines.iter().map(Value::to_string).collect();
    fs::write(&path, lines.join("\n")).unwrap();
    path
}

fn replay(place: &Path, lines: &[Value], text: &str) -> (Vec<u8>, String) {
    let path = written(place, lines);
    let (seen, findings) = replayed(&[&path], text);
    (seen.records.into_iter().flat_map(|(_, record)| record).collect(), findings.join("\n"))
}

#[test]
fn starts_that_make_no_sense_are_counted_and_ignored() {
    let place = tempfile::tempdir().unwrap();
    let (lines, records, text) = recorded();
    assert!(lines[1..].iter().all(|line| line["tautline"]["start"].is_null()), "only the first says how it stood");
    let (whole, findings) = replay(place.path(), &lines, &text);
    assert!(whole == records && findings.is_empty(), "{findings}");
    let mut without = lines.clone();
    without[0].as_object_mut().unwrap().remove("tautline");
    let (without, _) = replay(place.path(), &without, &text);
    assert_ne!(whole, without, "the start matters");

    let names: Vec<String> = parse(&text).grid.corridors.iter().map(|corridor| corridor.name.to_string()).collect();
    let desk = |rest: &str| format!("/tautline/start/corridors/{}/desk{rest}", names[0]);
    let broken = [
        ("/tautline/start/version".into(), json!(2), "version 2"),
        ("/tautline/start".into(), json!([]), "invalid"),
        ("/tautline/start/corridors".into(), json!(7), "invalid type"),
        ("/tautline".into(), json!("\u{1b}[31m"), "invalid type"),
        (desk(""), json!({"learner": null}), "invalid type"),
        (desk("/switchings"), json!(u64::MAX), "absurd numbers"),
        (desk("/learner/both"), json!(1.5), "impossible"),
        (desk("/learner/both"), json!(1e300), "absurd numbers"),
        (desk("/learner/belief/mean"), json!([1.0, 2.0]), "invalid length"),
        (desk("/learner/belief/mean"), json!([1e9, 1, 1, 1]), "impossible"),
        (desk("/learner/estimate/covariance"), json!(vec![-1.0; 16]), "impossible"),
        (desk("/learner/configured/mean"), json!([1, 2, 3, 4]), "other configured sources"),
        (desk("/learner/detector/window_s"), json!(-1), "impossible"),
        (desk("/learner/detector/background/bin_changes"), json!(vec![[0.0; 6]; 129]), "impossible"),
        (desk("/learner/detector/recent"), json!("x"), "invalid type"),
        (desk("/trend/samples"), json!(vec![("2031-03-14T05:00:00Z", 1.0); 9]), "no course"),
    ];
    for (place_in, value, said) in broken {
        let mut lines = lines.clone();
        *lines[0].pointer_mut(&place_in).unwrap_or_else(|| panic!("{place_in}")) = value.clone();
        let (_, findings) = replay(place.path(), &lines, &text);
        assert!(findings.contains("1 facts of a recording not taken up"), "{place_in} {value}: {findings}");
        assert!(findings.contains(said), "{place_in} {value}: {findings}");
        assert!(!findings.contains('\u{1b}'));
    }
    // What of a configuration cannot be read is another one; statuses of another corridor are those of none.
    for (place_in, value) in [
        ("/tautline/start/configuration".to_owned(), json!("[grid")),
        (desk("/topology/closed"), json!([])),
        ("/tautline/start/held".to_owned(), json!({})),
    ] {
        let mut lines = lines.clone();
        *lines[0].pointer_mut(&place_in).unwrap() = value;
        let (records, _) = replay(place.path(), &lines, &text);
        assert_eq!(records.len() / 1000, whole.len() / 1000, "{place_in}");
    }
}

/// Every number of a start, one after another, becomes one that it cannot be.
#[test]
fn no_number_of_a_start_can_do_harm() {
    let place = tempfile::tempdir().unwrap();
    let (lines, _, text) = recorded();
    let mut numbers = Vec::new();
    gather(&lines[0]["tautline"], "/tautline", &mut numbers);
    assert!(numbers.len() > 1000, "{}", numbers.len());
    // Of long rows of the like, some.
    let step = numbers.len() / 150;
    for (n, at) in numbers.iter().step_by(step).enumerate() {
        let mut lines = lines[..40].to_vec();
        let evil = [json!(-1e15), json!(1e15), json!(0), json!(4e9), json!(-3), json!("x"), json!(null)];
        *lines[0].pointer_mut(at).unwrap() = evil[n % evil.len()].clone();
        let (records, _) = replay(place.path(), &lines, &text);
        assert_eq!(records.split(|byte| *byte == b'\n').count(), 81, "{at}");
    }
}

fn gather(value: &Value, at: &str, numbers: &mut Vec<String>) {
    match value {
        Value::Number(_) => numbers.push(at.to_owned()),
        Value::Array(values) => {
            values.iter().enumerate().for_each(|(n, value)| gather(value, &format!("{at}/{n}"), numbers));
        }
        Value::Object(members) => {
            for (name, value) in members {
                gather(value, &format!("{at}/{name}"), numbers);
            }
        }
        _ => {}
    }
}

#[test]
fn alarms_of_other_names_kinds_and_texts() {
    let place = tempfile::tempdir().unwrap();
    let (mut lines, _, text) = recorded();
    let name = parse(&text).grid.corridors[0].name.to_string();
    let alarms = lines[0]["tautline"]["start"]["corridors"][&name]["alarms"]["alarms"].as_object_mut().unwrap();
    let mut shelved = alarms["blind"].clone();
    shelved["standing"]["state"] = json!("shelved");
    shelved["standing"]["until"] = json!("2031-03-14T23:00:00Z");
    shelved["standing"]["reason"] = json!("\u{1b}[31mred");
    alarms.insert("of another name".into(), shelved.clone());
    alarms["blind"] = shelved.clone();
    alarms["overload"] = shelved;
    lines[1]["tautline"] = json!({"acts": [
        {"time": "2031-03-14T01:00:10Z", "by": "anna", "deed": {"action": [{"corridor": name, "alarm": "blind"}, "unshelve"]}},
        {"time": "2031-03-14T01:00:10Z", "deed": {"action": [{"corridor": name, "alarm": "none"}, "acknowledge"]}},
        {"time": "2031-03-14T01:00:10Z", "deed": "something"},
        {"time": "+90000-03-14T01:00:10Z", "deed": "silence"},
        "\u{1b}[31m", 7,
    ]});
    let path = written(place.path(), &lines);
    let (seen, findings) = replayed(&[&path], &text);
    let findings = findings.join("\n");
    // Four acts make no sense, and one alarm is gone.
    assert!(
        findings.contains("5 facts of a recording not taken up") && findings.contains("of another name"),
        "{findings}"
    );
    assert!(!findings.contains('\u{1b}'));
    let unshelved: Vec<_> = seen.transitions.iter().filter(|transition| transition.from == State::Shelved).collect();
    assert_eq!(unshelved.len(), 1, "that on another kind was not taken up: {unshelved:?}");
    assert_eq!(&*unshelved[0].alarm, "blind");
}
