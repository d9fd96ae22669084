//! Axes: of megawatts, and of time in a zone that may change its offset on the way.

use chrono::{DateTime, Datelike, NaiveDate, NaiveTime, Offset, TimeDelta, TimeZone, Utc};
use chrono_tz::Tz;

use super::figures::number;

/// Ticks that fit beside each other.
const MOST_TICKS: i64 = 13;
const DAY_S: i64 = 86_400;

/// Megawatts from bottom to top.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scale {
    low: f64,
    high: f64,
    step: f64,
    top_px: f64,
    bottom_px: f64,
}

impl Scale {
    /// Wide enough for all values; what is beyond a million megawatts is drawn at the edge.
    pub fn new(values: impl IntoIterator<Item = f64>, top_px: f64, bottom_px: f64, most_ticks: f64) -> Self {
        let (low, high) = values
            .into_iter()
            .filter(|value| !value.is_nan())
            .map(|value| value.clamp(-1e6, 1e6))
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| (low.min(value), high.max(value)));
        let (low, high) = if low <= high { (low, high) } else { (0.0, 0.0) };
        let (low, high) = if high - low < 2.0 { (low - 1.0, high + 1.0) } else { (low, high) };
        let power = 10.0_f64.powf(((high - low) / most_ticks).log10().floor());
        let mut steps = [1.0, 2.0, 5.0, 10.0].map(|times| times * power).into_iter();
        let step = steps.find(|step| (high - low) / step <= most_ticks).unwrap_or(10.0 * power);
        Self { low: (low / step).floor() * step, high: (high / step).ceil() * step, step, top_px, bottom_px }
    }

    pub fn y(&self, value: f64) -> f64 {
        let part = (value.clamp(self.low, self.high) - self.low) / (self.high - self.low);
        self.bottom_px + part * (self.top_px - self.bottom_px)
    }

    /// Values with their words.
    pub fn ticks(&self) -> Vec<(f64, String)> {
        let count = ((self.high - self.low) / self.step).round();
        // A dozen.
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
        let count = count as u32;
        let value = |tick: u32| self.low + f64::from(tick) * self.step;
        (0..=count).map(|tick| (value(tick), number(value(tick), usize::from(self.step < 1.0)))).collect()
    }
}

/// Time from left to right, seconds since 1970.
#[derive(Debug, Clone)]
pub(super) struct TimeScale {
    pub zone: Tz,
    pub begin_s: i64,
    pub end_s: i64,
    pub left_px: f64,
    pub right_px: f64,
}

/// A mark on the time axis.
#[derive(Debug, PartialEq)]
pub(super) struct Tick {
    pub at_s: i64,
    pub label: String,
    /// Abbreviation of the offset, where a reader needs it.
    pub offset: Option<String>,
}

/// A change of the zone's offset.
#[derive(Debug, PartialEq)]
pub(super) struct Shift {
    pub at_s: i64,
    pub from: String,
    pub to: String,
}

#[derive(Debug, Clone, Copy)]
enum Every {
    Minutes(i64),
    Days(i32),
    Months(i32),
}

const MINUTES: [i64; 11] = [1, 5, 10, 15, 30, 60, 120, 180, 240, 360, 720];
const DAYS: [i32; 4] = [1, 2, 7, 14];
const MONTHS: [i32; 10] = [1, 2, 3, 6, 12, 24, 60, 120, 1200, 12_000];

impl TimeScale {
    pub fn x(&self, at_s: i64) -> f64 {
        let part = (at_s - self.begin_s) as f64 / (self.end_s - self.begin_s).max(1) as f64;
        self.left_px + part.clamp(0.0, 1.0) * (self.right_px - self.left_px)
    }

    /// Marks at round local times; one that comes twice is there twice, one that never comes is not there.
    pub fn ticks(&self) -> Vec<Tick> {
        let every = self.every();
        let mut before = None;
        let times =
            self.times(every).into_iter().filter(|time| (self.begin_s..=self.end_s).contains(&time.timestamp()));
        let mut ticks = Vec::new();
        for time in times {
            let offset = time.offset().fix();
            let twice =
                matches!(self.zone.from_local_datetime(&time.naive_local()), chrono::LocalResult::Ambiguous(..));
            let is_news = before.replace(offset) != Some(offset) || twice;
            ticks.push(Tick {
                at_s: time.timestamp(),
                label: time.format(every.format(time.time())).to_string(),
                offset: is_news.then(|| abbreviation(&time)),
            });
        }
        ticks
    }

    /// Changes of the offset on the way.
    pub fn shifts(&self) -> Vec<Shift> {
        let step_s = ((self.end_s - self.begin_s) / 100_000).max(900);
        let steps = (self.end_s - self.begin_s) / step_s;
        let times = (0..=steps).map(|step| self.begin_s + step * step_s).filter_map(|at_s| self.local(at_s));
        let mut before: Option<DateTime<Tz>> = None;
        let mut shifts = Vec::new();
        for time in times {
            if let Some(before) = before.replace(time).filter(|before| before.offset().fix() != time.offset().fix()) {
                let [from, to] = [abbreviation(&before), abbreviation(&time)];
                shifts.push(Shift { at_s: time.timestamp(), from, to });
            }
        }
        shifts
    }

    pub fn local(&self, at_s: i64) -> Option<DateTime<Tz>> {
        DateTime::<Utc>::from_timestamp(at_s, 0).map(|time| time.with_timezone(&self.zone))
    }

    fn every(&self) -> Every {
        let minutes = (self.end_s - self.begin_s) / 60;
        let days = minutes / 1440;
        let fits = |each: i64| minutes / each < MOST_TICKS;
        if let Some(each) = MINUTES.into_iter().find(|each| fits(*each)) {
            return Every::Minutes(each);
        }
        if let Some(each) = DAYS.into_iter().find(|each| fits(1440 * i64::from(*each))) {
            return Every::Days(each);
        }
        let each = MONTHS.into_iter().find(|each| days / (30 * i64::from(*each)) < MOST_TICKS);
        Every::Months(each.unwrap_or(120_000))
    }

    fn times(&self, every: Every) -> Vec<DateTime<Tz>> {
        let [Some(first), Some(last)] = [self.begin_s, self.end_s].map(|at_s| self.local(at_s)) else {
            return Vec::new();
        };
        let [first, last] = [first, last].map(|time| time.date_naive());
        match every {
            Every::Minutes(each) => {
                let minutes = (0..DAY_S / 60 / each).map(|count| TimeDelta::minutes(count * each));
                let days = first.iter_days().take_while(|day| *day <= last);
                let local =
                    days.flat_map(|day| minutes.clone().map(move |minutes| day.and_time(NaiveTime::MIN) + minutes));
                local
                    .flat_map(|local| {
                        let found = self.zone.from_local_datetime(&local);
                        [found.earliest(), found.latest().filter(|latest| Some(*latest) != found.earliest())]
                    })
                    .flatten()
                    .collect()
            }
            Every::Days(each) => {
                let days = first.iter_days().take_while(|day| *day <= last);
                days.filter(|day| day.num_days_from_ce() % each == 0).filter_map(|day| self.begin_of(day)).collect()
            }
            Every::Months(each) => {
                let month = |day: NaiveDate| day.year() * 12 + day.month0().cast_signed();
                let begin = (month(first) + each - 1).div_euclid(each) * each;
                let months = (begin..=month(last)).step_by(usize::try_from(each).unwrap_or(1));
                let day = |month: i32| {
                    NaiveDate::from_ymd_opt(month.div_euclid(12), month.rem_euclid(12).cast_unsigned() + 1, 1)
                };
                months.filter_map(day).filter_map(|day| self.begin_of(day)).collect()
            }
        }
    }

    /// Where midnight is left out, the day begins an hour later.
    fn begin_of(&self, day: NaiveDate) -> Option<DateTime<Tz>> {
        let midnight = day.and_time(NaiveTime::MIN);
        let at = |local| self.zone.from_local_datetime(&local).earliest();
        at(midnight).or_else(|| at(midnight + TimeDelta::hours(1)))
    }
}

impl Every {
    fn format(self, time: NaiveTime) -> &'static str {
        match self {
            Self::Minutes(_) if time != NaiveTime::MIN => "%H:%M",
            Self::Minutes(_) | Self::Days(_) => "%-d %b",
            Self::Months(each) if each % 12 == 0 => "%Y",
            Self::Months(_) => "%b %Y",
        }
    }
}

/// As in "CEST (UTC+02:00)".
pub(super) fn in_full(time: &DateTime<Tz>) -> String {
    let short = abbreviation(time);
    let offset = time.format("UTC%:z").to_string();
    if short == "UTC" || offset.contains(&short) { offset } else { format!("{short} ({offset})") }
}

fn abbreviation(time: &DateTime<Tz>) -> String {
    time.format("%Z").to_string()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scale(begin: &str, end: &str) -> TimeScale {
        let [begin_s, end_s] = [begin, end].map(|time| time.parse::<DateTime<Utc>>().unwrap().timestamp());
        TimeScale { zone: Tz::Europe__Oslo, begin_s, end_s, left_px: 0.0, right_px: 100.0 }
    }

    fn told(scale: &TimeScale) -> Vec<String> {
        let ticks = scale.ticks().into_iter();
        ticks.map(|tick| format!("{}{}", tick.label, tick.offset.map_or(String::new(), |o| format!(" {o}")))).collect()
    }

    #[test]
    fn an_hour_that_comes_twice_is_there_twice() {
        let autumn = scale("2031-10-25T22:00:00Z", "2031-10-26T08:00:00Z");
        let hours = ["26 Oct CEST", "01:00", "02:00 CEST", "02:00 CET", "03:00", "04:00", "05:00", "06:00"];
        assert_eq!(told(&autumn)[..8], hours);
        let at_s = scale("2031-10-26T01:00:00Z", "2031-10-26T08:00:00Z").begin_s;
        assert_eq!(autumn.shifts(), [Shift { at_s, from: "CEST".into(), to: "CET".into() }]);
    }

    #[test]
    fn an_hour_that_never_comes_is_not_there() {
        let spring = scale("2031-03-29T23:00:00Z", "2031-03-30T06:00:00Z");
        assert_eq!(told(&spring)[..4], ["30 Mar CET", "01:00", "03:00 CEST", "04:00"]);
    }

    #[test]
    fn every_span_has_a_few_ticks() {
        for hours in [1_i64, 3, 24, 25, 49, 24 * 9, 24 * 40, 24 * 366, 24 * 3653, 24 * 365_300] {
            let begin = scale("2031-01-01T00:00:00Z", "2031-01-01T00:00:00Z");
            let scale = TimeScale { end_s: begin.begin_s + 3600 * hours, ..begin };
            let ticks = told(&scale);
            assert!((2..=26).contains(&ticks.len()), "{hours} h: {ticks:?}");
        }
    }

    #[test]
    fn megawatts_are_round_and_all_are_within() {
        let scale = Scale::new([-42.0, 973.0], 0.0, 100.0, 6.0);
        let words: Vec<_> = scale.ticks().into_iter().map(|(_, word)| word).collect();
        assert_eq!(words, ["−200", "0", "200", "400", "600", "800", "1000"]);
        assert!(scale.y(973.0) >= 0.0 && scale.y(-42.0) <= 100.0);
        for values in [vec![], vec![f64::NAN], vec![5.0], vec![f64::INFINITY, -1e300], vec![0.0, 1e-300]] {
            let scale = Scale::new(values.clone(), 0.0, 100.0, 6.0);
            assert!((1..20).contains(&scale.ticks().len()), "{values:?}");
            assert!(scale.y(3.0).is_finite());
        }
    }
}
