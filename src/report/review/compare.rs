//! A corridor's figures: as it was, as it would have been, and what the difference is.

use chrono::{DateTime, Utc};

use super::{
    clock::Clock,
    figures::{NO_BALANCE, minutes, mw, name, room, signed},
};
use crate::{
    desk::State,
    review::{Binding, CorridorReview, Course},
};

/// Parts of the time for which the headroom is told, %.
pub(super) const HELD_PCT: [u8; 5] = [100, 99, 95, 90, 50];

/// One figure of a corridor.
pub(super) struct Row {
    pub what: String,
    pub was: String,
    /// Empty without a what-if.
    pub would: String,
    /// Empty where there is nothing to subtract.
    pub difference: String,
}

/// Both courses of a corridor, to be told side by side.
struct Side<'a> {
    was: &'a Course,
    would: Option<&'a Course>,
}

impl Side<'_> {
    fn number(&self, what: &str, places: usize, show: fn(f64) -> String, of: impl Fn(&Course) -> Option<f64>) -> Row {
        let [was, would] = [Some(self.was), self.would].map(|course| course.map(&of));
        let shown = |value: Option<f64>, course| value.map_or_else(|| unknown(course).into(), show);
        let difference = was.flatten().zip(would.flatten()).map(|(was, would)| signed(would - was, places));
        Row {
            what: what.into(),
            was: was.map_or(String::new(), |was| shown(was, self.was)),
            would: would.zip(self.would).map_or(String::new(), |(would, course)| shown(would, course)),
            difference: difference.unwrap_or_default(),
        }
    }

    fn words(&self, what: &str, of: impl Fn(&Course) -> Option<String>) -> Row {
        let shown = |course: &Course| of(course).unwrap_or_else(|| unknown(course).into());
        Row {
            what: what.into(),
            was: shown(self.was),
            would: self.would.map_or(String::new(), shown),
            difference: String::new(),
        }
    }
}

/// What to say where there is no number.
pub(super) fn unknown(course: &Course) -> &'static str {
    if course.unbalanced.is_some() { NO_BALANCE } else { "never known" }
}

/// When it was worst.
pub(super) fn first_worst(course: &Course) -> Option<DateTime<Utc>> {
    course.unbalanced.map(|unbalanced| unbalanced.first).or(course.least.as_ref().map(|least| least.time))
}

/// All figures of a corridor that are one number or one word.
pub(super) fn rows(clock: &Clock, corridor: &CorridorReview) -> Vec<Row> {
    let side = Side { was: &corridor.was, would: corridor.what_if.as_ref() };
    let least = |course: &Course| course.lowest().cloned();
    let mut rows = vec![
        side.number("lowest transfer, MW", 0, mw, |course| course.transfer_mw.map(|[low, _]| low)),
        side.number("mean transfer, MW", 0, mw, Course::mean_transfer_mw),
        side.number("highest transfer, MW", 0, mw, |course| course.transfer_mw.map(|[_, high]| high)),
        side.number("least headroom, MW", 0, room, |course| least(course).map(|least| least.headroom_mw)),
        side.number("  its spread, ± MW", 0, |sd| mw(sd.ceil()), |course| least(course)?.headroom_sd_mw),
        side.words("  when", |course| first_worst(course).map(|time| clock.when(time))),
        side.words("  set by", |course| least(course)?.binding.as_ref().map(cause)),
        side.number("  transfer then, MW", 0, mw, |course| least(course)?.transfer_mw),
    ];
    rows.extend(HELD_PCT.map(|pct| {
        let held = |course: &Course| course.held_for(f64::from(pct) / 100.0).map(f64::from);
        side.number(&format!("headroom for {pct} % of time, MW"), 0, mw, held)
    }));
    rows.extend(STATES.map(|state| {
        side.number(&format!("minutes {}", state.word()), 1, minutes, |course| Some(course.minutes(state)))
    }));
    if side.would.is_some_and(|would| would.unbalanced.is_some()) {
        let lasted = |course: &Course| Some(course.unbalanced.map_or(0, |unbalanced| unbalanced.ms) as f64 / 60_000.0);
        rows.push(side.number("minutes without balance", 1, minutes, lasted));
    }
    rows.push(side.number("alarms raised", 0, mw, |course| {
        Some(course.alarms.iter().map(|count| count.raised).sum::<u64>() as f64)
    }));
    rows
}

/// In the order in which they are told.
pub(super) const STATES: [State; 4] = [State::Ample, State::Thin, State::Spent, State::Blind];

/// What set a headroom, its name fit to be shown.
pub(super) fn cause(binding: &Binding) -> String {
    let outage = binding.outage.as_ref().map_or("nothing lost".into(), |outage| format!("{} out", name(outage)));
    format!("{outage}, {}", binding.criterion.word())
}

/// What set headrooms, and for which part of the time: as it was, and as it would have been; the longest first.
pub(super) fn causes(corridor: &CorridorReview) -> Vec<(&Binding, [f64; 2])> {
    let mut causes: Vec<(&Binding, [f64; 2])> = Vec::new();
    for (place, course) in [Some(&corridor.was), corridor.what_if.as_ref()].into_iter().enumerate() {
        for share in course.map(|course| course.binding_ms.shares()).unwrap_or_default() {
            let known = causes.iter().position(|(known, _)| *known == share.of).unwrap_or_else(|| {
                causes.push((share.of, [0.0; 2]));
                causes.len() - 1
            });
            causes[known].1[place] = share.part;
        }
    }
    causes
}
