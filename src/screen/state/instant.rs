use chrono::{DateTime, NaiveTime, TimeZone, Utc};
use chrono_tz::Tz;

/// A typed time: `HH:MM`, `HH:MM:SS` on the day (in the zone) of `near`, or a full RFC 3339 time.
pub fn parse_time(text: &str, zone: Tz, near: DateTime<Utc>) -> Result<DateTime<Utc>, String> {
    let text = text.trim();
    if let Ok(time) = DateTime::parse_from_rfc3339(text) {
        return Ok(time.to_utc());
    }
    let of_day = ["%H:%M:%S", "%H:%M"].iter().find_map(|format| NaiveTime::parse_from_str(text, format).ok());
    let of_day = of_day.ok_or_else(|| format!("“{text}” is no time: type 14:03, 14:03:20 or 2031-03-14T14:03:20Z"))?;
    zone.from_local_datetime(&near.with_timezone(&zone).date_naive().and_time(of_day))
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
            ("24:00", Tz::UTC, None),
            ("", Tz::UTC, None),
            ("noon", Tz::UTC, None),
        ] {
            let read = parse_time(text, zone, near).ok();
            assert_eq!(read, expected.map(|time| time.parse().unwrap()), "{text} in {zone}");
        }
    }
}
