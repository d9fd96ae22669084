use std::sync::Arc;

use chrono::{DateTime, Utc};

use crate::desk::{Assessment, State};

/// Something worth a line in the messages.
#[derive(Debug, Clone, PartialEq)]
pub struct Event {
    /// When, by the frames.
    pub time: DateTime<Utc>,
    /// Which corridor; `None`: the feed.
    pub corridor: Option<Arc<str>>,
    /// The state it led to, where it is a change of state.
    pub state: Option<State>,
    /// What happened.
    pub text: String,
}

/// How bad a state is; larger is worse.
pub fn severity(state: State) -> u8 {
    match state {
        State::Ample => 0,
        State::Thin => 1,
        State::Blind => 2,
        State::Spent => 3,
    }
}

/// Why a corridor is in its state, after a colon; empty where nobody can tell.
pub(super) fn reason(assessment: &Assessment) -> String {
    match (&assessment.binding, assessment.headroom_mw) {
        (Some(binding), Some(headroom)) => {
            let outage = binding.outage.as_deref().map_or("nothing lost".into(), |outage| format!("{outage} out"));
            let headroom = format!("{:+.0}", headroom.floor()).replace('-', "−");
            let spread = assessment.headroom_sd_mw.map_or(String::new(), |sd| format!(" ±{:.0}", sd.ceil()));
            format!(": {headroom}{spread} MW ({outage}, {})", criterion(binding.criterion))
        }
        _ if !assessment.fit.missing.is_empty() => format!(": {} missing", assessment.fit.missing.len()),
        _ => String::new(),
    }
}

/// A state's word.
pub fn word(state: State) -> &'static str {
    match state {
        State::Ample => "ample",
        State::Thin => "thin",
        State::Spent => "spent",
        State::Blind => "blind",
    }
}

/// A criterion's word.
pub fn criterion(criterion: crate::desk::Criterion) -> &'static str {
    use crate::desk::Criterion::{Angle, Area, Loading, Separation, Voltage};
    match criterion {
        Angle => "angle",
        Area => "area",
        Loading => "loading",
        Voltage => "voltage",
        Separation => "separation",
    }
}
