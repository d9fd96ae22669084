use chrono::{DateTime, NaiveTime, TimeZone, Utc};
use chrono_tz::Tz;

/// A typed time: `HH:MM` or `HH:MM:SS` on the day of `near` or after a date, in the zone, or in UTC with a Z; or a full
/// RFC 3339 time.
pub fn parse_time(text: &str, zone: Tz, near: DateTime<Utc>) -> Result<DateTime<Utc>, String> {
    let text = text.trim();
    if let Ok(time) = DateTime::parse_from_rfc3339(text) {
        return Ok(time.to_utc());
    }
    let (bare, zone) = text.strip_suffix('Z').map_or((text, zone), |bare| (bare, Tz::UTC));
    let (date, time) = bare.split_once(['T', ' ']).map_or((None, bare), |(date, time)| (Some(date), time));
    let day = date.map_or(Some(near.with_timezone(&zone).date_naive()), |date| date.parse().ok());
    let time = ["%H:%M:%S", "%H:%M"].iter().find_map(|format| NaiveTime::parse_from_str(time, format).ok());
    let (day, time) = day.zip(time).ok_or_else(|| {
        format!("“{text}” is no time: type 14:03, 14:03:20, 2031-03-14T14:03 or 2031-03-14T14:03:20Z")
    })?;
    zone.from_local_datetime(&day.and_time(time))
        .earliest()
        .map(|time| time.to_utc())
        .ok_or_else(|| format!("{text} does not exist on this day in {zone}"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_are_read_in_the_zone_of_display() {
        let near = "2031-03-29T23:30:00Z".parse().unwrap();
        let oslo = chrono_tz::Europe::Oslo;
        for (text, zone, expected) in [
            ("14:03", Tz::UTC, Some("2031-03-29T14:03:00Z")),
            (" 14:03:20 ", Tz::UTC, Some("2031-03-29T14:03:20Z")),
            ("14:03", oslo, Some("2031-03-30T12:03:00Z")),
            ("02:30", oslo, None),
            ("2031-01-01T00:00:00+01:00", oslo, Some("2030-12-31T23:00:00Z")),
            ("2031-03-31T14:03", oslo, Some("2031-03-31T12:03:00Z")),
            ("2031-03-31 14:03:20", oslo, Some("2031-03-31T12:03:20Z")),
            ("2031-03-14T14:03Z", oslo, Some("2031-03-14T14:03:00Z")),
            ("14:03Z", oslo, Some("2031-03-29T14:03:00Z")),
            ("2031-02-30T14:03", Tz::UTC, None),
            ("2031-03-14", Tz::UTC, None),
            ("24:00", Tz::UTC, None),
            ("", Tz::UTC, None),
            ("noon", Tz::UTC, None),
        ] {
            let read = parse_time(text, zone, near).ok();
            assert_eq!(read, expected.map(|time| time.parse().unwrap()), "{text} in {zone}");
        }
    }
}
