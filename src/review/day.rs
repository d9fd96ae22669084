use std::{collections::BTreeMap, sync::Arc};

use chrono::{DateTime, NaiveDate, Utc};
use serde::{Deserialize, Serialize};

use super::Course;
use crate::{
    desk::{Assessment, Basis, SourceRecord},
    events::Event,
};

/// One UTC day, reviewed on its own.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Day {
    /// Which.
    pub date: NaiveDate,
    /// How the day began.
    pub beginning: Beginning,
    /// What it was read from.
    pub files: Vec<FileNote>,
    /// Time of the first frame.
    pub first: DateTime<Utc>,
    /// Time of the last.
    pub last: DateTime<Utc>,
    /// Frames.
    pub frames: u64,
    /// Time with data, ms: until the next frame, but no longer than a value stands, nor past midnight.
    pub covered_ms: i64,
    /// Time between the first and the last frame without data: a frame's values stand until the next one, but no longer than
    /// their age, ms.
    pub silent_ms: i64,
    /// What the day's files said of it that a reader should know.
    pub findings: Vec<String>,
    /// What happened, in order.
    pub events: Vec<Event>,
    /// Events left out, because there were too many.
    pub events_left_out: u64,
    /// One each, in the order of the configuration.
    pub corridors: Vec<CorridorDay>,
}

/// What a day began with.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Beginning {
    /// What the recording keeps with the day: sources, alarms, values.
    Recorded,
    /// The configuration.
    Configured,
    /// What the day before it ended with.
    Carried,
}

impl Beginning {
    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Recorded => "recorded",
            Self::Configured => "configured",
            Self::Carried => "carried",
        }
    }
}

/// A file that a day was read from.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct FileNote {
    /// As it was given.
    pub name: String,
    /// What of it could not be used.
    pub findings: Vec<String>,
}

/// One corridor on one day.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CorridorDay {
    /// The corridor.
    pub corridor: Arc<str>,
    /// As it was.
    pub was: Course,
    /// As it would have been, where a change was asked for that touches it.
    pub what_if: Option<Course>,
    /// What stood behind the terminals at the first and at the last frame; `from`, then `to`.
    pub sources: Option<[[SourceNote; 2]; 2]>,
    /// Channels that were missing or set aside, by name.
    pub meters: BTreeMap<Arc<str>, MeterNote>,
}

/// What was known of a source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SourceNote {
    /// The terminal bus.
    pub bus: Arc<str>,
    /// Resistance, ohm.
    pub r_ohm: f64,
    /// Its standard deviation, ohm.
    pub r_sd: f64,
    /// Reactance, ohm.
    pub x_ohm: f64,
    /// Its standard deviation, ohm.
    pub x_sd: f64,
    /// Where it comes from.
    pub basis: Basis,
    /// Steps it was learned from.
    pub steps: u64,
}

/// For how long a channel was of no use.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct MeterNote {
    /// Without a usable value, ms.
    pub missing_ms: i64,
    /// Set aside because it did not fit the rest, ms.
    pub suspect_ms: i64,
}

impl CorridorDay {
    pub(super) fn new(corridor: Arc<str>, with_change: bool) -> Self {
        let what_if = with_change.then(Course::default);
        Self { corridor, was: Course::default(), what_if, sources: None, meters: BTreeMap::new() }
    }

    pub(super) fn meter(&mut self, channel: &Arc<str>) -> &mut MeterNote {
        self.meters.entry(channel.clone()).or_default()
    }
}

impl SourceNote {
    fn of(source: &SourceRecord) -> Self {
        Self {
            bus: source.bus.clone(),
            r_ohm: source.r_ohm,
            r_sd: source.r_sd,
            x_ohm: source.x_ohm,
            x_sd: source.x_sd,
            basis: source.basis,
            steps: source.steps,
        }
    }

    pub(super) fn both(assessment: &Assessment) -> [Self; 2] {
        [Self::of(&assessment.sources[0]), Self::of(&assessment.sources[1])]
    }
}
