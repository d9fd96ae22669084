//! The last seconds as short means, and means over windows of them.

use std::collections::VecDeque;

use nalgebra::{Complex, Matrix2};
use serde::{Deserialize, Serialize};

use super::terminal::{Measured, Observation};

/// Bins kept: enough for the windows, the gap and the wait for a maximum at any frame rate.
const CAPACITY: usize = 160;

/// Mean of the frames of a fraction of a second, or one frame where frames are rarer.
#[derive(Debug, Clone, Copy, Serialize, Deserialize)]
pub(super) struct Bin {
    start_s: f64,
    pub(super) time_s: f64,
    count: u32,
    pub(super) measured: Measured,
    y: Matrix2<Complex<f64>>,
    /// Counts topology changes and gaps: a window lies within one.
    pub(super) segment: u64,
}

impl Bin {
    pub(super) fn new(time_s: f64, segment: u64, seen: &Observation) -> Self {
        Self { start_s: time_s, time_s, count: 1, measured: seen.measured(), y: seen.y, segment }
    }

    /// Whether a frame at `time_s` still belongs here.
    pub(super) fn holds(&self, time_s: f64, segment: u64, length_s: f64) -> bool {
        segment == self.segment && time_s - self.start_s < length_s
    }

    /// Whether it can be added to.
    pub(super) fn is_possible(&self) -> bool {
        (1..u32::MAX / 2).contains(&self.count)
    }

    pub(super) fn add(&mut self, time_s: f64, seen: &Observation) {
        self.count += 1;
        let share = 1.0 / f64::from(self.count);
        self.time_s += (time_s - self.time_s) * share;
        self.measured += (seen.measured() - self.measured) * share;
        self.y += (seen.y - self.y) * Complex::from(share);
    }
}

/// Mean over some bins of one segment.
#[derive(Debug, Clone, Copy)]
pub(super) struct Window {
    pub(super) measured: Measured,
    pub(super) y: Matrix2<Complex<f64>>,
    pub(super) count: usize,
    pub(super) first_s: f64,
    pub(super) segment: u64,
    pub(super) last_s: f64,
}

/// The recent bins, oldest first.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(transparent)]
pub(super) struct Recent {
    bins: VecDeque<Bin>,
}

impl Recent {
    pub(super) fn new() -> Self {
        Self { bins: VecDeque::with_capacity(CAPACITY) }
    }

    /// Without what lies before a time.
    pub(super) fn since(&self, from_s: f64) -> Self {
        Self { bins: self.bins.iter().filter(|bin| bin.time_s >= from_s).copied().collect() }
    }

    /// Whether it is no more than it could be by itself.
    pub(super) fn is_possible(&self) -> bool {
        self.bins.len() <= CAPACITY && self.bins.iter().all(Bin::is_possible)
    }

    pub(super) fn push(&mut self, bin: Bin) {
        if self.bins.len() == CAPACITY {
            self.bins.pop_front();
        }
        self.bins.push_back(bin);
    }

    pub(super) fn iter(&self) -> impl DoubleEndedIterator<Item = &Bin> {
        self.bins.iter()
    }

    /// Change between the last two bins of one segment.
    pub(super) fn last_change(&self) -> Option<Measured> {
        let mut newest = self.bins.iter().rev();
        let (b, a) = (newest.next()?, newest.next()?);
        (a.segment == b.segment).then(|| b.measured - a.measured)
    }

    /// Mean over the bins from `from_s` to `to_s`, all of one segment.
    pub(super) fn mean(&self, from_s: f64, to_s: f64) -> Option<Window> {
        let mut found: Option<Window> = None;
        for bin in self.bins.iter().rev().skip_while(|b| b.time_s > to_s).take_while(|b| b.time_s >= from_s) {
            match &mut found {
                None => {
                    let (measured, y, at) = (bin.measured, bin.y, bin.time_s);
                    let segment = bin.segment;
                    found = Some(Window { measured, y, count: 1, first_s: at, last_s: at, segment });
                }
                Some(window) if window.segment != bin.segment => return None,
                Some(window) => {
                    window.measured += bin.measured;
                    window.y += bin.y;
                    window.count += 1;
                    window.first_s = bin.time_s;
                }
            }
        }
        let mut window = found?;
        window.measured /= window.count as f64;
        window.y /= Complex::from(window.count as f64);
        Some(window)
    }
}
