//! The drill: its physics, its meters, its scenario files, and the command as a user runs it.

mod command;
mod demo;
mod metering;
mod physics;
mod scenario;

use std::collections::BTreeMap;

use tautline::{
    config::Config,
    drill::{Drill, Scenario, Truth},
    feed::Channels,
};

/// Two corridors' worth of parts: one with a bank, one with a station.
const CONFIG: &str = include_str!("config.toml");

/// A frame by name, with its time in seconds.
struct Played {
    time_s: f64,
    values: BTreeMap<String, f64>,
}

impl Played {
    fn get(&self, name: &str) -> f64 {
        self.values[name]
    }
}

/// Plays a scenario that begins at midnight.
fn play(scenario: &str) -> (Vec<Played>, Vec<Truth>) {
    play_with(CONFIG, scenario)
}

fn play_with(config: &str, scenario: &str) -> (Vec<Played>, Vec<Truth>) {
    let config = Config::parse(config, "config.toml").unwrap();
    let head = "start = 2031-03-14T00:00:00Z\n";
    let scenario = Scenario::parse(&format!("{head}{scenario}"), "scenario.toml", &config).unwrap();
    let channels = Channels::new(&config);
    let mut drill = Drill::new(&config, &channels, &scenario);
    let frames = drill
        .by_ref()
        .map(|frame| Played {
            time_s: (frame.time - scenario.start).as_seconds_f64(),
            values: frame.readings.iter().map(|(slot, r)| (channels.name(*slot).to_string(), r.value)).collect(),
        })
        .collect();
    (frames, drill.take_truth())
}
