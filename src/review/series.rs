use chrono::{DateTime, Utc};
use serde::{Deserialize, Serialize};

use crate::desk::{Assessment, State};

/// Shortest time that a slot stands for, s; longer ones are this times a power of two.
const SLOT_S: i64 = 300;
/// More slots would not be told apart on paper.
const MOST_SLOTS: usize = 1024;

/// The course of a corridor in slots of time: what was lowest and highest in each.
///
/// Slots begin at multiples of their length since 1970, and become longer when there are too many: days added in any grouping give
/// the same series.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Series {
    /// Length of a slot, s.
    pub slot_s: i64,
    /// In order; where nothing is known there is none.
    pub slots: Vec<Slot>,
}

/// One slot of a [`Series`].
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Slot {
    /// Begin, s since 1970.
    pub at_s: i64,
    /// Lowest and highest transfer, MW, positive from `from` to `to`.
    pub transfer_mw: Option<[f64; 2]>,
    /// Lowest and highest headroom, MW.
    pub headroom_mw: Option<[f64; 2]>,
    /// The worst state.
    pub state: State,
}

impl Default for Series {
    fn default() -> Self {
        Self { slot_s: SLOT_S, slots: Vec::new() }
    }
}

impl Series {
    /// The same in no more slots than this, which may be longer.
    #[must_use]
    pub fn in_at_most(mut self, slots: usize) -> Self {
        while self.slots.len() > slots.max(1) {
            self.lengthen();
        }
        self
    }

    pub(super) fn take(&mut self, assessment: &Assessment, transfer_mw: Option<f64>) {
        let twice = |mw: f64| [mw, mw];
        self.push(Slot {
            at_s: self.slot_of(assessment.time),
            transfer_mw: transfer_mw.map(twice),
            headroom_mw: assessment.headroom_mw.map(twice),
            state: assessment.state,
        });
    }

    pub(super) fn merge(&mut self, other: &Self) {
        while self.slot_s < other.slot_s {
            self.lengthen();
        }
        for slot in &other.slots {
            self.push(Slot { at_s: slot.at_s.div_euclid(self.slot_s) * self.slot_s, ..*slot });
        }
    }

    fn slot_of(&self, time: DateTime<Utc>) -> i64 {
        time.timestamp().div_euclid(self.slot_s) * self.slot_s
    }

    /// Adds a slot that is not before the last one.
    fn push(&mut self, slot: Slot) {
        match self.slots.last_mut() {
            Some(last) if last.at_s == slot.at_s => last.merge(&slot),
            _ => self.slots.push(slot),
        }
        while self.slots.len() > MOST_SLOTS {
            self.lengthen();
        }
    }

    fn lengthen(&mut self) {
        self.slot_s *= 2;
        let slots = std::mem::take(&mut self.slots);
        for slot in slots {
            self.push(Slot { at_s: slot.at_s.div_euclid(self.slot_s) * self.slot_s, ..slot });
        }
    }
}

impl Slot {
    fn merge(&mut self, other: &Self) {
        self.transfer_mw = both(self.transfer_mw, other.transfer_mw);
        self.headroom_mw = both(self.headroom_mw, other.headroom_mw);
        if other.state.severity() > self.state.severity() {
            self.state = other.state;
        }
    }
}

fn both(one: Option<[f64; 2]>, other: Option<[f64; 2]>) -> Option<[f64; 2]> {
    match (one, other) {
        (Some([low, high]), Some([lower, higher])) => Some([low.min(lower), high.max(higher)]),
        (one, other) => one.or(other),
    }
}
