//! What a recording holds from end to end, and the moments of it that are worth going to.

use std::{collections::HashMap, sync::Arc};

use chrono::{DateTime, Utc};

use super::Strip;
use crate::{
    alarm::Priority,
    desk::State,
    events::{Event, EventKind},
};

/// Moments of one kind that are kept; there are more in no day that a person can read.
const KEPT_OF_A_KIND: usize = 2000;

/// A recording from end to end, as far as it has been gone through. Cheap to clone.
#[derive(Debug, Clone, Default)]
pub struct Survey {
    /// Time of the first frame and of the last, once they are known.
    pub extent: Option<(DateTime<Utc>, DateTime<Utc>)>,
    /// Gone through up to here.
    pub until: Option<DateTime<Utc>>,
    /// All of it is gone through, or it cannot be read any further.
    pub ended: bool,
    /// Why it could not be read.
    pub trouble: Option<Arc<str>>,
    /// The worst state of all corridors.
    pub worst: Strip,
    /// The states of each, in the order of the configuration.
    pub states: Vec<Strip>,
    /// What happened, in order.
    pub moments: Vec<Arc<Moment>>,
    /// Moments that were one too many of their kind.
    pub left_out: usize,
    counts: HashMap<&'static str, usize>,
}

/// A place in a recording that is worth going to.
#[derive(Debug, Clone, PartialEq)]
pub struct Moment {
    /// When.
    pub time: DateTime<Utc>,
    /// Which corridor; `None`: the feed, or all of them.
    pub corridor: Option<Arc<str>>,
    /// Of what kind.
    pub kind: MomentKind,
    /// The state it led to, or that held there.
    pub state: Option<State>,
    /// What it is about.
    pub text: String,
}

/// What makes a moment.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum MomentKind {
    /// Something happened.
    Event(EventKind),
    /// An alarm began to call.
    Raised(Priority),
    /// The headroom was at its lowest.
    Low {
        /// MW.
        headroom_mw: f64,
        /// Of the whole day, rather than of a stretch in which it was thin or spent.
        of_day: bool,
    },
    /// Somebody put a mark there.
    Mark,
}

impl MomentKind {
    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Event(kind) => kind.word(),
            Self::Raised(_) => "raised",
            Self::Low { .. } => "low",
            Self::Mark => "mark",
        }
    }
}

impl From<Event> for Moment {
    fn from(event: Event) -> Self {
        let Event { time, corridor, kind, state, text } = event;
        Self { time, corridor, kind: MomentKind::Event(kind), state, text }
    }
}

impl Survey {
    /// Adds a moment in its place, unless there are too many of its kind.
    pub fn add(&mut self, moment: Moment) {
        if let MomentKind::Low { of_day, .. } = moment.kind {
            let is_low = |other: &Moment| matches!(other.kind, MomentKind::Low { .. });
            let from_then = self.moments.iter_mut().rev().take_while(|other| other.time >= moment.time);
            let mut same = from_then
                .filter(|other| other.time == moment.time && other.corridor == moment.corridor && is_low(other));
            // The lowest of a day may be that of a dip, too.
            if let Some(same) = same.next() {
                if of_day {
                    *same = Arc::new(moment);
                }
                return;
            }
        }
        let count = self.counts.entry(moment.kind.word()).or_default();
        if *count == KEPT_OF_A_KIND {
            self.left_out += 1;
            return;
        }
        *count += 1;
        insert(&mut self.moments, moment);
    }

    /// How much of it has been gone through, 0 to 1.
    pub fn done(&self) -> f64 {
        match (self.ended, self.extent, self.until) {
            (true, ..) => 1.0,
            (_, Some((first, last)), Some(until)) if last > first => {
                ((until - first).as_seconds_f64() / (last - first).as_seconds_f64()).clamp(0.0, 1.0)
            }
            _ => 0.0,
        }
    }
}

/// Puts a moment where its time says, after those of the same time.
pub(super) fn insert(moments: &mut Vec<Arc<Moment>>, moment: Moment) {
    let later = moments.iter().rev().take_while(|other| other.time > moment.time).count();
    moments.insert(moments.len() - later, Arc::new(moment));
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample::time;

    #[test]
    fn moments_are_in_order_and_a_flood_of_one_kind_hides_no_other() {
        let mut survey = Survey::default();
        let event = |second: i64, kind| {
            Moment::from(Event { time: time(second), corridor: None, kind, state: None, text: String::new() })
        };
        for second in 0..3000 {
            survey.add(event(3000 - second, EventKind::Step));
        }
        survey.add(event(10_000, EventKind::Trip));
        let kind = MomentKind::Low { headroom_mw: 3.0, of_day: true };
        survey.add(Moment { kind, ..event(5000, EventKind::Trip) });
        assert_eq!((survey.moments.len(), survey.left_out), (KEPT_OF_A_KIND + 2, 1000));
        assert!(survey.moments.is_sorted_by_key(|moment| moment.time));
        assert_eq!(survey.moments.last().unwrap().kind, MomentKind::Event(EventKind::Trip));
    }
}
