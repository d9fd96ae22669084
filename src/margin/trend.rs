//! Better or worse, and the time left: the Theil–Sen slope of the headroom over the last minutes (Theil 1950; Sen,
//! Journal of the American Statistical Association 63, 1968, with its confidence interval by Kendall's variance).

use std::collections::VecDeque;

use chrono::{DateTime, TimeDelta, Utc};
use serde::{Deserialize, Serialize};

const SPAN: TimeDelta = TimeDelta::minutes(10);
const INTERVAL: TimeDelta = TimeDelta::seconds(10);
/// More than fit into the span.
const MOST_SAMPLES: usize = 64;
const FEWEST_SAMPLES: usize = 8;
/// A slope over less is not looked at.
const SHORTEST: TimeDelta = TimeDelta::seconds(110);
/// Standard normal quantile of the one-sided 99.5 % level at which a slope counts.
const SIGNIFICANCE: f64 = 2.576;
/// A slope over ten minutes says nothing about the day after.
const LONGEST_MINUTES: f64 = 720.0;

/// A headroom, MW, and when it was.
type Sample = (DateTime<Utc>, f64);

/// The headroom's course over the last ten minutes.
#[derive(Debug, Clone, Default, Serialize, Deserialize)]
#[serde(try_from = "Course")]
pub struct Trend {
    samples: VecDeque<Sample>,
    #[serde(skip)]
    slopes: Vec<f64>,
    #[serde(skip)]
    mw_per_minute: Option<f64>,
}

/// What of a trend is kept.
#[derive(Deserialize)]
struct Course {
    samples: VecDeque<Sample>,
}

impl TryFrom<Course> for Trend {
    type Error = &'static str;

    fn try_from(Course { samples }: Course) -> Result<Self, Self::Error> {
        let ascends = samples.iter().zip(samples.iter().skip(1)).all(|(earlier, later)| earlier.0 < later.0);
        if samples.len() > MOST_SAMPLES || !ascends {
            return Err("no course that a headroom can have taken");
        }
        let mut trend = Self { samples, ..Self::default() };
        trend.mw_per_minute = trend.slope();
        Ok(trend)
    }
}

impl Trend {
    /// Forgets: what comes is of another kind.
    pub fn clear(&mut self) {
        self.samples.clear();
        self.mw_per_minute = None;
    }

    /// Takes a headroom in, MW; more often than every ten seconds adds nothing.
    pub fn push(&mut self, time: DateTime<Utc>, headroom_mw: f64) {
        let too_soon = self.samples.back().is_some_and(|(last, _)| time - *last < INTERVAL);
        if too_soon || !headroom_mw.is_finite() {
            return;
        }
        self.samples.push_back((time, headroom_mw));
        while self.samples.front().is_some_and(|(first, _)| time - *first > SPAN) {
            self.samples.pop_front();
        }
        self.mw_per_minute = self.slope();
    }

    /// Slope of the headroom, MW per minute, where it is significant.
    pub fn mw_per_minute(&self) -> Option<f64> {
        self.mw_per_minute
    }

    /// Minutes until a headroom has fallen to a level at the present slope, if it falls significantly and within
    /// twelve hours.
    pub fn minutes_to(&self, level_mw: f64, headroom_mw: f64) -> Option<f64> {
        let falling = self.mw_per_minute.filter(|slope| *slope < 0.0)?;
        let minutes = (level_mw - headroom_mw) / falling;
        (minutes > 0.0 && minutes <= LONGEST_MINUTES).then_some(minutes)
    }

    fn slope(&mut self) -> Option<f64> {
        let count = self.samples.len();
        let [(first, _), (last, _)] = [self.samples.front()?, self.samples.back()?];
        if count < FEWEST_SAMPLES || *last - *first < SHORTEST {
            return None;
        }
        let samples = &*self.samples.make_contiguous();
        let pairs = || {
            samples
                .iter()
                .enumerate()
                .flat_map(|(index, earlier)| samples[index + 1..].iter().map(move |later| (earlier, later)))
        };
        let (rising, falling) = pairs().fold((0, 0), |(rising, falling), ((_, before), (_, after))| {
            (rising + usize::from(after > before), falling + usize::from(after < before))
        });
        let n = count as f64;
        let spread = SIGNIFICANCE * (n * (n - 1.0) * (2.0 * n + 5.0) / 18.0).sqrt();
        // Ranks of the interval's ends among the ordered slopes (Sen 1968, §5); whole numbers well within range.
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
        let reach = (spread / 2.0).ceil() as usize;
        let all = count * (count - 1) / 2;
        let (low, high) = ((all / 2).saturating_sub(reach), (all / 2 + reach).min(all - 1));
        // The lower end is above zero when no more slopes than come before it are not; and the other way round.
        if all - rising > low && falling <= high {
            return None;
        }
        self.slopes.clear();
        self.slopes.extend(pairs().map(|((earlier, before), (later, after))| {
            (after - before) / ((*later - *earlier).as_seconds_f64() / 60.0)
        }));
        Some(*self.slopes.select_nth_unstable_by(all / 2, f64::total_cmp).1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn trend(headroom_mw: impl Fn(f64) -> f64) -> Trend {
        let mut trend = Trend::default();
        for sample in 0..60 {
            let time = DateTime::UNIX_EPOCH + TimeDelta::seconds(10 * sample);
            trend.push(time, headroom_mw(10.0 * sample as f64 / 60.0));
        }
        trend
    }

    /// Noise of ±20 MW without order.
    fn noise(minutes: f64) -> f64 {
        (minutes * 6.0 * 2.399_963).sin() * 20.0
    }

    #[test]
    fn a_falling_headroom_tells_the_minutes_left() {
        let trend = trend(|minutes| 500.0 - 12.0 * minutes + noise(minutes));
        let minutes = trend.minutes_to(100.0, 382.0).expect("it falls");
        assert!((minutes - 282.0 / 12.0).abs() < 1.5, "{minutes}");
        assert_eq!(trend.minutes_to(400.0, 382.0), None, "already below");
    }

    #[test]
    fn noise_and_a_single_jump_are_no_trend() {
        assert_eq!(trend(noise).mw_per_minute(), None);
        assert_eq!(
            trend(|minutes| if (minutes - 5.0).abs() < 0.01 { -900.0 } else { noise(minutes) }).mw_per_minute(),
            None
        );
    }

    #[test]
    fn frames_once_a_minute_make_a_trend() {
        let mut trend = Trend::default();
        for minute in 0..12 {
            trend.push(DateTime::UNIX_EPOCH + TimeDelta::minutes(minute), 500.0 - 10.0 * minute as f64);
        }
        assert!(trend.minutes_to(0.0, 390.0).is_some_and(|minutes| (minutes - 39.0).abs() < 1e-9));
    }

    #[test]
    fn a_rising_headroom_never_runs_out() {
        let rising = trend(|minutes| 300.0 + 5.0 * minutes);
        assert!(rising.mw_per_minute().is_some_and(|slope| (slope - 5.0).abs() < 1e-9));
        assert_eq!(rising.minutes_to(0.0, 300.0), None);
    }
}
