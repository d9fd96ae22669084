use chrono::{DateTime, Offset, TimeDelta, Utc};
use chrono_tz::Tz;

/// Writes times in a zone, as long as they have to be to be told apart.
#[derive(Debug, Clone, Copy)]
pub(super) struct Clock {
    pub zone: Tz,
    format: &'static str,
}

const FULL: &str = "%-d %b %Y %H:%M:%S %Z";

impl Clock {
    /// For times of a span.
    pub fn new(zone: Tz, span: Option<(DateTime<Utc>, DateTime<Utc>)>) -> Self {
        let format = span.map_or(FULL, |(first, last)| {
            let date = |time: DateTime<Utc>| time.with_timezone(&zone).date_naive();
            match (date(first) == date(last), shifts(zone, first, last)) {
                (true, false) => "%H:%M:%S",
                (true, true) => "%H:%M:%S %Z",
                (false, false) => "%Y-%m-%d %H:%M:%S",
                (false, true) => "%Y-%m-%d %H:%M:%S %Z",
            }
        });
        Self { zone, format }
    }

    /// A time among the others.
    pub fn when(&self, time: DateTime<Utc>) -> String {
        time.with_timezone(&self.zone).format(self.format).to_string()
    }

    /// A time on its own.
    pub fn full(&self, time: DateTime<Utc>) -> String {
        time.with_timezone(&self.zone).format(FULL).to_string()
    }
}

/// Whether the zone changes its offset on the way.
fn shifts(zone: Tz, first: DateTime<Utc>, last: DateTime<Utc>) -> bool {
    let offset = |time: DateTime<Utc>| time.with_timezone(&zone).offset().fix();
    // Changes are months apart; very long spans are looked at in fewer places.
    let step = TimeDelta::days(7).max((last - first) / 10_000);
    let times = std::iter::successors(Some(first), |time| time.checked_add_signed(step));
    times.take_while(|time| *time < last).chain([last]).any(|time| offset(time) != offset(first))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_time_says_what_tells_it_apart() {
        let time = |text: &str| text.parse::<DateTime<Utc>>().unwrap();
        let when = |first, last, at| Clock::new(Tz::Europe__Oslo, Some((time(first), time(last)))).when(time(at));
        let at = "2031-10-26T00:30:00Z";
        assert_eq!(when("2031-10-25T22:00:00Z", "2031-10-26T00:40:00Z", at), "02:30:00");
        assert_eq!(when("2031-10-25T22:00:00Z", "2031-10-26T22:00:00Z", at), "02:30:00 CEST");
        assert_eq!(when("2031-10-26T00:00:00Z", "2031-10-27T00:00:00Z", at), "2031-10-26 02:30:00 CEST");
        assert_eq!(when("2031-10-21T00:00:00Z", "2031-10-22T23:00:00Z", at), "2031-10-26 02:30:00");
        assert_eq!(when("2031-01-01T00:00:00Z", "2031-12-31T00:00:00Z", at), "2031-10-26 02:30:00 CEST");
    }
}
