//! What a recording says besides its frames: one more member of a frame's object, `tautline`, which other readers ignore.
//!
//! ```json
//! "tautline": {
//!   "start": {"version": 1, "why": "day", "program": "0.1.0", "configuration": "[grid]\n…",
//!             "held": {"Skarn.kv": ["2031-03-14T04:59:59Z", 408.0, "good"]},
//!             "corridors": {"Skarn-Velm": {"desk": {}, "alarms": {}}}},
//!   "acts": [{"time": "2031-03-14T04:59:58Z", "by": "anna",
//!             "deed": {"action": [{"corridor": "Skarn-Velm", "alarm": "blind"}, "acknowledge"]}}]
//! }
//! ```
//!
//! A start says everything that what follows depends on: who takes it up goes on as the program did that recorded it. What
//! desk and alarms say of themselves is theirs; here it is text.

use std::{
    collections::BTreeMap,
    sync::{Arc, Mutex, OnceLock, PoisonError},
};

use chrono::{DateTime, Utc};
use serde::{Deserialize, Deserializer, Serialize, de::DeserializeOwned};
use serde_json::{Value, value::RawValue};

use super::{Channels, FrameText, Holder, Named, Quality, Reading, Slot, draft::INVALID, rfc3339, stamp};
use crate::config::Config;

const VERSION: u32 = 1;
/// No number that is kept of a desk is larger.
const LARGEST: f64 = 1e15;

/// What a recording says besides a frame.
#[derive(Debug, Clone, PartialEq)]
pub struct Aside {
    /// How everything stood before the frame.
    pub start: Option<Start>,
    /// What operators did since the frame before, in order.
    acts: Vec<Raw>,
    untaken: Untaken,
}

/// How everything stood before a frame.
#[derive(Debug, Clone, PartialEq)]
pub struct Start {
    /// Why it is here.
    pub why: Why,
    /// The version of the program that recorded it.
    pub program: String,
    /// The configuration in force, TOML.
    pub configuration: String,
    /// By slot: what was held, and since when.
    pub(super) held: Vec<(Slot, (DateTime<Utc>, Reading))>,
    corridors: BTreeMap<String, Kept<Raw, Raw>>,
    parsed: OnceLock<Option<Box<Config>>>,
    untaken: Untaken,
}

/// Why a recording says how everything stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Why {
    /// The program began.
    Start,
    /// A day began (UTC).
    Day,
    /// Another configuration came into force.
    Configuration,
    /// Frames before it are not in the recording.
    Gap,
}

/// What of a recording's asides could not be taken up. Shared by those on their way and the tally of their input.
#[derive(Debug, Clone, Default)]
pub struct Untaken(Arc<Mutex<Named>>);

/// JSON that somebody else understands.
#[derive(Debug, Clone, PartialEq)]
struct Raw(Box<str>);

/// How one corridor stood.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(crate) struct Kept<D, A> {
    pub desk: D,
    pub alarms: A,
}

/// A start as it is written and read.
#[derive(Serialize, Deserialize)]
#[serde(bound(deserialize = "T: Deserialize<'de> + Ord, K: Deserialize<'de>"))]
struct Written<T: Ord, K> {
    version: u32,
    why: Why,
    program: T,
    configuration: T,
    held: BTreeMap<T, (String, Option<f64>, T)>,
    corridors: BTreeMap<T, K>,
}

#[derive(Deserialize)]
struct Read {
    start: Option<Written<String, Kept<Raw, Raw>>>,
    #[serde(default)]
    acts: Vec<Raw>,
}

/// Everything that a start is made of.
pub(crate) struct Present<'a, K> {
    pub why: Why,
    pub configuration: &'a str,
    pub holder: &'a Holder,
    pub corridors: BTreeMap<&'a str, K>,
}

impl<K: Serialize> Present<'_, K> {
    /// The start as JSON.
    pub fn write(self, text: &FrameText) -> serde_json::Result<String> {
        let held = self.holder.held().filter_map(|(slot, (time, reading))| {
            let value = Some(reading.value).filter(|value| value.is_finite());
            Some((text.name(slot)?, (stamp::text(&time), value, reading.quality.word())))
        });
        serde_json::to_string(&Written {
            version: VERSION,
            why: self.why,
            program: env!("CARGO_PKG_VERSION"),
            configuration: self.configuration,
            held: held.collect(),
            corridors: self.corridors,
        })
    }
}

impl Aside {
    /// Reads it; `None` for what is none, which is counted.
    pub(super) fn read(text: &str, channels: &Channels, untaken: &Untaken) -> Option<Arc<Self>> {
        let refuse = |what: &str| {
            untaken.count(what);
            None
        };
        let Read { start, acts } = match serde_json::from_str(text) {
            Ok(read) => read,
            Err(error) => return refuse(&error.to_string()),
        };
        let start = match start {
            Some(start) if start.version != VERSION => {
                return refuse(&format!("a start of version {}, not {VERSION}", start.version));
            }
            start => start.map(|start| Start::of(start, channels, untaken)),
        };
        Some(Arc::new(Self { start, acts, untaken: untaken.clone() }))
    }

    /// One with a start that did not come with a frame.
    pub(crate) fn with_start(start: &RawValue, channels: &Channels) -> Option<Arc<Self>> {
        Self::read(&format!(r#"{{"start":{}}}"#, start.get()), channels, &Untaken::default())
    }

    /// What operators did, as far as it can be understood.
    pub(crate) fn acts<T: DeserializeOwned>(&self) -> impl Iterator<Item = T> {
        self.acts.iter().filter_map(|act| {
            let read = serde_json::from_str(&act.0);
            read.map_err(|error| self.untaken.count(&format!("what an operator did: {error}"))).ok()
        })
    }
}

impl Start {
    fn of(written: Written<String, Kept<Raw, Raw>>, channels: &Channels, untaken: &Untaken) -> Self {
        let Written { why, program, configuration, held, corridors, .. } = written;
        let mut taken = Vec::new();
        for (name, (time, value, quality)) in held {
            match (channels.in_feed(&name), rfc3339(&time)) {
                (Some(slot), Ok(time)) => {
                    let plausible = value.filter(|value| channels.is_plausible(slot, *value));
                    let quality = Quality::from_word(&quality);
                    let reading = plausible.map_or(INVALID, |value| Reading { value, quality });
                    taken.push((slot, (time, reading)));
                }
                _ => untaken.count(&format!("the value held of {name}")),
            }
        }
        Self { why, program, configuration, held: taken, corridors, parsed: OnceLock::new(), untaken: untaken.clone() }
    }

    /// The configuration that was in force, if this program understands it.
    pub fn config(&self) -> Option<&Config> {
        let parse = || Config::parse(&self.configuration, "recorded").ok().map(Box::new);
        self.parsed.get_or_init(parse).as_deref()
    }

    /// How a corridor's desk stood; `None` where that is not told, or makes no sense.
    pub(crate) fn desk<T: DeserializeOwned>(&self, corridor: &str) -> Option<T> {
        self.part(corridor, &self.corridors.get(corridor)?.desk)
    }

    /// How a corridor's alarms stood, likewise.
    pub(crate) fn alarms<T: DeserializeOwned>(&self, corridor: &str) -> Option<T> {
        self.part(corridor, &self.corridors.get(corridor)?.alarms)
    }

    fn part<T: DeserializeOwned>(&self, corridor: &str, text: &Raw) -> Option<T> {
        let read = || {
            let value: Value = serde_json::from_str(&text.0)?;
            if is_sane(&value) {
                serde_json::from_value(value)
            } else {
                Err(serde::de::Error::custom("absurd numbers"))
            }
        };
        read().map_err(|error| self.doubt(corridor, &error)).ok()
    }

    /// Says what of a corridor is not taken up.
    pub(crate) fn doubt(&self, corridor: &str, what: &impl std::fmt::Display) {
        self.untaken.count(&format!("{corridor}: {what}"));
    }
}

/// Numbers that arithmetic can go on with: JSON itself knows neither NaN nor infinity.
fn is_sane(value: &Value) -> bool {
    match value {
        Value::Number(number) => number.as_f64().is_some_and(|number| number.abs() <= LARGEST),
        Value::Array(values) => values.iter().all(is_sane),
        Value::Object(members) => members.values().all(is_sane),
        Value::Null | Value::Bool(_) | Value::String(_) => true,
    }
}

impl Untaken {
    fn count(&self, what: &str) {
        self.0.lock().unwrap_or_else(PoisonError::into_inner).count(what);
    }

    /// How many, and some of them.
    pub fn named(&self) -> Named {
        self.0.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }
}

impl PartialEq for Untaken {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.0, &other.0) || self.named() == other.named()
    }
}

impl Eq for Untaken {}

impl<'de> Deserialize<'de> for Raw {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        Ok(Self(Box::<RawValue>::deserialize(deserializer)?.into()))
    }
}
