//! How a review writes numbers and names for people.

use crate::config::wording::is_unprintable;

/// Characters of a name that are shown.
pub(super) const LONGEST_NAME: usize = 60;
/// Characters of a sentence that are shown.
pub(super) const LONGEST_SENTENCE: usize = 300;
/// Stands for a headroom where a change leaves no balance.
pub(super) const NO_BALANCE: &str = "no balance";
/// Stands where there is no value.
pub(super) const NONE: &str = "–";

/// Text from outside, cut where it is long, without what could steer a terminal or turn the direction of writing.
pub(super) fn plain(text: &str, longest: usize) -> String {
    // Not characters by the standard, so that no markup may have them.
    let is_none = |c: char| is_unprintable(c) || matches!(c, '\u{fffe}' | '\u{ffff}');
    let shown: String = text.chars().take(longest).map(|c| if is_none(c) { '·' } else { c }).collect();
    if text.chars().nth(longest).is_some() { shown + "…" } else { shown }
}

pub(super) fn name(text: &str) -> String {
    plain(text, LONGEST_NAME)
}

/// Whole megawatts with a proper minus.
pub(super) fn mw(mw: f64) -> String {
    number(mw.round(), 0)
}

/// Megawatts of room: never more than there are.
pub(super) fn room(mw: f64) -> String {
    number(mw.floor(), 0)
}

pub(super) fn minutes(minutes: f64) -> String {
    number(minutes, 1)
}

pub(super) fn minutes_of(ms: i64) -> String {
    minutes(ms as f64 / 60_000.0)
}

/// So many of something.
pub(super) fn counted(count: u64, what: &str) -> String {
    format!("{count} {what}{}", if count == 1 { "" } else { "s" })
}

/// A difference, with its sign.
pub(super) fn signed(value: f64, places: usize) -> String {
    let text = number(value, places);
    if value > 0.0 && text.chars().any(|c| ('1'..='9').contains(&c)) { format!("+{text}") } else { text }
}

pub(super) fn number(value: f64, places: usize) -> String {
    let text = if value.abs() < 1e12 { format!("{value:.places$}") } else { format!("{value:.3e}") };
    match text.strip_prefix('-') {
        Some(zero) if zero.chars().all(|c| matches!(c, '0' | '.')) => zero.to_owned(),
        Some(positive) => format!("−{positive}"),
        None => text,
    }
}

/// A part of a whole, 0 to 1, as percentage: all and nothing only where it is so.
pub(super) fn share(part: f64) -> String {
    match part {
        _ if part > 0.0 && part < 0.0005 => "<0.1 %".into(),
        _ if part < 1.0 && part > 0.9995 => ">99.9 %".into(),
        _ => format!("{:.1} %", 100.0 * part),
    }
}

/// A stretch of time.
pub(super) fn lasting(ms: i64) -> String {
    let minutes = ms / 60_000;
    match (minutes / 1440, minutes / 60 % 24, minutes % 60) {
        (0, 0, 0) => format!("{} s", ms / 1000),
        (0, 0, minutes) => format!("{minutes} min"),
        (0, hours, minutes) => format!("{hours} h {minutes:02} min"),
        (days, hours, _) => format!("{days} d {hours} h"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_is_said_that_is_not_so() {
        assert_eq!([-3.2, -0.4, 0.9, 1e300].map(room), ["−4", "−1", "0", "1.000e300"]);
        assert_eq!([0.0, 1e-9, 0.5, 0.999_999, 1.0].map(share), ["0.0 %", "<0.1 %", "50.0 %", ">99.9 %", "100.0 %"]);
        assert_eq!([0.04, -0.04, 1.25, -1.5].map(|value| signed(value, 1)), ["0.0", "0.0", "+1.2", "−1.5"]);
        assert_eq!(
            [999, 59_999, 3_599_000, 3_660_000, 90_000_000].map(lasting),
            ["0 s", "59 s", "59 min", "1 h 01 min", "1 d 1 h"]
        );
    }

    #[test]
    fn names_stay_names() {
        assert_eq!(name("a\u{1b}[31mb\u{202e}c\u{fffe}"), "a·[31mb·c·");
        assert_eq!(name(&"x".repeat(10_000)).chars().count(), LONGEST_NAME + 1);
    }
}
