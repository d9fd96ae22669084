//! A recorded day with known truth, through the command as a user runs it.

use std::{fs, path::Path, process::Command};

use assert_cmd::cargo::cargo_bin;
use serde_json::Value;
use tautline::config::Config;

fn feed(file: &str) -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/feeds/orrin-tesk").join(file)
}

/// The last record of the day.
fn assessed(sources: &str) -> Value {
    let mut command = Command::new(cargo_bin("tautline"));
    command.args(["assess", "--last", "--sources", sources, "--config"]).arg(feed("config.toml"));
    let output = command.arg(feed("day.jsonl.gz")).output().unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    serde_json::from_slice(&output.stdout).unwrap()
}

#[test]
fn both_reactances_come_to_the_truth() {
    let truth: Value = serde_json::from_slice(&fs::read(feed("truth.json")).unwrap()).unwrap();
    let record = assessed("learned");
    for (bus, truth) in truth.as_object().unwrap() {
        let source = &record["sources"][bus];
        let [x, sd, truth] = [&source["x_ohm"], &source["x_sd"], &truth["x_ohm"]].map(|value| value.as_f64().unwrap());
        println!("{bus}: {x:.2} ± {sd:.2} ohm, truth {truth}");
        assert_eq!(source["basis"], "learned");
        assert!((x - truth).abs() < 0.06 * truth && (x - truth).abs() < 2.0 * sd, "{bus}: {x} ± {sd}, truth {truth}");
    }
}

#[test]
fn configured_sources_are_held() {
    let config = Config::load(&feed("config.toml")).unwrap();
    let corridor = &config.grid.corridors[0];
    let record = assessed("configured");
    for (bus, side) in corridor.buses.iter().zip(&corridor.sides) {
        let (record, source) = (&record["sources"][&*bus.name], side.source);
        let [r, x, r_sd, x_sd] = ["r_ohm", "x_ohm", "r_sd", "x_sd"].map(|key| record[key].as_f64().unwrap());
        assert_eq!([r, x].map(f64::to_bits), [source.r_ohm, source.x_ohm].map(f64::to_bits));
        assert!((r_sd - source.r_sd_ohm()).abs() < 1e-12 && (x_sd - source.x_sd_ohm()).abs() < 1e-12);
        assert_eq!((record["basis"].as_str(), record["steps"].as_u64()), (Some("configured"), Some(0)));
    }
}
