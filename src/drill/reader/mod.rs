//! Reads a scenario file: all that is wrong with it at once, each with line and key.

mod corridor;
mod event;
mod metering;
mod time;

use std::path::Path;

use chrono::{DateTime, Utc};
use toml_edit::Value;

use self::corridor::Cast;
use super::{Metering, Scenario};
use crate::config::{
    Config, ConfigErrors, document, file,
    findings::Findings,
    limits::{Limits, POSITIVE},
    section::Section,
};

/// A year: beyond, a scenario is a mistake.
const LONGEST_HOURS: f64 = 8784.0;
/// As often as phasor measurement units report.
const SHORTEST_INTERVAL_S: f64 = 0.02;
const MOST_CORRIDORS: usize = 1000;
const MOST_EVENTS: usize = 10_000;

impl Scenario {
    /// Reads a scenario from a file.
    pub fn load(path: &Path, config: &Config) -> Result<Self, ConfigErrors> {
        let name = path.display().to_string();
        let text = file::read(path).map_err(|error| ConfigErrors::one(&name, error))?;
        Self::parse(&text, &name, config)
    }

    /// Reads a scenario from a text; `name` is the file's in messages.
    pub fn parse(text: &str, name: &str, config: &Config) -> Result<Self, ConfigErrors> {
        let document = document::parse(text).map_err(|error| ConfigErrors::one(name, error))?;
        let findings = Findings::new(document.raw());
        let scenario = read(Section::root(&findings, document.as_table()), config);
        findings.verdict(scenario, name)
    }
}

fn read<'a>(mut root: Section<'a>, config: &'a Config) -> Scenario {
    let hours = root.required_number("hours", POSITIVE.up_to(LONGEST_HOURS));
    let duration_s = hours * 3600.0;
    let interval_s = root.required_number("interval_s", Limits::at_least(SHORTEST_INTERVAL_S).up_to(3600.0));
    let start = start(&mut root);
    let seed = seed(&mut root);
    let metering = metering::read(root.section("metering"));

    let mut cast = Cast::new(config, root.findings(), duration_s);
    for section in root.required_sections("corridor", MOST_CORRIDORS) {
        cast.read(section);
    }
    for section in root.sections("event", MOST_EVENTS) {
        event::event(section, &mut cast);
    }
    for section in root.sections("false_meter", MOST_EVENTS) {
        event::false_meter(section, &mut cast);
    }
    for section in root.sections("gap", MOST_EVENTS) {
        event::gap(section, &mut cast);
    }
    Scenario { start, duration_s, interval_s, seed, metering, corridors: cast.corridors() }
}

fn start(root: &mut Section<'_>) -> DateTime<Utc> {
    let Some(given) = root.take("start") else {
        root.wrong("start", "is missing; give the time of the first frame, such as 2031-03-14T00:00:00Z");
        return DateTime::default();
    };
    let text = match given.value {
        Some(Value::Datetime(time)) => time.value().to_string(),
        Some(Value::String(text)) => text.value().clone(),
        _ => String::new(),
    };
    let time = DateTime::parse_from_rfc3339(&text);
    if time.is_err() {
        given.wrong("must be a time with date and offset, such as 2031-03-14T00:00:00Z");
    }
    time.map(|time| time.to_utc()).unwrap_or_default()
}

fn seed(root: &mut Section<'_>) -> u64 {
    let Some(given) = root.take("seed") else { return 1 };
    let seed = given.value.and_then(Value::as_integer).and_then(|seed| u64::try_from(seed).ok());
    if seed.is_none() {
        given.wrong("must be a whole number, at least 0");
    }
    seed.unwrap_or_default()
}
