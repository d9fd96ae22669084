use std::sync::Arc;

use chrono::{DateTime, Utc};
use serde::{Deserialize, Serialize};

use super::{Durations, Series, Tallied};
use crate::{
    alarm::{Priority, Transition},
    desk::{Assessment, Criterion, State},
    grid::Corridor,
};

const HOUR_MS: f64 = 3_600_000.0;

/// What a corridor's assessments came to over some time.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Course {
    /// Frames assessed.
    pub frames: u64,
    /// Time in each state. A state lasts until the next frame, but no longer than a value stands, nor past midnight UTC.
    pub state_ms: Tallied<State>,
    /// Lowest and highest transfer, MW, positive from `from` to `to`.
    pub transfer_mw: Option<[f64; 2]>,
    /// Sum of transfer and time, MW·h.
    pub energy_mwh: f64,
    /// Time with a known transfer.
    pub transfer_ms: i64,
    /// When and for how long there was no balance at all, with the change that was asked for: worse than any headroom.
    pub unbalanced: Option<Unbalanced>,
    /// The lowest headroom; the earliest of equals.
    pub least: Option<Least>,
    /// Time for which each outage and criterion set the headroom.
    pub binding_ms: Tallied<Binding>,
    /// How long the headroom was how large.
    pub durations: Durations,
    /// The course in slots of time.
    pub series: Series,
    /// How often each alarm was raised.
    pub alarms: Vec<AlarmCount>,
}

/// A time without any balance.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Unbalanced {
    /// When it was first so.
    pub first: DateTime<Utc>,
    /// For how long altogether, ms.
    pub ms: i64,
}

/// How often an alarm was raised.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct AlarmCount {
    /// Its name.
    pub alarm: Arc<str>,
    /// Its priority.
    pub priority: Priority,
    /// How often.
    pub raised: u64,
}

/// A lowest headroom.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Least {
    /// When.
    pub time: DateTime<Utc>,
    /// MW.
    pub headroom_mw: f64,
    /// Its standard deviation, MW.
    pub headroom_sd_mw: Option<f64>,
    /// Transfer then, MW, positive from `from` to `to`.
    pub transfer_mw: Option<f64>,
    /// What set it.
    pub binding: Option<Binding>,
}

/// What sets a headroom.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Binding {
    /// The outage; `None`: nothing is lost.
    pub outage: Option<Arc<str>>,
    /// The criterion.
    pub criterion: Criterion,
}

impl Binding {
    fn of(assessment: &Assessment) -> Option<Self> {
        let binding = assessment.binding.as_ref()?;
        Some(Self { outage: binding.outage.clone(), criterion: binding.criterion })
    }

    /// In words.
    pub fn words(&self) -> String {
        let outage = self.outage.as_ref().map_or("nothing lost".into(), |outage| format!("{outage} out"));
        format!("{outage}, {}", self.criterion.word())
    }
}

/// Transfer of an assessment, MW, positive from `from` to `to`.
fn signed_transfer_mw(corridor: &Corridor, assessment: &Assessment) -> Option<f64> {
    let is_reversed = assessment.exporter.as_ref().is_some_and(|exporter| *exporter != corridor.buses[0].name);
    assessment.transfer_mw.map(|mw| if is_reversed { -mw } else { mw })
}

impl Course {
    /// Takes the next assessment in.
    pub(super) fn take(&mut self, corridor: &Corridor, assessment: &Assessment) {
        let transfer_mw = signed_transfer_mw(corridor, assessment);
        self.frames += 1;
        if let Some(mw) = transfer_mw {
            self.transfer_mw = Some(self.transfer_mw.map_or([mw, mw], |[low, high]| [low.min(mw), high.max(mw)]));
        }
        if let Some(headroom_mw) = assessment.headroom_mw
            && self.least.as_ref().is_none_or(|least| headroom_mw < least.headroom_mw)
        {
            self.least = Some(Least {
                time: assessment.time,
                headroom_mw,
                headroom_sd_mw: assessment.headroom_sd_mw,
                transfer_mw,
                binding: Binding::of(assessment),
            });
        }
        self.series.take(assessment, transfer_mw);
    }

    /// Takes in that an assessment stood for so long.
    pub(super) fn stood(&mut self, corridor: &Corridor, assessment: &Assessment, ms: i64) {
        self.state_ms.add(assessment.state, ms);
        if let Some(mw) = signed_transfer_mw(corridor, assessment) {
            self.energy_mwh += mw * ms as f64 / HOUR_MS;
            self.transfer_ms += ms;
        }
        match assessment.headroom_mw {
            Some(mw) => self.durations.add(mw, ms),
            None if assessment.state == State::Spent => {
                self.unbalanced.get_or_insert(Unbalanced { first: assessment.time, ms: 0 }).ms += ms;
            }
            None => {}
        }
        if let Some(binding) = Binding::of(assessment) {
            self.binding_ms.add(binding, ms);
        }
    }

    /// Counts what was raised.
    pub(super) fn count(&mut self, transitions: &[Transition]) {
        for transition in transitions.iter().filter(|transition| transition.is_annunciated()) {
            self.raised(&transition.alarm, transition.priority, 1);
        }
    }

    fn raised(&mut self, alarm: &Arc<str>, priority: Priority, raised: u64) {
        match self.alarms.iter_mut().find(|known| known.alarm == *alarm) {
            Some(known) => known.raised += raised,
            None => self.alarms.push(AlarmCount { alarm: alarm.clone(), priority, raised }),
        }
    }

    /// Adds what came later.
    pub(super) fn merge(&mut self, later: &Self) {
        self.frames += later.frames;
        self.state_ms.merge(&later.state_ms);
        self.transfer_mw = match (self.transfer_mw, later.transfer_mw) {
            (Some([low, high]), Some([lower, higher])) => Some([low.min(lower), high.max(higher)]),
            (one, other) => one.or(other),
        };
        self.energy_mwh += later.energy_mwh;
        self.transfer_ms += later.transfer_ms;
        let headroom_mw = |least: &Option<Least>| least.as_ref().map_or(f64::INFINITY, |least| least.headroom_mw);
        if headroom_mw(&later.least) < headroom_mw(&self.least) {
            self.least.clone_from(&later.least);
        }
        if let Some(later) = later.unbalanced {
            let Unbalanced { ms, .. } = self.unbalanced.get_or_insert(Unbalanced { ms: 0, ..later });
            *ms += later.ms;
        }
        self.binding_ms.merge(&later.binding_ms);
        self.durations.merge(&later.durations);
        self.series.merge(&later.series);
        later.alarms.iter().for_each(|count| self.raised(&count.alarm, count.priority, count.raised));
    }

    /// The lowest headroom, unless there was no balance at all meanwhile: that is worse.
    pub fn lowest(&self) -> Option<&Least> {
        self.least.as_ref().filter(|_| self.unbalanced.is_none())
    }

    /// The most whole megawatts that were there for this part of the time (0 to 1); `None` where nothing is known, or there
    /// was no balance for longer.
    pub fn held_for(&self, part: f64) -> Option<i32> {
        let known_ms = self.durations.total_ms();
        let all_ms = known_ms + self.unbalanced.map_or(0, |unbalanced| unbalanced.ms);
        let part = part * all_ms as f64 / known_ms.max(1) as f64;
        self.durations.held_for(part).filter(|_| part <= 1.0)
    }

    /// Time in a state, minutes.
    pub fn minutes(&self, state: State) -> f64 {
        self.state_ms.ms(&state) as f64 / 60_000.0
    }

    /// Mean transfer, MW, positive from `from` to `to`.
    pub fn mean_transfer_mw(&self) -> Option<f64> {
        (self.transfer_ms > 0).then(|| self.energy_mwh / (self.transfer_ms as f64 / HOUR_MS))
    }
}
