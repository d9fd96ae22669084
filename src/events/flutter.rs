use std::collections::VecDeque;

use chrono::{DateTime, TimeDelta, Utc};

/// So many lines on one fact within this time are too many: it flutters.
const LINES: usize = 3;
const LINES_WITHIN: TimeDelta = TimeDelta::minutes(2);
/// Flutter is summed up when it has been calm for so long,
const CALM: TimeDelta = TimeDelta::minutes(1);
/// or has gone on for so long: this at first, that from then on.
const LONG: TimeDelta = TimeDelta::minutes(2);
const VERY_LONG: TimeDelta = TimeDelta::minutes(10);

/// Something that changes now and then, and whether a change is worth a line. Time is the frames'.
#[derive(Debug, Clone)]
pub struct Fact<V> {
    told: V,
    now: V,
    /// The last value besides the one told.
    other: Option<V>,
    hold: TimeDelta,
    since: DateTime<Utc>,
    /// Changes since the last line, and when the first of them was.
    changes: u32,
    first: DateTime<Utc>,
    lines: VecDeque<DateTime<Utc>>,
    flutters: bool,
}

/// What to tell of a fact.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum News<V> {
    /// It has changed for good.
    Changed {
        /// Before.
        from: V,
        /// From now on.
        to: V,
    },
    /// It was otherwise for a moment.
    Passed {
        /// What it was then.
        was: V,
        /// How long.
        lasted: TimeDelta,
    },
    /// It changed to and fro.
    Fluttered {
        /// One of the two.
        from: V,
        /// The other.
        to: V,
        /// How often it changed.
        changes: u32,
        /// In how long.
        within: TimeDelta,
        /// How it is now.
        now: V,
    },
}

impl<V: Clone + PartialEq> Fact<V> {
    /// Known from a time on; a change is told once it has lasted for `hold`.
    pub fn new(value: V, time: DateTime<Utc>, hold: TimeDelta) -> Self {
        Self {
            told: value.clone(),
            now: value,
            other: None,
            hold,
            since: time,
            changes: 0,
            first: time,
            lines: VecDeque::new(),
            flutters: false,
        }
    }

    /// Whether all is told.
    pub fn is_settled(&self) -> bool {
        self.changes == 0
    }

    /// The value last told.
    pub fn told(&self) -> &V {
        &self.told
    }

    /// Takes a value at a time; returns what is to be told, and when it began.
    pub fn take(&mut self, time: DateTime<Utc>, value: V) -> Option<(DateTime<Utc>, News<V>)> {
        if value != self.now {
            self.change(time, value);
        }
        let (held, going_on) = (time - self.since, time - self.first);
        let (hold, long) = if self.flutters { (CALM, VERY_LONG) } else { (self.hold, LONG) };
        if self.is_settled() || held < hold && going_on < long {
            return None;
        }
        let (from, to) = (self.told.clone(), self.now.clone());
        let other = self.other.clone().unwrap_or_else(|| to.clone());
        let news = if self.changes <= 2 && from != to {
            (self.since, News::Changed { from: from.clone(), to })
        } else if self.changes <= 2 {
            (self.first, News::Passed { was: other, lasted: self.since - self.first })
        } else {
            let within = if held < hold { going_on } else { self.since - self.first };
            let fluttered = News::Fluttered { from: from.clone(), to: other, changes: self.changes, within, now: to };
            (self.since, fluttered)
        };
        self.flutters = held < CALM && (matches!(news.1, News::Fluttered { .. }) || self.tells_much(time));
        if self.now != from {
            self.other = Some(from);
        }
        self.told = self.now.clone();
        self.changes = 0;
        Some(news)
    }

    fn change(&mut self, time: DateTime<Utc>, value: V) {
        // Something new ends the patience with what was to and fro.
        let is_new = value != self.told && self.other.as_ref() != Some(&value);
        if is_new || self.changes == 0 {
            (self.first, self.changes) = (time, 0);
        }
        self.flutters &= !is_new;
        self.changes += 1;
        if value != self.told {
            self.other = Some(value.clone());
        }
        (self.now, self.since) = (value, time);
    }

    fn tells_much(&mut self, time: DateTime<Utc>) -> bool {
        self.lines.push_back(time);
        while self.lines.len() > LINES {
            self.lines.pop_front();
        }
        self.lines.len() == LINES && time - self.lines[0] <= LINES_WITHIN
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample::time;

    /// Lines told of a course that is sampled every second: time begun, and what.
    fn told(seconds: i64, course: impl Fn(i64) -> u8) -> Vec<(i64, News<u8>)> {
        let mut fact = Fact::new(0, time(0), TimeDelta::seconds(5));
        let samples = (0..seconds).filter_map(|second| fact.take(time(second), course(second)));
        samples.map(|(at, news)| ((at - time(0)).num_seconds(), news)).collect()
    }

    #[test]
    fn a_change_is_told_once_with_the_time_it_began() {
        assert_eq!(told(100, |s| u8::from(s >= 10)), [(10, News::Changed { from: 0, to: 1 })]);
        assert_eq!(told(15, |s| u8::from(s >= 11)), [], "it has not lasted yet");
    }

    #[test]
    fn a_moment_is_one_line() {
        let moment = |s| u8::from((10..13).contains(&s));
        assert_eq!(told(100, moment), [(10, News::Passed { was: 1, lasted: TimeDelta::seconds(3) })]);
    }

    #[test]
    fn flutter_is_few_lines_and_ends_with_one() {
        for period in [1, 3, 8, 20, 50] {
            let lines = told(7200, |s| if s < 3600 { u8::from(s / period % 2 == 1) } else { 1 });
            assert!(lines.len() <= 12, "{} lines at a period of {period} s", lines.len());
            let News::Fluttered { now: 1, .. } = lines.last().unwrap().1 else { panic!("{:?}", lines.last()) };
        }
    }

    #[test]
    fn something_worse_is_told_at_once_in_the_midst_of_flutter() {
        let lines = told(700, |s| if s < 600 { u8::from(s / 8 % 2 == 1) } else { 2 });
        assert!(lines.iter().any(|(at, news)| *at == 600 && matches!(news, News::Changed { to: 2, .. })), "{lines:?}");
        let mut fact = Fact::new(0, time(0), TimeDelta::seconds(5));
        let late = (0..620).filter(|&s| {
            let value = if s < 600 { u8::from(s / 8 % 2 == 1) } else { 2 };
            fact.take(time(s), value).is_some() && s >= 600
        });
        assert_eq!(late.collect::<Vec<_>>(), [605]);
    }
}
