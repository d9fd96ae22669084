//! Finds sudden steps: what the measurements were just before, and just after.

use serde::{Deserialize, Serialize};

use super::{
    Observation,
    background::Background,
    beyond::{or_ever, or_never},
    hypothesis::Moment,
    terminal::{Impedances, Measured, Terminal, behind, state_covariance},
    window::{Bin, Recent, Window},
};
use crate::config::LearningSettings;

/// Bins in two windows and the gap, where frames are more frequent.
const BINS_IN_SPAN: f64 = 52.0;
/// A window holds at least this many frames' time, where frames are rare.
const FRAMES_IN_WINDOW: f64 = 2.5;
/// Part of the gap that lies before a step, for channels that run ahead; the rest is for swings and late channels.
const GAP_BEFORE: f64 = 0.25;
/// The wander of a voltage is at least this part of its metering class.
const LEAST_WANDER: f64 = 0.05;

/// Finds steps in the measurements of one corridor.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(super) struct Detector {
    window_s: f64,
    gap_s: f64,
    threshold: f64,
    bin_s: f64,
    recent: Recent,
    open: Option<Bin>,
    segment: u64,
    topology: Option<u64>,
    last_s: Option<f64>,
    /// Usual time between frames; 0 until known.
    frame_s: f64,
    class: [f64; 6],
    background: Background,
    /// What a change of each measurement does to the voltages behind the impedances.
    gains: [Measured; 2],
    /// How much these voltages change when nothing happens, kV.
    #[serde(deserialize_with = "or_ever")]
    e_spread: [f64; 2],
    candidate: Option<Candidate>,
    switched: Option<Onset>,
    /// Where the last step has settled.
    #[serde(deserialize_with = "or_never")]
    quiet_from_s: f64,
}

/// A step that may still be outdone by a larger one nearby.
#[derive(Debug, Clone, Copy, Serialize, Deserialize)]
struct Candidate {
    time_s: f64,
    score: f64,
    change: Measured,
    first_s: f64,
}

/// The last instant before a step and the first after it.
#[derive(Debug, Clone, Copy, Serialize, Deserialize)]
pub(super) struct Onset {
    pub(super) before_s: f64,
    pub(super) after_s: f64,
    /// Whether the corridor itself was switched.
    pub(super) switched: bool,
}

/// A step, ready to be judged.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sudden {
    pub(super) onset: Onset,
    /// Before and after.
    pub(super) windows: [Window; 2],
    /// Variance of the wander of each side's voltage between the two, kV².
    pub(super) wander: [f64; 2],
}

/// What a closed bin brought.
#[derive(Debug, Clone, Copy)]
pub(super) struct Found {
    pub(super) now_s: f64,
    pub(super) sudden: Option<Sudden>,
}

impl Detector {
    pub(super) fn new(settings: &LearningSettings) -> Self {
        Self {
            window_s: settings.window_s,
            gap_s: settings.gap_s,
            threshold: settings.step_threshold,
            bin_s: (2.0 * settings.window_s + settings.gap_s) / BINS_IN_SPAN,
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
        }
    }

    /// What of it future frames are compared with: windows reach no further back.
    pub(super) fn kept(&self) -> Self {
        let reach_s = 3.0 * (self.length_s() + self.gap_s.max(1.5 * self.frame_s));
        Self { recent: self.recent.since(self.last_s.map_or(0.0, |last_s| last_s - reach_s)), ..self.clone() }
    }

    /// Whether it is one that these settings can lead to.
    pub(super) fn is_possible(&self, settings: &LearningSettings) -> bool {
        let new = Self::new(settings);
        let own = |it: &Self| [it.window_s, it.gap_s, it.threshold, it.bin_s].map(f64::to_bits);
        own(self) == own(&new)
            && self.recent.is_possible()
            && self.open.as_ref().is_none_or(Bin::is_possible)
            && self.background.is_possible()
    }

    /// Takes a frame; `None` while its bin is still open. `z` is what is known of the impedances.
    pub(super) fn take(&mut self, now_s: f64, seen: &Observation, z: &Impedances) -> Option<Found> {
        if let Some(last_s) = self.last_s {
            if now_s <= last_s {
                return None;
            }
            self.follow(now_s - last_s);
        }
        if self.topology.is_some_and(|topology| topology != seen.topology) {
            self.cut();
            self.switched = self.last_s.map(|before_s| Onset { before_s, after_s: now_s, switched: true });
        }
        self.topology = Some(seen.topology);
        self.class = seen.sigma;
        self.last_s = Some(now_s);
        if let Some(bin) = self.open.as_mut().filter(|bin| bin.holds(now_s, self.segment, self.bin_s)) {
            bin.add(now_s, seen);
            return None;
        }
        let closed = self.open.replace(Bin::new(now_s, self.segment, seen))?;
        self.recent.push(closed);
        let sudden = if closed.segment == self.segment { self.look(closed.time_s, z) } else { None };
        Some(Found { now_s: closed.time_s, sudden })
    }

    /// Terminal state of a window, with the noise of its measurements.
    pub(super) fn moment(&self, window: &Window) -> Option<Moment> {
        let fit = Terminal::fit(&window.measured, &self.class, &window.y)?;
        let covariance = state_covariance(&fit, &self.background.noise, window.count);
        Some(Moment { state: fit.state, covariance, y: window.y })
    }

    /// Follows the frames' spacing; a gap ends a segment.
    fn follow(&mut self, passed_s: f64) {
        if self.frame_s <= 0.0 {
            self.frame_s = passed_s;
            return;
        }
        if passed_s > (3.0 * self.frame_s).max(0.5 * self.window_s) {
            self.cut();
        }
        self.frame_s += 0.1 * (passed_s.min(4.0 * self.frame_s) - self.frame_s);
    }

    fn cut(&mut self) {
        self.segment += 1;
        self.candidate = None;
        self.switched = None;
    }

    fn length_s(&self) -> f64 {
        self.window_s.max(FRAMES_IN_WINDOW * self.frame_s)
    }

    /// Looks for a step at each closed bin.
    fn look(&mut self, now_s: f64, z: &Impedances) -> Option<Sudden> {
        if let Some(onset) = self.switched {
            if now_s >= self.after_from(&onset) + self.length_s() {
                self.switched = None;
                return self.sudden(onset, z);
            }
            return None;
        }
        self.compare(now_s, z);
        let candidate = self.candidate?;
        if now_s < candidate.time_s + 0.5 * self.length_s() + self.gap_s {
            return None;
        }
        self.candidate = None;
        let onset = self.onset(&candidate)?;
        self.sudden(onset, z)
    }

    /// Compares the windows that end now with the background.
    fn compare(&mut self, now_s: f64, z: &Impedances) {
        let Some((before, after)) = self.windows(now_s) else { return };
        let change = after.measured - before.measured;
        if let Some(bin_change) = self.recent.last_change()
            && self.background.sample(now_s, bin_change, change, after.count.min(before.count), &self.class)
        {
            self.follow_background(&after, z);
        }
        let Some(spread) = self.background.spread else { return };
        if before.first_s < self.quiet_from_s {
            return;
        }
        let channels = change.component_div(&spread).amax();
        let sides = (0..2).map(|k| self.gains[k].dot(&change).abs() / self.e_spread[k]);
        let score = sides.fold(channels, f64::max);
        if score > self.threshold && self.candidate.is_none_or(|c| score > c.score) {
            self.candidate = Some(Candidate { time_s: now_s, score, change, first_s: before.first_s });
        }
    }

    /// The windows of which the second ends now.
    fn windows(&self, now_s: f64) -> Option<(Window, Window)> {
        const JITTER_S: f64 = 1e-3;
        let length_s = self.length_s();
        let after = self.recent.mean(now_s - length_s + JITTER_S, now_s)?;
        let before_to = after.first_s - self.gap_s.max(1.5 * self.frame_s);
        let before = self.recent.mean(before_to - length_s + JITTER_S, before_to + JITTER_S)?;
        let same = before.segment == after.segment && before.segment == self.segment;
        let full =
            before.count * 3 >= after.count * 2 && after.last_s - after.first_s >= 0.5 * (length_s - self.frame_s);
        (same && full).then_some((before, after))
    }

    /// Keeps what a change of the measurements does to the voltages behind the impedances.
    fn follow_background(&mut self, now: &Window, z: &Impedances) {
        let Some(fit) = Terminal::fit(&now.measured, &self.class, &now.y) else { return };
        let sides = behind(z, &fit.state, &now.y);
        for (k, side) in sides.iter().enumerate() {
            self.gains[k] = fit.gain.transpose() * side.by_state;
            let noise = self.noise_variance(k, now.count);
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
        let gap_s = self.gap_s;
        let middle = 0.5 * (onset.before_s + onset.after_s);
        (middle + (1.0 - GAP_BEFORE) * gap_s).max(onset.after_s + 0.5 * gap_s)
    }

    /// The windows about an onset, and how far the voltages may have wandered between them.
    fn sudden(&mut self, onset: Onset, z: &Impedances) -> Option<Sudden> {
        let length_s = self.length_s();
        let before_to = 0.5 * (onset.before_s + onset.after_s) - GAP_BEFORE * self.gap_s;
        let after_from = self.after_from(&onset);
        let before = self.recent.mean((before_to - length_s).max(self.quiet_from_s), before_to)?;
        let after = self.recent.mean(after_from, after_from + length_s)?;
        self.quiet_from_s = after_from;
        self.background.spread?;
        self.follow_background(&before, z);
        let count = before.count.min(after.count);
        let wander = std::array::from_fn(|k| {
            let wandered = self.e_spread[k].powi(2) - self.noise_variance(k, count);
            wandered.max((LEAST_WANDER * self.class[k]).powi(2))
        });
        Some(Sudden { onset, windows: [before, after], wander })
    }

    /// Variance that noise gives the difference of two means of a voltage behind an impedance, kV².
    fn noise_variance(&self, side: usize, count: usize) -> f64 {
        let gain = &self.gains[side];
        2.0 * gain.dot(&(self.background.noise * gain)) / count as f64
    }
}
