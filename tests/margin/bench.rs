//! A corridor on the test bench: a configuration, a frame, the assessment of it.

use std::{collections::BTreeMap, sync::Arc};

use chrono::TimeDelta;
use serde_json::json;
use tautline::{
    config::Config,
    desk::{Assessment, Desk, OutageRecord},
    feed::{Channels, Decoder, Format, Holder, Tally},
};

/// Named values of one frame.
pub type Values = BTreeMap<String, f64>;

/// The assessments of the last frame of JSON Lines.
pub fn assess_lines(config: &str, lines: &[u8]) -> Vec<Assessment> {
    let config = Config::parse(config, "config.toml").unwrap_or_else(|errors| panic!("{errors}"));
    let channels = Arc::new(Channels::new(&config));
    let (mut tally, mut frames) = (Tally::default(), Vec::new());
    let mut decoder = Decoder::new(Format::JsonLines, channels.clone());
    decoder.push(lines, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
    let mut desk = Desk::detailed(&config, &channels);
    let snapshots = frames.iter().filter_map(|frame| holder.take(frame));
    snapshots.map(|snapshot| desk.assess(&snapshot)).last().expect("at least one frame")
}

/// The assessment of one corridor by one frame.
pub fn assess(config: &str, values: &Values) -> Assessment {
    let line = json!({"time": "2031-03-14T05:00:00Z", "values": values}).to_string();
    assess_lines(config, line.as_bytes()).remove(0)
}

/// An outage by its name.
pub fn outage<'a>(assessment: &'a Assessment, name: &str) -> &'a OutageRecord {
    assessment.outages.iter().find(|outage| &*outage.name == name).expect("the outage is judged")
}
