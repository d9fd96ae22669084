//! `[[event]]`, `[[false_meter]]` and `[[gap]]`.

use super::{
    Limits, Section,
    corridor::{Cast, Target},
    time::{span, time},
};
use crate::{
    config::limits::{ANY, FRACTION, NOT_NEGATIVE},
    drill::{Action, Change, Event, FalseMeter, Gap},
    grid::{Fault, FaultKind},
};

/// A fault where the configuration has none.
const DEFAULT_FAULT: Fault = Fault { kind: FaultKind::ThreePhase, at: 0.0, clear_ms: 100.0 };
/// What an event can be, by key.
const ACTIONS: [&str; 7] = ["step", "impedance", "trip", "return", "fault", "bypass", "insert"];

/// Reads an `[[event]]`.
pub(super) fn event<'a>(mut section: Section<'a>, cast: &mut Cast<'a>) {
    let at_s = time(&mut section, "at", cast.duration_s);
    let mut given: Vec<_> = ACTIONS.into_iter().filter_map(|key| Some((key, section.text(key)?))).collect();
    let (Some((key, name)), true) = (given.pop(), given.is_empty()) else {
        section.wrong("at", format!("needs exactly one of {}", ACTIONS.join(", ")));
        section.abandon();
        return;
    };
    if let Some((place, action)) = action(&mut section, cast, key, &name) {
        cast.truth(place).events.push(Event { at_s, action });
    } else {
        section.abandon();
    }
}

fn action<'a>(section: &mut Section<'a>, cast: &Cast<'a>, key: &str, name: &str) -> Option<(usize, Action)> {
    let side = |target| if let Target::Side(side) = target { Some(side) } else { None };
    let circuit = |target| if let Target::Circuit(circuit) = target { Some(circuit) } else { None };
    let bank = |target| if let Target::Bank(bank) = target { Some(bank) } else { None };
    Some(match key {
        "step" => {
            let (place, side) = cast.target(section, key, name, "terminal", side)?;
            (place, Action::Step { side, change: change(section) })
        }
        "impedance" => {
            let (place, side) = cast.target(section, key, name, "terminal", side)?;
            let r_ohm = section.required_number("r_ohm", NOT_NEGATIVE);
            let x_ohm = section.required_number("x_ohm", NOT_NEGATIVE);
            (place, Action::Impedance { side, r_ohm, x_ohm })
        }
        "bypass" | "insert" => {
            let (place, bank) = cast.target(section, key, name, "series capacitor", bank)?;
            (place, if key == "bypass" { Action::Bypass(bank) } else { Action::Insert(bank) })
        }
        _ => {
            let (place, circuit) = cast.target(section, key, name, "circuit", circuit)?;
            let action = match key {
                "trip" => Action::Trip(circuit),
                "return" => Action::Return(circuit),
                _ => Action::Fault { circuit, fault: fault(section, cast.corridor(place).fault) },
            };
            (place, action)
        }
    })
}

fn change(section: &mut Section<'_>) -> Change {
    let kv = section.number("kv", Limits::at_least(-1000.0).up_to(1000.0));
    let percent = section.number("pct", Limits::above(-100.0).up_to(100.0));
    match (kv, percent) {
        (Some(kv), None) => Change::Kv(kv),
        (None, Some(percent)) => Change::Percent(percent),
        _ => {
            section.wrong("step", "needs exactly one of kv, pct");
            Change::Kv(f64::NAN)
        }
    }
}

fn fault(section: &mut Section<'_>, configured: Option<Fault>) -> Fault {
    let fault = configured.unwrap_or(DEFAULT_FAULT);
    Fault {
        kind: fault.kind,
        at: section.number("place", FRACTION).unwrap_or(fault.at),
        clear_ms: section.number("clear_ms", Limits::above(0.0).up_to(2000.0)).unwrap_or(fault.clear_ms),
    }
}

/// Reads a `[[false_meter]]`.
pub(super) fn false_meter<'a>(mut section: Section<'a>, cast: &mut Cast<'a>) {
    let channel = section.required_text("channel", "name a channel, such as SV1.from.mw");
    let span = span(&mut section, cast.duration_s);
    let scale = section.number("scale", ANY);
    let offset = section.number("offset", ANY);
    let value = section.number("value", ANY);
    if value.is_some() == (scale.is_some() || offset.is_some()) {
        section.wrong("channel", "needs scale or offset or both, or a value that it stands at");
    }
    let (scale, offset) = match value {
        Some(value) => (0.0, value),
        None => (scale.unwrap_or(1.0), offset.unwrap_or(0.0)),
    };
    match cast.channel(&channel) {
        Ok((place, point)) => cast.truth(place).false_meters.push(FalseMeter { point, span, scale, offset }),
        Err(message) if !channel.is_empty() => section.wrong("channel", message),
        Err(_) => {}
    }
}

/// Reads a `[[gap]]`.
pub(super) fn gap<'a>(mut section: Section<'a>, cast: &mut Cast<'a>) {
    let span = span(&mut section, cast.duration_s);
    let Some(channels) = section.texts("channels") else {
        cast.truths().for_each(|truth| truth.gaps.push(Gap { points: None, span }));
        return;
    };
    for channel in channels {
        match cast.channel(&channel.text) {
            Ok((place, point)) => cast.truth(place).gaps.push(Gap { points: Some(vec![point]), span }),
            Err(message) => cast.findings.report(&channel.place, message),
        }
    }
}
