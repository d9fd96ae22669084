//! Times and values over time.

use toml_edit::Value;

use crate::{
    config::{given::Given, limits::Limits, section::Section},
    drill::{Shape, Span},
};

/// Advice for whatever is no time.
const A_TIME: &str = "a time since the start, as 07:30:00 or in seconds";

/// Seconds since the start.
fn seconds(given: &Given<'_>, duration_s: f64) -> f64 {
    let seconds = match given.value {
        Some(Value::Integer(seconds)) => *seconds.value() as f64,
        Some(Value::Float(seconds)) => *seconds.value(),
        Some(Value::Datetime(time)) => match (time.value().date, time.value().time) {
            (None, Some(time)) => {
                let whole = u32::from(time.hour) * 3600
                    + u32::from(time.minute) * 60
                    + u32::from(time.second.unwrap_or_default());
                f64::from(whole) + f64::from(time.nanosecond.unwrap_or_default()) / 1e9
            }
            _ => f64::NAN,
        },
        _ => f64::NAN,
    };
    if seconds.is_nan() {
        given.is_not(A_TIME);
    } else if seconds < 0.0 || seconds > duration_s {
        given.wrong("is outside of the scenario; give a time between its start and its end");
    }
    seconds
}

/// A time that must be there.
pub(super) fn time<'a>(section: &mut Section<'a>, key: &'a str, duration_s: f64) -> f64 {
    let given = section.take(key);
    if given.is_none() {
        section.wrong(key, format!("is missing; give {A_TIME}"));
    }
    given.map_or(f64::NAN, |given| seconds(&given, duration_s))
}

/// `from` and `until`, each at the scenario's own end where it is omitted.
pub(super) fn span(section: &mut Section<'_>, duration_s: f64) -> Span {
    let from_s = section.take("from").map_or(0.0, |given| seconds(&given, duration_s));
    let until_s = section.take("until").map_or(duration_s, |given| seconds(&given, duration_s));
    if until_s <= from_s {
        section.wrong("until", "must be later than from");
    }
    Span { from_s, until_s }
}

/// A value over time: a number, or an array of `[time, number]`.
pub(super) fn shape<'a>(section: &mut Section<'a>, key: &'a str, limits: Limits, duration_s: f64) -> Option<Shape> {
    let given = section.take(key)?;
    if given.value.is_none_or(|value| !value.is_array()) {
        return Some(Shape::level(given.number(limits)));
    }
    let points = given.array("an array of [time, number]").unwrap_or_default();
    let point = |point: &Given<'a>| match point.array("an array of a time and a number").as_deref() {
        Some([time, value]) => (seconds(time, duration_s), value.number(limits)),
        Some(_) => {
            point.wrong("must be an array of a time and a number");
            (f64::NAN, f64::NAN)
        }
        None => (f64::NAN, f64::NAN),
    };
    let points: Vec<_> = points.iter().map(point).collect();
    let read = points.iter().all(|(time, _)| time.is_finite());
    Some(Shape::through(points).unwrap_or_else(|| {
        if read {
            given.wrong("must have at least one point, and their times must ascend");
        }
        Shape::level(f64::NAN)
    }))
}
