//! The exact frames of `tests/cases` agree with themselves and give back the voltages they show.

use std::{fs, path::Path, sync::Arc};

use chrono::DateTime;
use tautline::{
    config::Config,
    feed::{Channels, Point, Quality, Reading, Snapshot},
    fit::Fitter,
    grid::TO,
    network::C64,
};

fn snapshot(channels: &Channels, values: &serde_json::Value) -> Snapshot {
    let mut readings = vec![None; channels.len()];
    for (name, value) in values.as_object().unwrap() {
        let slot = channels.in_feed(name).unwrap();
        readings[slot] = Some(Reading { value: value.as_f64().unwrap(), quality: Quality::Good });
    }
    Snapshot { time: DateTime::UNIX_EPOCH, readings, aside: None }
}

fn fits_exactly(case: &Path) {
    let config = Config::load(&case.join("config.toml")).unwrap();
    let channels = Channels::new(&config);
    let frame = fs::read_to_string(case.join("frames.jsonl")).unwrap();
    let frame: serde_json::Value = serde_json::from_str(frame.lines().last().unwrap()).unwrap();
    let snapshot = snapshot(&channels, &frame["values"]);
    for corridor in config.grid.corridors {
        let corridor = Arc::new(corridor);
        let fit = Fitter::new(corridor.clone(), &channels, &config.measurement).fit(&snapshot);
        let case = case.display();
        assert!(fit.suspects.is_empty(), "{case}: {:?}", fit.suspects);
        assert!(fit.chi2.unwrap() < 1e-9, "{case}: {:?}", fit.chi2);
        let state = fit.joined().unwrap();
        let shown = |point| snapshot.usable(channels.slot(&corridor, point)).unwrap().value;
        for (bus, voltage) in state.voltage.iter().enumerate().filter(|(bus, _)| state.live[*bus]) {
            let deg = shown(Point::Deg(bus)) - shown(Point::Deg(TO));
            let truth = C64::from_polar(shown(Point::Kv(bus)), deg.to_radians());
            assert!((voltage - truth).norm() < 1e-9 * truth.norm(), "{case}, bus {bus}: {voltage} for {truth}");
        }
    }
}

#[test]
fn every_case_fits_exactly() {
    let cases = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases");
    let folders: Vec<_> = fs::read_dir(cases).unwrap().map(|entry| entry.unwrap().path()).collect();
    assert!(folders.len() >= 11);
    for case in &folders {
        fits_exactly(case);
    }
}
