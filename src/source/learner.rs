//! From frames to steps, and from steps to impedances.

use std::collections::VecDeque;

use chrono::{DateTime, TimeDelta, Utc};
use serde::{Deserialize, Serialize};

use super::{
    Estimate, Observation, SpreadPoint, Step,
    detector::{Detector, Onset, Sudden},
    estimate::Belief,
    hypothesis::{Event, Verdict},
    store::{Memory, StoreError},
    watch::{Watch, is_explained},
};
use crate::{config::LearningSettings, grid::ConfiguredSource};

/// Steps kept in the log.
pub(super) const LOGGED: usize = 64;
/// Points of the spread's history: a day at five minutes.
pub(super) const HISTORY: usize = 288;
const HISTORY_EVERY_S: f64 = 300.0;
const DAY_S: f64 = 86_400.0;
/// Frames that come again are no older than this; further back they are another run of events.
const AGAIN_S: f64 = 2.0 * DAY_S;
/// A side that moves does so by about this part of its voltage.
const MOVE_PART: f64 = 0.01;
/// Probabilities beforehand of neither, from, to and both having moved.
const PRIOR: [f64; 4] = [0.05, 0.45, 0.45, 0.05];
/// The same when the corridor itself was switched.
const PRIOR_SWITCHED: [f64; 4] = [0.8, 0.09, 0.09, 0.02];
/// How fast the share of steps that moved both sides is followed in the long run; what it is taken for at first, and as how
/// many steps that counts. With a small share at first, chance would find a foothold before much is known.
const BOTH_MEMORY: f64 = 0.05;
const BOTH_AT_FIRST: f64 = 0.1;
const BOTH_BEFOREHAND: f64 = 6.0;
/// Share of such steps beyond which those that seem to move one side only are doubtful too, and how much each step
/// then widens the variance for every part of the share beyond it.
const BOTH_USUAL: f64 = 0.3;
const BOTH_DOUBT: f64 = 3.0;

/// Learns both sides' impedances of one corridor.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub struct Learner {
    #[serde(skip)]
    pub(super) settings: LearningSettings,
    pub(super) configured: Belief,
    pub(super) belief: Belief,
    pub(super) aged_s: Option<f64>,
    /// What was recalled had been learned from frames up to here.
    pub(super) recalled_s: Option<f64>,
    pub(super) estimate: Estimate,
    pub(super) detector: Detector,
    pub(super) watch: [Watch; 2],
    pub(super) both: f64,
    pub(super) steps: VecDeque<Step>,
    pub(super) history: VecDeque<SpreadPoint>,
}

impl Learner {
    /// Starts from what is configured.
    pub fn new(sources: &[ConfiguredSource; 2], settings: LearningSettings) -> Self {
        let configured = Belief::configured(sources);
        Self {
            settings,
            configured,
            belief: configured,
            aged_s: None,
            recalled_s: None,
            estimate: Estimate::configured(sources),
            detector: Detector::new(&settings),
            watch: [Watch::default(); 2],
            both: BOTH_AT_FIRST,
            steps: VecDeque::with_capacity(LOGGED),
            history: VecDeque::with_capacity(HISTORY),
        }
    }

    /// What is known now.
    pub fn estimate(&self) -> &Estimate {
        &self.estimate
    }

    /// The recent steps, oldest first.
    pub fn steps(&self) -> impl DoubleEndedIterator<Item = &Step> {
        self.steps.iter()
    }

    /// How the spread shrank over the last day, oldest first.
    pub fn history(&self) -> impl DoubleEndedIterator<Item = &SpreadPoint> {
        self.history.iter()
    }

    /// What to keep over a restart; nothing before the first frame.
    pub fn memory(&self) -> Option<Memory> {
        Some(Memory {
            configured: self.fingerprint(),
            mean: self.belief.mean.into(),
            covariance: self.belief.covariance.into(),
            steps: self.estimate.steps,
            both: self.both,
            time: time(self.aged_s?),
            recent: self.steps.iter().copied().collect(),
        })
    }

    /// Takes up what was kept, if it was learned from the same configured sources and makes sense.
    pub fn recall(&mut self, memory: &Memory) -> Result<(), StoreError> {
        let (kept, own) = (memory.configured.as_flattened(), self.fingerprint());
        if kept.iter().zip(own.as_flattened()).any(|(a, b)| (a - b).abs() > 1e-9 * b.abs()) {
            return Err(StoreError::OtherSources);
        }
        let belief = Belief { mean: memory.mean.into(), covariance: memory.covariance.into() };
        if !belief.is_within(&self.configured) || !(0.0..=1.0).contains(&memory.both) {
            return Err(StoreError::Impossible);
        }
        self.belief = belief;
        self.both = memory.both;
        self.estimate.steps = memory.steps;
        self.aged_s = Some(seconds(memory.time));
        self.recalled_s = self.aged_s;
        self.steps.clear();
        self.steps.extend(memory.recent.iter().rev().take(LOGGED).rev());
        self.refresh();
        Ok(())
    }

    fn fingerprint(&self) -> [[f64; 2]; 4] {
        std::array::from_fn(|k| [self.configured.mean[k], self.configured.covariance[(k, k)]])
    }

    /// Takes one frame; returns a step once its after window is complete.
    pub fn observe(&mut self, seen: &Observation) -> Option<Step> {
        if !self.settings.enabled || !seen.is_usable() || self.knows(seen.time) {
            return None;
        }
        let found = self.detector.take(seconds(seen.time), seen, &self.estimate.mean)?;
        self.note_spread(found.now_s);
        let sudden = found.sudden?;
        let event = self.event(&sudden)?;
        self.age(sudden.onset.after_s);
        let verdict = event.judge(&self.belief)?;
        Some(self.settle(&sudden.onset, &event, &verdict))
    }

    /// Whether a frame comes again that was learned from before a restart, as from the head of a file that is followed.
    fn knows(&self, seen: DateTime<Utc>) -> bool {
        self.recalled_s.is_some_and(|until_s| (0.0..AGAIN_S).contains(&(until_s - seconds(seen))))
    }

    fn event(&self, sudden: &Sudden) -> Option<Event> {
        let [before, after] = &sudden.windows;
        let kv = 0.5 * (before.measured[0] + before.measured[1]);
        Some(Event {
            before: self.detector.moment(before)?,
            after: self.detector.moment(after)?,
            wander: sudden.wander,
            move_variance: (MOVE_PART * kv).powi(2),
            prior: if sudden.onset.switched { PRIOR_SWITCHED } else { self.prior() },
        })
    }

    /// The cases beforehand, with both sides at once as frequent as they were lately.
    fn prior(&self) -> [f64; 4] {
        let rest = (1.0 - self.both) / (1.0 - PRIOR[3]);
        [PRIOR[0] * rest, PRIOR[1] * rest, PRIOR[2] * rest, self.both]
    }

    /// Takes over a verdict and writes it down.
    fn settle(&mut self, onset: &Onset, event: &Event, verdict: &Verdict) -> Step {
        let (moved, probability) = verdict.most_probable();
        let [neither, from, to, _] = verdict.probability;
        if neither + to > 0.5 {
            self.estimate.steps[0] += 1;
        }
        if neither + from > 0.5 {
            self.estimate.steps[1] += 1;
        }
        let mut doubtful = 0.0;
        if !onset.switched {
            let memory = (1.0 / (BOTH_BEFOREHAND + self.steps.len() as f64 + 1.0)).max(BOTH_MEMORY);
            self.both += memory * (verdict.probability[3] - self.both);
            self.both = self.both.max(PRIOR[3]);
            doubtful = BOTH_DOUBT * (self.both - BOTH_USUAL).max(0.0);
        }
        let lost = Watch::look(&mut self.watch, onset.after_s, event, verdict, &self.belief, &self.configured);
        self.belief = verdict.belief.scaled(1.0 + doubtful, &self.configured);
        for side in (0..2).filter(|&side| lost[side]) {
            self.belief = self.belief.opened(side, &self.configured);
        }
        self.refresh();
        let step = Step {
            time: time(0.5 * (onset.before_s + onset.after_s)),
            moved,
            probability,
            de_kv: verdict.de_kv,
            topology_changed: onset.switched,
            explained: is_explained(verdict),
            widened: lost.contains(&true),
        };
        push(&mut self.steps, step, LOGGED);
        step
    }

    /// Lets the spread grow with time, up to the configured one.
    fn age(&mut self, now_s: f64) {
        let Some(aged_s) = self.aged_s.replace(now_s) else { return };
        let days = (now_s - aged_s).max(0.0) / DAY_S;
        for side in 0..2 {
            let x_variance = self.configured.covariance[(2 * side + 1, 2 * side + 1)];
            if x_variance <= 0.0 {
                continue;
            }
            let growth = self.settings.aging_ohm_per_sqrt_day.powi(2) * days / x_variance;
            for k in [2 * side, 2 * side + 1] {
                let configured = self.configured.covariance[(k, k)];
                let room = (configured - self.belief.covariance[(k, k)]).max(0.0);
                self.belief.covariance[(k, k)] += (growth * configured).min(room);
            }
        }
    }

    fn refresh(&mut self) {
        // Without a step yet, the configured values stand as they are.
        let untouched = self.estimate.steps == [0, 0];
        let cut = if untouched { self.belief } else { self.belief.cut_at_zero() };
        self.estimate.mean = cut.mean;
        self.estimate.covariance = cut.covariance;
    }

    fn note_spread(&mut self, now_s: f64) {
        let due = self.history.back().is_none_or(|p| now_s - seconds(p.time) >= HISTORY_EVERY_S);
        if !due {
            return;
        }
        self.age(now_s);
        self.refresh();
        let (mean, sd) = (self.estimate.mean, self.estimate.sd());
        let point = SpreadPoint { time: time(now_s), x_ohm: [mean[1], mean[3]], x_sd_ohm: [sd[1], sd[3]] };
        push(&mut self.history, point, HISTORY);
    }
}

fn push<T>(ring: &mut VecDeque<T>, item: T, capacity: usize) {
    if ring.len() == capacity {
        ring.pop_front();
    }
    ring.push_back(item);
}

fn seconds(time: DateTime<Utc>) -> f64 {
    time.timestamp_micros() as f64 * 1e-6
}

#[allow(clippy::cast_possible_truncation, reason = "saturates, and comes from a time")]
fn time(seconds: f64) -> DateTime<Utc> {
    let since = TimeDelta::microseconds((seconds * 1e6).round() as i64);
    DateTime::UNIX_EPOCH.checked_add_signed(since).unwrap_or(DateTime::<Utc>::MAX_UTC)
}
