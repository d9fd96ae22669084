//! A recorded day with known truth: 26 and 18 ohm, configured as 20 and 24.

use std::{
    fs::File,
    io::{BufRead, BufReader},
    path::Path,
};

use chrono::{DateTime, Utc};
use flate2::read::GzDecoder;
use nalgebra::Matrix2;
use serde_json::Value;
use tautline::{grid::ConfiguredSource, source::Observation};

use crate::corridor::{C, Line};

pub const TRUTH: [f64; 2] = [26.0, 18.0];

pub fn configured() -> [ConfiguredSource; 2] {
    [20.0, 24.0].map(|x_ohm| ConfiguredSource { r_ohm: 1.5, x_ohm, spread: 0.4, swing_x_ohm: 0.0 })
}

const LINES: [Line; 3] = [
    Line { km: 260.0, r: 0.029, x: 0.33, b: 3.5, capacitor: 0.0 },
    Line { km: 260.0, r: 0.029, x: 0.33, b: 3.5, capacitor: 0.0 },
    Line { km: 275.0, r: 0.027, x: 0.32, b: 3.6, capacitor: 22.0 },
];

pub fn day() -> Vec<Observation> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/feeds/orrin-tesk/day.jsonl.gz");
    let lines = BufReader::new(GzDecoder::new(File::open(path).unwrap())).lines();
    lines.map(|line| observation(&serde_json::from_str(&line.unwrap()).unwrap())).collect()
}

fn observation(frame: &Value) -> Observation {
    let value = |channel: &str| frame["values"][channel].as_f64().unwrap();
    let (closed, inserted) = (value("OT2.closed") > 0.5, value("OT3-SC.inserted") > 0.5);
    let mut y = Matrix2::<C>::zeros();
    for (k, line) in LINES.iter().enumerate() {
        if k != 1 || closed {
            y += line.admittance(inserted);
        }
    }
    let sum = |what: &str| (1..=3).map(|k| value(&format!("OT{k}.{what}"))).sum::<f64>();
    Observation {
        time: frame["time"].as_str().unwrap().parse::<DateTime<Utc>>().unwrap(),
        kv: [value("Orrin.kv"), value("Tesk.kv")],
        mw: [sum("from.mw"), sum("to.mw")],
        mvar: [sum("from.mvar"), sum("to.mvar")],
        y,
        topology: u64::from(closed) + 2 * u64::from(inserted),
        sigma: [0.6, 0.6, 3.0, 3.0, 3.0, 3.0],
        fit_ok: true,
    }
}
