use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};
use serde::{Deserialize, Serialize};

use crate::{
    alarm::{Kind, Transition},
    desk::{Assessment, State},
};

/// Something worth a line.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Event {
    /// When, by the frames.
    pub time: DateTime<Utc>,
    /// Which corridor; `None`: the feed.
    pub corridor: Option<Arc<str>>,
    /// Of what kind.
    pub kind: EventKind,
    /// The state it led to, where it is a change of state.
    pub state: Option<State>,
    /// What happened.
    pub text: String,
}

/// What an event is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum EventKind {
    /// The corridor came into another state.
    State,
    /// The transfer changed its direction.
    Direction,
    /// A circuit opened.
    Trip,
    /// A circuit closed.
    Return,
    /// A series capacitor bank was bypassed.
    Bypass,
    /// A series capacitor bank was inserted.
    Insertion,
    /// What stands behind a terminal moved.
    Step,
    /// A meter contradicts the rest or is missing, or is well again.
    Meter,
    /// No frames came.
    Gap,
    /// An alarm was raised, or returned to normal.
    Alarm,
    /// Somebody did something: an acknowledgement, a shelving.
    Act,
    /// The program itself: files, configuration.
    Program,
}

impl EventKind {
    /// All of them.
    pub const ALL: [Self; 12] = [
        Self::State,
        Self::Direction,
        Self::Trip,
        Self::Return,
        Self::Bypass,
        Self::Insertion,
        Self::Step,
        Self::Meter,
        Self::Gap,
        Self::Alarm,
        Self::Act,
        Self::Program,
    ];

    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::State => "state",
            Self::Direction => "direction",
            Self::Trip => "trip",
            Self::Return => "return",
            Self::Bypass => "bypass",
            Self::Insertion => "insertion",
            Self::Step => "step",
            Self::Meter => "meter",
            Self::Gap => "gap",
            Self::Alarm => "alarm",
            Self::Act => "act",
            Self::Program => "program",
        }
    }
}

impl Event {
    /// How a corridor stands at its first frame.
    pub fn first(assessment: &Assessment) -> Self {
        Self {
            time: assessment.time,
            corridor: Some(assessment.corridor.clone()),
            kind: EventKind::State,
            state: Some(assessment.state),
            text: format!("{} at the first frame{}", assessment.state.word(), reason(assessment)),
        }
    }

    /// Something about the program itself.
    pub fn of_program(time: DateTime<Utc>, text: String) -> Self {
        Self { time, corridor: None, kind: EventKind::Program, state: None, text }
    }

    /// What an alarm did.
    pub fn of_alarm(transition: &Transition) -> Self {
        let Transition { time, corridor, alarm, priority, event, about, reason, by, .. } = transition;
        let what = if transition.is_annunciated() {
            let about = about.as_ref().map_or(String::new(), |about| format!(" ({about})"));
            format!("raised{}{about}", at(transition))
        } else {
            event.word().to_owned()
        };
        let by = by.as_ref().map_or(String::new(), |by| format!(" by {by}"));
        let reason = reason.as_ref().map_or(String::new(), |reason| format!(": {reason}"));
        Self {
            time: *time,
            corridor: Some(corridor.clone()),
            kind: if event.is_act() { EventKind::Act } else { EventKind::Alarm },
            state: None,
            text: format!("{alarm} ({}): {what}{by}{reason}", priority.word()),
        }
    }
}

/// At which value, rounded towards what calls for attention.
fn at(transition: &Transition) -> String {
    let kind = transition.on;
    let Some(value) = transition.value else { return String::new() };
    let value = if kind == Kind::HeadroomMw { value.floor() } else { value };
    let number = format!("{value:.*}", kind.decimals()).replace('-', "−");
    format!(" at {number} {}", kind.unit()).trim_end().to_owned()
}

/// What to tell of the time between two frames, where it is longer than a value stands.
pub fn gap(before: DateTime<Utc>, time: DateTime<Utc>, max_age: TimeDelta) -> Option<Event> {
    (time - before > max_age).then(|| Event {
        time: before,
        corridor: None,
        kind: EventKind::Gap,
        state: None,
        text: format!("no frame for {}", span(time - before)),
    })
}

/// Why a corridor is in its state, after a colon; empty where nobody can tell.
pub(crate) fn reason(assessment: &Assessment) -> String {
    match (&assessment.binding, assessment.headroom_mw) {
        (Some(binding), Some(headroom)) => {
            let outage = binding.outage.as_deref().map_or("nothing lost".into(), |outage| format!("{outage} out"));
            let headroom = format!("{:+.0}", headroom.floor()).replace('-', "−");
            let spread = assessment.headroom_sd_mw.map_or(String::new(), |sd| format!(" ±{:.0}", sd.ceil()));
            format!(": {headroom}{spread} MW ({outage}, {})", binding.criterion.word())
        }
        _ if !assessment.fit.missing.is_empty() => format!(": {} missing", assessment.fit.missing.len()),
        _ => String::new(),
    }
}

/// A stretch of time in words.
pub(super) fn span(span: TimeDelta) -> String {
    match span.num_milliseconds() {
        ms @ ..1000 => format!("{ms} ms"),
        ms @ 1000..120_000 => format!("{} s", ms / 1000),
        ms @ 120_000..7_200_000 => format!("{} min", ms / 60_000),
        ms => match (ms / 3_600_000, ms / 60_000 % 60) {
            (hours, 0) => format!("{hours} h"),
            (hours, minutes) => format!("{hours} h {minutes} min"),
        },
    }
}
