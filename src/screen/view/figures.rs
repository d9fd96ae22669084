//! How numbers are written: rounded for reading, with a dash where there is none.

use chrono::{DateTime, TimeDelta, Utc};
use chrono_tz::Tz;

/// Stands where a value does not exist.
pub const NONE: &str = "–";

/// A number with so many decimals.
pub fn number(value: Option<f64>, decimals: usize) -> String {
    match value {
        Some(value) if value.is_finite() && value.abs() < 1e7 => {
            let text = format!("{value:.decimals$}");
            let zero = text.trim_start_matches('-').chars().all(|char| char == '0' || char == '.');
            text.replace('-', if zero { "" } else { "−" })
        }
        Some(value) if value.is_finite() => format!("{value:.1e}").replace('-', "−"),
        _ => NONE.into(),
    }
}

/// MW to a whole number.
pub fn mw(value: Option<f64>) -> String {
    number(value, 0)
}

/// Headroom, always signed and never rounded up: what is not there must not be promised.
pub fn headroom(value: Option<f64>) -> String {
    let whole = value.map(f64::floor);
    let sign = if whole.is_some_and(|value| value > 0.0) { "+" } else { "" };
    format!("{sign}{}", mw(whole))
}

/// Degrees to a whole number.
pub fn deg(value: Option<f64>) -> String {
    value.map_or(NONE.into(), |_| format!("{}°", number(value, 0)))
}

/// Percent to a whole number.
pub fn percent(value: Option<f64>) -> String {
    value.map_or(NONE.into(), |_| format!("{} %", number(value, 0)))
}

/// A stretch of time in one unit, or two.
pub fn duration(span: TimeDelta) -> String {
    let seconds = span.num_seconds();
    match seconds {
        ..120 => format!("{seconds} s"),
        120..7200 => format!("{} min", seconds / 60),
        7200..172_800 => format!("{} h {:02} min", seconds / 3600, seconds / 60 % 60),
        _ => format!("{} days", seconds / 86_400),
    }
}

/// Minutes ahead, rounded down; far ahead in hours alone, since nobody knows better.
pub fn minutes(minutes: f64) -> String {
    if minutes < 1.0 {
        return "under 1 min".into();
    }
    #[allow(clippy::cast_possible_truncation, reason = "bounded; not a number gives the bound")]
    let seconds = (minutes.min(1e6) * 60.0) as i64;
    match seconds {
        7200..172_800 => format!("{} h", seconds / 3600),
        _ => duration(TimeDelta::seconds(seconds)),
    }
}

/// Time of day.
pub fn clock(time: DateTime<Utc>, zone: Tz) -> String {
    time.with_timezone(&zone).format("%H:%M:%S").to_string()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_written_for_reading() {
        assert_eq!(mw(Some(1284.5)), "1284");
        assert_eq!(mw(Some(-0.2)), "0");
        assert_eq!(mw(Some(-12.6)), "−13");
        assert_eq!(mw(None), NONE);
        assert_eq!(mw(Some(f64::NAN)), NONE);
        assert_eq!(mw(Some(1e300)), "1.0e300");
        assert_eq!(headroom(Some(211.9)), "+211");
        assert_eq!(headroom(Some(0.4)), "0");
        assert_eq!(headroom(Some(-0.3)), "−1");
        assert_eq!(deg(Some(41.2)), "41°");
        assert_eq!(minutes(0.3), "under 1 min");
        assert_eq!(minutes(38.9), "38 min");
        assert_eq!(minutes(154.0), "2 h");
        assert_eq!(minutes(f64::INFINITY), "694 days");
        assert_eq!(duration(TimeDelta::seconds(7260)), "2 h 01 min");
    }
}
