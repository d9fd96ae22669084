//! A corridor on the test bench: a configuration, a frame, the assessment of it.

use std::{collections::BTreeMap, sync::Arc};

use chrono::{DateTime, TimeDelta};
use serde_json::json;
use tautline::{
    config::Config,
    desk::{Assessment, Desk, OutageRecord},
    feed::{Channels, Decoder, Format, Holder, Snapshot, Tally},
};

/// Named values of one frame.
pub type Values = BTreeMap<String, f64>;

/// The assessments of the last frame of JSON Lines.
pub fn assess_lines(config: &str, lines: &[u8]) -> Vec<Assessment> {
    let (_, mut desk, snapshots) = desk(config, lines);
    snapshots.iter().map(|snapshot| desk.assess(snapshot)).last().expect("at least one frame")
}

/// A configuration, its desk, and the snapshots of JSON Lines.
pub fn desk(config: &str, lines: &[u8]) -> (Config, Desk, Vec<Snapshot>) {
    let config = Config::parse(config, "config.toml").unwrap_or_else(|errors| panic!("{errors}"));
    let channels = Arc::new(Channels::new(&config));
    let (mut tally, mut frames) = (Tally::default(), Vec::new());
    let mut decoder = Decoder::new(Format::JsonLines, channels.clone());
    decoder.push(lines, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
    let desk = Desk::detailed(&config, &channels);
    let snapshots = frames.iter().filter_map(|frame| holder.take(frame));
    (config, desk, snapshots.collect())
}

/// The assessment of one corridor by one frame.
pub fn assess(config: &str, values: &Values) -> Assessment {
    assess_lines(config, frame(0, values).as_bytes()).remove(0)
}

/// A frame some seconds after five in the morning, as a line.
pub fn frame(second: i64, values: &Values) -> String {
    let time = DateTime::from_timestamp(1_931_230_800 + second, 0).expect("a time");
    json!({"time": time, "values": values}).to_string() + "\n"
}

/// An outage by its name.
pub fn outage<'a>(assessment: &'a Assessment, name: &str) -> &'a OutageRecord {
    assessment.outages.iter().find(|outage| &*outage.name == name).expect("the outage is judged")
}
