use std::collections::VecDeque;

use chrono::{DateTime, Utc};

use crate::desk::State;

/// Minutes of headroom kept.
const MINUTES_KEPT: usize = 120;

/// Lowest headroom of each of the last minutes.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct History {
    /// Unix minute of the newest entry.
    minute: i64,
    lowest_mw: VecDeque<Option<f64>>,
}

impl History {
    pub(super) fn take(&mut self, time: DateTime<Utc>, headroom_mw: Option<f64>) {
        let minute = time.timestamp().div_euclid(60);
        let fresh = if self.lowest_mw.is_empty() { 1 } else { (minute - self.minute).max(0) };
        for _ in 0..usize::try_from(fresh).map_or(MINUTES_KEPT, |fresh| fresh.min(MINUTES_KEPT)) {
            if self.lowest_mw.len() == MINUTES_KEPT {
                self.lowest_mw.pop_front();
            }
            self.lowest_mw.push_back(None);
        }
        self.minute = minute;
        if let (Some(lowest), Some(headroom)) = (self.lowest_mw.back_mut(), headroom_mw) {
            *lowest = Some(lowest.map_or(headroom, |low| low.min(headroom)));
        }
    }

    /// The last minutes, newest last; `None` where nothing is known.
    pub fn minutes(&self) -> impl ExactSizeIterator<Item = Option<f64>> + '_ {
        self.lowest_mw.iter().copied()
    }

    /// MW gained since so many minutes ago; `None` where either is unknown.
    pub fn gained_mw(&self, minutes: usize) -> Option<f64> {
        let then = self.lowest_mw.len().checked_sub(minutes + 1)?;
        Some((*self.lowest_mw.back()?)? - self.lowest_mw[then]?)
    }
}

/// Entries of a strip; when they are used up, each comes to stand for twice the time.
const STRIP_ENTRIES: usize = 2048;

/// The worst state in each stretch of time, over everything seen.
#[derive(Debug, Clone, PartialEq)]
pub struct Strip {
    start_s: i64,
    entry_s: i64,
    worst: Vec<Option<State>>,
}

impl Default for Strip {
    fn default() -> Self {
        Self { start_s: 0, entry_s: 60, worst: Vec::new() }
    }
}

impl Strip {
    /// Takes in a state at a time; times before the first are left out.
    pub fn take(&mut self, time: DateTime<Utc>, state: State) {
        let time_s = time.timestamp();
        if self.worst.is_empty() {
            self.start_s = time_s.div_euclid(60) * 60;
        }
        let Ok(since_start_s) = u64::try_from(time_s - self.start_s) else { return };
        while since_start_s / self.entry_s.unsigned_abs() >= STRIP_ENTRIES as u64 {
            self.halve();
        }
        let index = usize::try_from(since_start_s / self.entry_s.unsigned_abs()).unwrap_or(0);
        if index >= self.worst.len() {
            self.worst.resize(index + 1, None);
        }
        self.worst[index] = worse(self.worst[index], Some(state));
    }

    fn halve(&mut self) {
        self.worst = self.worst.chunks(2).map(|pair| pair.iter().copied().fold(None, worse)).collect();
        self.entry_s *= 2;
    }

    /// The worst state seen from a time up to before another.
    pub fn worst_between(&self, from: DateTime<Utc>, until: DateTime<Utc>) -> Option<State> {
        let index = |time: DateTime<Utc>| {
            let entries = (time.timestamp() - self.start_s).div_euclid(self.entry_s);
            usize::try_from(entries.max(0)).unwrap_or(0).min(self.worst.len())
        };
        let (first, last) = (index(from), index(until));
        self.worst[first..last.max(first + 1).min(self.worst.len()).max(first)].iter().copied().fold(None, worse)
    }
}

/// The worse of two states; nothing known is the best.
fn worse(one: Option<State>, other: Option<State>) -> Option<State> {
    if one.map(State::severity) >= other.map(State::severity) { one } else { other }
}

#[cfg(test)]
mod tests {
    use chrono::TimeDelta;

    use super::*;
    use crate::screen::state::sample::time;

    #[test]
    fn history_keeps_the_lowest_of_each_minute_and_forgets() {
        let mut history = History::default();
        for (second, headroom) in [(0, Some(9.0)), (20, Some(4.0)), (59, None), (60, Some(7.0)), (200, Some(5.0))] {
            history.take(time(second), headroom);
        }
        assert_eq!(history.minutes().collect::<Vec<_>>(), [Some(4.0), Some(7.0), None, Some(5.0)]);
        assert_eq!(history.gained_mw(3), Some(1.0));
        assert_eq!(history.gained_mw(1), None);
        assert_eq!(history.gained_mw(9), None);
        history.take(time(1_000_000_000), Some(1.0));
        assert_eq!(history.minutes().len(), MINUTES_KEPT);
        assert_eq!(history.minutes().flatten().count(), 1);
    }

    #[test]
    fn a_strip_keeps_the_worst_and_stays_bounded() {
        let mut strip = Strip::default();
        for minute in 0..10_000 {
            let state = if minute == 7000 { State::Spent } else { State::Ample };
            strip.take(time(60 * minute), state);
        }
        assert!(strip.worst.len() <= STRIP_ENTRIES);
        let around = |minute: i64| strip.worst_between(time(60 * minute), time(60 * minute) + TimeDelta::minutes(16));
        assert_eq!(around(6992), Some(State::Spent));
        assert_eq!(around(100), Some(State::Ample));
        assert_eq!(around(20_000), None);
        assert_eq!(strip.worst_between(time(60), time(0)), Some(State::Ample));
    }
}
