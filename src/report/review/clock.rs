use chrono::{DateTime, Offset, Utc};
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
            let [first, last] = [first, last].map(|time| time.with_timezone(&zone));
            match first.date_naive() == last.date_naive() {
                true if first.offset().fix() == last.offset().fix() => "%H:%M:%S",
                true => "%H:%M:%S %Z",
                false => "%Y-%m-%d %H:%M:%S %Z",
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
    }
}
