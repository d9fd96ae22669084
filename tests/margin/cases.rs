//! Eleven corridors with one exact frame each, against what an independent numpy/scipy program made of them by the same
//! method (DOP853 for the swing, Brent for the roots).

use std::fs;

use serde_json::Value;

use super::bench;

/// Agreement to be reached, by the name of the value.
fn tolerance(path: &str, peak_mw: f64, expected: f64) -> f64 {
    if path.contains("limit_mw") || path.contains("headroom") {
        5e-4 * peak_mw
    } else if path.contains("critical_ms") {
        1e-4 * expected.abs()
    } else if path.contains("area_margin") {
        // The reference's own swing: on corridor-10, L11, 30-digit arithmetic (mpmath) agrees with us to 1e-14.
        2e-6 * expected.abs()
    } else {
        1e-6 * expected.abs().max(1e-3)
    }
}

fn compare(path: &str, expected: &Value, found: &Value, peak_mw: f64, compared: &mut usize) {
    match expected {
        Value::Object(members) => {
            for (key, value) in members {
                compare(&format!("{path}.{key}"), value, &found[key], peak_mw, compared);
            }
        }
        Value::Array(items) => {
            assert_eq!(found.as_array().map(Vec::len), Some(items.len()), "{path}");
            for (index, value) in items.iter().enumerate() {
                compare(&format!("{path}[{index}]"), value, &found[index], peak_mw, compared);
            }
        }
        Value::Number(number) => {
            let expected = number.as_f64().expect("a float");
            let found = found.as_f64().unwrap_or_else(|| panic!("{path}: {found} instead of {expected}"));
            assert!((found - expected).abs() <= tolerance(path, peak_mw, expected), "{path}: {found} not {expected}");
            *compared += 1;
        }
        other => assert_eq!(found, other, "{path}"),
    }
}

#[test]
fn every_case_agrees_with_the_independent_program() {
    let mut compared = 0;
    for folder in fs::read_dir("tests/cases").expect("the cases are there") {
        let folder = folder.expect("readable").path();
        let read = |name: &str| fs::read_to_string(folder.join(name)).expect("part of the case");
        let expected: Vec<Value> = serde_json::from_str(&read("expected.json")).expect("JSON");
        let found = bench::assess_lines(&read("config.toml"), read("frames.jsonl").as_bytes());
        assert_eq!(found.len(), expected.len());
        for (expected, found) in expected.iter().zip(&found) {
            let peak_mw = expected["intact"]["peak_mw"].as_f64().expect("a peak");
            let found = serde_json::to_value(found).expect("a record is JSON");
            compare(&folder.display().to_string(), expected, &found, peak_mw, &mut compared);
        }
    }
    assert!(compared > 500, "only {compared} figures compared");
}
