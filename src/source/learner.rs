//! From frames to steps, and from steps to impedances.

use std::collections::VecDeque;

use chrono::{DateTime, TimeDelta, Utc};

use super::{
    Estimate, Observation, SpreadPoint, Step,
    background::Background,
    estimate::Belief,
    hypothesis::{Event, Moment, Verdict},
    store::{Memory, StoreError},
    terminal::{Measured, Terminal, behind, state_covariance},
    watch::{Watch, is_explained},
    window::{Bin, Recent, Window},
};
use crate::{config::LearningSettings, grid::ConfiguredSource};

/// Steps kept in the log.
const LOGGED: usize = 64;
/// Points of the spread's history: a day at five minutes.
const HISTORY: usize = 288;
const HISTORY_EVERY_S: f64 = 300.0;
const DAY_S: f64 = 86_400.0;
/// Bins in two windows and the gap, where frames are more frequent.
const BINS_IN_SPAN: f64 = 52.0;
/// A window holds at least this many frames' time, where frames are rare.
const FRAMES_IN_WINDOW: f64 = 2.5;
/// Part of the gap that lies before a step, for channels that run ahead; the rest is for swings and late channels.
const GAP_BEFORE: f64 = 0.25;
/// A side that moves does so by about this part of its voltage.
const MOVE_PART: f64 = 0.01;
/// Probabilities beforehand of neither, from, to and both having moved.
const PRIOR: [f64; 4] = [0.05, 0.45, 0.45, 0.05];
/// How fast the share of steps that moved both sides is followed.
const BOTH_MEMORY: f64 = 0.05;
/// Share of such steps beyond which those that seem to move one side only are doubtful too.
const BOTH_USUAL: f64 = 0.25;
/// The same when the corridor itself was switched.
const PRIOR_SWITCHED: [f64; 4] = [0.8, 0.09, 0.09, 0.02];

/// Learns both sides' impedances of one corridor.
#[derive(Debug, Clone)]
pub struct Learner {
    settings: LearningSettings,
    configured: Belief,
    belief: Belief,
    aged_s: Option<f64>,
    estimate: Estimate,
    recent: Recent,
    open: Option<Bin>,
    segment: u64,
    topology: Option<u64>,
    last_s: Option<f64>,
    frame_s: f64,
    class: [f64; 6],
    background: Background,
    gains: [Measured; 2],
    e_spread: [f64; 2],
    candidate: Option<Candidate>,
    switched: Option<Onset>,
    quiet_from_s: f64,
    watch: [Watch; 2],
    both: f64,
    steps: VecDeque<Step>,
    history: VecDeque<SpreadPoint>,
}

/// A step that may still be outdone by a larger one nearby.
#[derive(Debug, Clone, Copy)]
struct Candidate {
    time_s: f64,
    score: f64,
    change: Measured,
    first_s: f64,
}

/// The last instant before a step and the first after it.
#[derive(Debug, Clone, Copy)]
struct Onset {
    before_s: f64,
    after_s: f64,
    switched: bool,
}

impl Learner {
    /// Starts from what is configured.
    pub fn new(sources: &[ConfiguredSource; 2], settings: LearningSettings) -> Self {
        let configured = Belief::configured(sources);
        let mut learner = Self {
            settings,
            configured,
            belief: configured,
            aged_s: None,
            estimate: Estimate::configured(sources),
            recent: Recent::new(),
            open: None,
            segment: 0,
            topology: None,
            last_s: None,
            frame_s: 0.0,
            class: [0.0; 6],
            background: Background::new(settings.background_s),
            gains: [Measured::zeros(); 2],
            e_spread: [f64::INFINITY; 2],
            candidate: None,
            switched: None,
            quiet_from_s: f64::NEG_INFINITY,
            watch: [Watch::default(); 2],
            both: PRIOR[3],
            steps: VecDeque::with_capacity(LOGGED),
            history: VecDeque::with_capacity(HISTORY),
        };
        learner.refresh();
        learner
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
        if !self.settings.enabled || !seen.is_usable() {
            return None;
        }
        let now_s = seconds(seen.time);
        if let Some(last_s) = self.last_s {
            if now_s <= last_s {
                return None;
            }
            self.follow(now_s - last_s);
        }
        if self.topology.is_some_and(|t| t != seen.topology) {
            self.cut();
            self.switched = self.last_s.map(|before_s| Onset { before_s, after_s: now_s, switched: true });
        }
        self.topology = Some(seen.topology);
        self.class = seen.sigma;
        self.last_s = Some(now_s);
        let length_s = self.bin_s();
        match &mut self.open {
            Some(bin) if bin.holds(now_s, self.segment, length_s) => {
                bin.add(now_s, seen);
                None
            }
            open => {
                let closed = open.replace(Bin::new(now_s, self.segment, seen))?;
                self.recent.push(closed);
                (closed.segment == self.segment).then(|| self.look(closed.time_s)).flatten()
            }
        }
    }

    /// Follows the frames' spacing; a gap ends a segment.
    fn follow(&mut self, passed_s: f64) {
        if self.frame_s > 0.0 && passed_s > (3.0 * self.frame_s).max(0.5 * self.settings.window_s) {
            self.cut();
        }
        let towards = if self.frame_s > 0.0 { passed_s.min(4.0 * self.frame_s) } else { passed_s };
        self.frame_s += 0.1 * (towards - self.frame_s) + if self.frame_s > 0.0 { 0.0 } else { 0.9 * passed_s };
    }

    fn cut(&mut self) {
        self.segment += 1;
        self.candidate = None;
        self.switched = None;
    }

    fn bin_s(&self) -> f64 {
        (2.0 * self.settings.window_s + self.settings.gap_s) / BINS_IN_SPAN
    }

    fn window_s(&self) -> f64 {
        self.settings.window_s.max(FRAMES_IN_WINDOW * self.frame_s)
    }

    /// Looks for a step at each closed bin.
    fn look(&mut self, now_s: f64) -> Option<Step> {
        self.note_spread(now_s);
        if let Some(onset) = self.switched {
            if now_s >= self.after_from(&onset) + self.window_s() {
                self.switched = None;
                return self.judge(&onset);
            }
            return None;
        }
        self.compare(now_s);
        let candidate = self.candidate?;
        if now_s < candidate.time_s + 0.5 * self.window_s() + self.settings.gap_s {
            return None;
        }
        self.candidate = None;
        let onset = self.onset(&candidate)?;
        self.judge(&onset)
    }

    /// Compares the windows that end now with the background.
    fn compare(&mut self, now_s: f64) {
        let Some((before, after)) = self.windows(now_s) else { return };
        let change = after.measured - before.measured;
        if let Some(bin_change) = self.recent.last_change()
            && self.background.sample(now_s, bin_change, change, after.count.min(before.count), &self.class)
        {
            self.follow_background(&after);
        }
        let Some(spread) = self.background.spread else { return };
        if before.first_s < self.quiet_from_s {
            return;
        }
        let channels = change.component_div(&spread).amax();
        let sides = (0..2).map(|k| self.gains[k].dot(&change).abs() / self.e_spread[k]);
        let score = sides.fold(channels, f64::max);
        if score > self.settings.step_threshold && self.candidate.is_none_or(|c| score > c.score) {
            self.candidate = Some(Candidate { time_s: now_s, score, change, first_s: before.first_s });
        }
    }

    /// The windows of which the second ends now.
    fn windows(&self, now_s: f64) -> Option<(Window, Window)> {
        const JITTER_S: f64 = 1e-3;
        let window_s = self.window_s();
        let after = self.recent.mean(now_s - window_s + JITTER_S, now_s)?;
        let before_to = after.first_s - self.settings.gap_s.max(1.5 * self.frame_s);
        let before = self.recent.mean(before_to - window_s + JITTER_S, before_to + JITTER_S)?;
        let same = before.segment == after.segment && before.segment == self.segment;
        let full =
            before.count * 3 >= after.count * 2 && after.last_s - after.first_s >= 0.5 * (window_s - self.frame_s);
        (same && full).then_some((before, after))
    }

    /// Keeps what a change of the measurements does to the voltages behind the impedances.
    fn follow_background(&mut self, now: &Window) {
        let Some(fit) = Terminal::fit(&now.measured, &self.class, &now.y) else { return };
        let sides = behind(&self.estimate.mean, &fit.state, &now.y);
        for (k, side) in sides.iter().enumerate() {
            self.gains[k] = fit.gain.transpose() * side.by_state;
            let noise = 2.0 * (self.gains[k].transpose() * self.background.noise * self.gains[k])[0] / now.count as f64;
            self.e_spread[k] = self.background.spread_along(&self.gains[k]).max(0.5 * noise.sqrt());
        }
    }

    /// Finds the instant of a step as the best split of the measurements in two levels.
    fn onset(&self, candidate: &Candidate) -> Option<Onset> {
        let spread = self.background.spread?;
        let weights = candidate.change.component_div(&spread.component_mul(&spread));
        let first_s = candidate.first_s;
        let bins = || {
            self.recent
                .iter()
                .filter(move |b| b.segment == self.segment && b.time_s >= first_s && b.time_s <= candidate.time_s)
                .map(|b| (b.time_s, b.measured.dot(&weights)))
        };
        let (count, sum) = bins().fold((0.0, 0.0), |(n, s), (_, v)| (n + 1.0, s + v));
        let mut best: Option<(f64, Onset)> = None;
        let (mut n, mut s) = (0.0, 0.0);
        for ((before_s, value), (after_s, _)) in bins().zip(bins().skip(1)) {
            n += 1.0;
            s += value;
            let between = (s / n - (sum - s) / (count - n)).powi(2) * n * (count - n);
            if best.is_none_or(|(b, _)| between > b) {
                best = Some((between, Onset { before_s, after_s, switched: false }));
            }
        }
        best.map(|(_, onset)| onset)
    }

    fn after_from(&self, onset: &Onset) -> f64 {
        let gap_s = self.settings.gap_s;
        let middle = 0.5 * (onset.before_s + onset.after_s);
        (middle + (1.0 - GAP_BEFORE) * gap_s).max(onset.after_s + 0.5 * gap_s)
    }

    fn judge(&mut self, onset: &Onset) -> Option<Step> {
        let middle = 0.5 * (onset.before_s + onset.after_s);
        let window_s = self.window_s();
        let before_to = middle - GAP_BEFORE * self.settings.gap_s;
        let after_from = self.after_from(onset);
        let before = self.recent.mean((before_to - window_s).max(self.quiet_from_s), before_to)?;
        let after = self.recent.mean(after_from, after_from + window_s)?;
        self.quiet_from_s = after_from;
        self.background.spread?;
        let event = self.event(&before, &after, onset.switched)?;
        self.age(onset.after_s);
        let verdict = event.judge(&self.belief)?;
        Some(self.settle(onset, &event, &verdict))
    }

    fn event(&mut self, before: &Window, after: &Window, switched: bool) -> Option<Event> {
        let noise = self.background.noise;
        let moment = |window: &Window| {
            let fit = Terminal::fit(&window.measured, &self.class, &window.y)?;
            Some(Moment::new(&fit, state_covariance(&fit, &noise, window.count), window.y))
        };
        let (from, to) = (moment(before)?, moment(after)?);
        self.follow_background(before);
        let count = before.count.min(after.count) as f64;
        let wander = std::array::from_fn(|k| {
            let of_noise = 2.0 * (self.gains[k].transpose() * noise * self.gains[k])[0] / count;
            (self.e_spread[k].powi(2) - of_noise).max((0.05 * self.class[k]).powi(2))
        });
        Some(Event {
            before: from,
            after: to,
            wander,
            move_variance: (MOVE_PART * 0.5 * (before.measured[0] + before.measured[1])).powi(2),
            prior: if switched { PRIOR_SWITCHED } else { self.prior() },
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
            self.both += BOTH_MEMORY * (verdict.probability[3] - self.both);
            self.both = self.both.max(PRIOR[3]);
            doubtful = (self.both - BOTH_USUAL).max(0.0);
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

    /// Before the first step, what is configured stands as it is.
    fn refresh(&mut self) {
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
    DateTime::UNIX_EPOCH + TimeDelta::microseconds((seconds * 1e6).round() as i64)
}
