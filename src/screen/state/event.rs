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

/// What is worth telling between two assessments of a corridor.
pub fn transitions(before: Option<&Assessment>, after: &Assessment) -> Vec<Event> {
    let mut events = Vec::new();
    let mut tell = |state, text| {
        events.push(Event { time: after.time, corridor: Some(after.corridor.clone()), state, text });
    };
    let was = before.map_or(State::Ample, |before| before.state);
    if was != after.state {
        tell(Some(after.state), format!("{} → {}{}", word(was), word(after.state), reason(after)));
    }
    let Some(before) = before else { return events };

    for (now, then, what) in [
        (&after.fit.suspects, &before.fit.suspects, "does not fit the rest and is set aside"),
        (&before.fit.suspects, &after.fit.suspects, "fits again"),
        (&after.fit.missing, &before.fit.missing, "is missing"),
        (&before.fit.missing, &after.fit.missing, "is back"),
    ] {
        let changed: Vec<_> = now.iter().filter(|name| !then.contains(name)).map(AsRef::as_ref).collect();
        match changed.as_slice() {
            [] => {}
            [name] => tell(None, format!("{name} {what}")),
            [name, rest @ ..] => tell(None, format!("{name} and {} more: each {what}", rest.len())),
        }
    }
    if let (Some(was), Some(is)) = (&before.exporter, &after.exporter)
        && was != is
    {
        tell(None, format!("direction reversed: {is} exports now"));
    }
    for text in switched(before, after) {
        tell(None, text);
    }
    events
}

fn reason(assessment: &Assessment) -> String {
    match (&assessment.binding, assessment.headroom_mw) {
        (Some(binding), Some(headroom)) => {
            let outage = binding.outage.as_deref().map_or("nothing lost".into(), |outage| format!("{outage} out"));
            let headroom = format!("{:+.0}", headroom.floor()).replace('-', "−");
            format!(": {headroom} MW ({outage}, {})", criterion(binding.criterion))
        }
        _ if !assessment.fit.missing.is_empty() => format!(": {} missing", assessment.fit.missing.len()),
        _ => String::new(),
    }
}

fn switched(before: &Assessment, after: &Assessment) -> Vec<String> {
    let (Some(before), Some(after)) = (&before.detail, &after.detail) else { return Vec::new() };
    let mut told = Vec::new();
    for (was, is) in before.circuits.iter().zip(&after.circuits) {
        if was.closed != is.closed {
            told.push(format!("{} {}", is.name, if is.closed { "closed" } else { "opened" }));
        }
        for ((name, was), (_, is)) in was.banks.iter().zip(&is.banks) {
            if was != is {
                told.push(format!("{name} {}", if *is { "inserted" } else { "bypassed" }));
            }
        }
    }
    told
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample;

    fn told(change: impl Fn(&mut Assessment)) -> Vec<String> {
        let before = sample::at(0, 212.0);
        let mut after = before.clone();
        change(&mut after);
        transitions(Some(&before), &after).into_iter().map(|event| event.text).collect()
    }

    #[test]
    fn each_change_is_told_once_and_in_words() {
        let nothing: Vec<String> = Vec::new();
        assert_eq!(told(|_| ()), nothing);
        assert_eq!(
            told(|a| a.fit.suspects.push("SV1.to.mw".into())),
            ["SV1.to.mw does not fit the rest and is set aside"]
        );
        assert_eq!(
            told(|a| a.fit.missing = vec!["a".into(), "b".into(), "c".into()]),
            ["a and 2 more: each is missing"]
        );
        assert_eq!(told(|a| a.exporter = Some("Velm".into())), ["direction reversed: Velm exports now"]);
        assert_eq!(
            told(|a| {
                let detail = Arc::make_mut(a.detail.as_mut().unwrap());
                detail.circuits[1].banks[0].1 = false;
                detail.circuits[2].closed = false;
            }),
            ["SV2-SC bypassed", "SV3 opened"]
        );
        assert_eq!(told(|a| a.state = State::Blind).len(), 1);
    }
}
