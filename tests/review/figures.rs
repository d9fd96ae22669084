//! The figures of a review, computed once more from the records that `assess` writes.

use std::collections::BTreeMap;

use assert_cmd::Command;
use chrono::{DateTime, Utc};
use serde_json::Value;
use tautline::{desk::State, review::Binding};

use crate::bed::{Bed, name};

fn records(bed: &Bed, file: &str) -> BTreeMap<String, Vec<Value>> {
    let config = name(&bed.path("config.toml"));
    let output = Command::cargo_bin("tautline").unwrap().args(["assess", "--config", &config, file]).output().unwrap();
    assert!(output.status.success());
    let mut records: BTreeMap<String, Vec<Value>> = BTreeMap::new();
    for line in String::from_utf8(output.stdout).unwrap().lines() {
        let record: Value = serde_json::from_str(line).unwrap();
        records.entry(record["corridor"].as_str().unwrap().to_owned()).or_default().push(record);
    }
    records
}

fn time(record: &Value) -> DateTime<Utc> {
    record["time"].as_str().unwrap().parse().unwrap()
}

/// For how long each record stood: until the next one, at most ten seconds, and not past midnight.
fn standing(records: &[Value]) -> Vec<(&Value, i64)> {
    let ends = records.iter().skip(1).map(time).chain(["2031-03-15T00:00:00Z".parse().unwrap()]);
    records
        .iter()
        .zip(ends)
        .map(|(record, end)| (record, (end - time(record)).num_milliseconds().min(10_000)))
        .collect()
}

#[test]
#[allow(clippy::float_cmp, reason = "they are the same numbers")]
fn they_are_those_of_the_records() {
    let bed = Bed::new(24.0);
    // With an hour missing, and a voltage that is gone for a while.
    let mut lines = [bed.hours(0..9), bed.hours(10..24)].concat();
    for line in &mut lines[2000..2300] {
        *line = line.replacen(".kv", ".kvx", 2);
    }
    let file = name(&bed.file("day.jsonl.zst", &lines));
    let review = bed.review(&[file.clone().into()]);
    let records = records(&bed, &file);
    assert_eq!(review.corridors.len(), 2);
    for corridor in &review.corridors {
        let standing = standing(&records[&*corridor.corridor]);
        let course = &corridor.was;
        assert_eq!(course.frames, standing.len() as u64);

        for state in State::ALL {
            let in_it = standing.iter().filter(|(record, _)| record["state"] == state.word());
            assert_eq!(course.state_ms.ms(&state), in_it.map(|(_, ms)| ms).sum::<i64>(), "{}", state.word());
        }

        let known = || standing.iter().filter(|(record, _)| !record["headroom_mw"].is_null());
        let headroom = |record: &Value| record["headroom_mw"].as_f64().unwrap();
        let (least, _) = known().min_by(|(a, _), (b, _)| headroom(a).total_cmp(&headroom(b))).unwrap();
        let found = course.least.as_ref().unwrap();
        assert_eq!((found.headroom_mw, found.time), (headroom(least), time(least)));
        let binding = found.binding.as_ref().unwrap();
        assert_eq!(least["binding"]["outage"].as_str(), binding.outage.as_deref());
        assert_eq!(least["binding"]["criterion"], binding.criterion.word());

        let mut shares: BTreeMap<(Option<&str>, &str), i64> = BTreeMap::new();
        for (record, ms) in known() {
            let binding = &record["binding"];
            *shares.entry((binding["outage"].as_str(), binding["criterion"].as_str().unwrap())).or_default() += ms;
        }
        let mine = course.binding_ms.shares();
        assert_eq!(mine.len(), shares.len());
        for share in mine {
            let Binding { outage, criterion } = share.of;
            assert_eq!(share.ms, shares[&(outage.as_deref(), criterion.word())]);
        }

        for mw in [-100, 0, 50, 120, 333, 1000] {
            let above = known().filter(|(record, _)| headroom(record) >= f64::from(mw));
            assert_eq!(course.durations.at_least_ms(mw), above.map(|(_, ms)| ms).sum::<i64>(), "at least {mw} MW");
        }

        let from = &bed.config.grid.corridors.iter().find(|c| c.name == corridor.corridor).unwrap().buses[0].name;
        let signed = |record: &Value| {
            let mw = record["transfer_mw"].as_f64().unwrap();
            if record["exporter"] == **from { mw } else { -mw }
        };
        let transfers = || standing.iter().filter(|(record, _)| !record["transfer_mw"].is_null());
        let low = transfers().map(|(record, _)| signed(record)).fold(f64::INFINITY, f64::min);
        let high = transfers().map(|(record, _)| signed(record)).fold(f64::NEG_INFINITY, f64::max);
        assert_eq!(course.transfer_mw, Some([low, high]));
        let mwh: f64 = transfers().map(|(record, ms)| signed(record) * *ms as f64 / 3.6e6).sum();
        assert!((course.energy_mwh - mwh).abs() < 1e-6 * mwh.abs());

        let mut missing: BTreeMap<&str, i64> = BTreeMap::new();
        for (record, ms) in &standing {
            for channel in record["fit"]["missing"].as_array().unwrap() {
                *missing.entry(channel.as_str().unwrap()).or_default() += ms;
            }
        }
        for (channel, note) in &corridor.meters {
            assert_eq!(note.missing_ms, missing.get(&**channel).copied().unwrap_or(0), "{channel}");
        }
        assert!(missing.keys().all(|channel| corridor.meters.contains_key(*channel)));

        let [first, last] = corridor.sources.as_ref().unwrap();
        for (note, record) in [(first, standing[0].0), (last, standing.last().unwrap().0)] {
            for source in note {
                let kept = &record["sources"][&*source.bus];
                assert_eq!(kept["x_ohm"].as_f64(), Some(source.x_ohm));
                assert_eq!(kept["steps"].as_u64(), Some(source.steps));
            }
        }
    }
    assert_eq!(review.silent_ms, 3_600_000, "the missing hour, but for the last frame before it and after the last");
}
