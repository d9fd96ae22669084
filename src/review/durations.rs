use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// Beyond it, headrooms are no longer told apart, MW.
const FARTHEST_MW: f64 = 100_000.0;

/// For how long the headroom was at each whole megawatt: the duration curve, exact to 1 MW however many days are added.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Durations {
    /// Milliseconds by headroom rounded down, MW.
    ms_by_mw: BTreeMap<i32, i64>,
}

impl Durations {
    pub(super) fn add(&mut self, headroom_mw: f64, ms: i64) {
        // Whole and within the bounds.
        #[allow(clippy::cast_possible_truncation)]
        let mw = headroom_mw.clamp(-FARTHEST_MW, FARTHEST_MW).floor() as i32;
        *self.ms_by_mw.entry(mw).or_default() += ms;
    }

    pub(super) fn merge(&mut self, other: &Self) {
        for (mw, ms) in &other.ms_by_mw {
            *self.ms_by_mw.entry(*mw).or_default() += ms;
        }
    }

    /// All of them, ms.
    pub fn total_ms(&self) -> i64 {
        self.ms_by_mw.values().sum()
    }

    /// Time with this headroom or more, ms.
    pub fn at_least_ms(&self, headroom_mw: i32) -> i64 {
        self.ms_by_mw.range(headroom_mw..).map(|(_, ms)| ms).sum()
    }

    /// The most whole megawatts that were there for this part of the time (0 to 1); `None` without any time.
    pub fn held_for(&self, part: f64) -> Option<i32> {
        let wanted = part * self.total_ms() as f64;
        let mut held = 0;
        let from_the_top = self.ms_by_mw.iter().rev();
        let mut reached = from_the_top.map(|(mw, ms)| {
            held += ms;
            (*mw, held as f64)
        });
        reached.find(|(_, held)| *held >= wanted).map(|(mw, _)| mw).or(self.ms_by_mw.keys().next().copied())
    }

    /// The curve, highest headroom first: whole megawatts, and time with at least these, ms.
    pub fn curve(&self) -> impl Iterator<Item = (i32, i64)> + '_ {
        self.ms_by_mw.iter().rev().scan(0, |held, (mw, ms)| {
            *held += ms;
            Some((*mw, *held))
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_curve_falls_and_its_parts_are_found() {
        let mut durations = Durations::default();
        for (mw, ms) in [(10.9, 500), (-3.1, 250), (10.0, 250), (1e30, 1000)] {
            durations.add(mw, ms);
        }
        assert_eq!(durations.total_ms(), 2000);
        assert_eq!(durations.curve().collect::<Vec<_>>(), [(100_000, 1000), (10, 1750), (-4, 2000)]);
        let held: Vec<_> = [0.5, 0.51, 0.9, 1.0].map(|part| durations.held_for(part)).to_vec();
        assert_eq!(held, [Some(100_000), Some(10), Some(-4), Some(-4)]);
        assert_eq!(durations.at_least_ms(10), 1750);
        assert_eq!(Durations::default().held_for(0.5), None);
        let mut twice = durations.clone();
        twice.merge(&durations);
        assert_eq!(twice.total_ms(), 4000);
    }
}
