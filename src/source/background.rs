//! How much the measurements move when nothing happens: robust, recomputed now and then.

use std::collections::VecDeque;

use nalgebra::SMatrix;
use serde::{Deserialize, Serialize};

use super::{
    beyond::or_never,
    terminal::{Measured, MeasuredCovariance},
};

/// Samples kept over the background's time.
const SAMPLES: usize = 128;
/// Samples before a step can be told from background.
const ENOUGH: usize = 16;
/// New samples between two evaluations.
const EVALUATE_EVERY: usize = 8;
/// Makes the median absolute deviation of normal noise its standard deviation (Rousseeuw and Croux 1993).
const MAD_TO_SIGMA: f64 = 1.4826;
/// Deadbands hide noise: it is at least this part of the metering class.
const LEAST_PART_OF_CLASS: f64 = 0.2;
/// Changes beyond so many standard deviations are cut to it before their covariance is taken.
const CUT_AT: f64 = 3.0;

/// Quiet changes of the measurements: from bin to bin, and from window to window.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(super) struct Background {
    spacing_s: f64,
    #[serde(deserialize_with = "or_never")]
    sampled_s: f64,
    since_evaluation: usize,
    bin_changes: VecDeque<Measured>,
    window_changes: VecDeque<Measured>,
    #[serde(skip)]
    scratch: Vec<f64>,
    /// Covariance of the noise of one bin.
    pub(super) noise: MeasuredCovariance,
    /// Spread of each channel's window change; `None` until enough is known.
    pub(super) spread: Option<Measured>,
}

impl Background {
    pub(super) fn new(background_s: f64) -> Self {
        Self {
            spacing_s: background_s / SAMPLES as f64,
            sampled_s: f64::NEG_INFINITY,
            since_evaluation: 0,
            bin_changes: VecDeque::with_capacity(SAMPLES),
            window_changes: VecDeque::with_capacity(SAMPLES),
            scratch: Vec::with_capacity(SAMPLES),
            noise: MeasuredCovariance::zeros(),
            spread: None,
        }
    }

    /// Whether it is no more than it could be by itself.
    pub(super) fn is_possible(&self) -> bool {
        self.bin_changes.len().max(self.window_changes.len()) <= SAMPLES
    }

    /// Takes the changes at `time_s` if a sample is due, and says whether the background was evaluated anew.
    pub(super) fn sample(
        &mut self,
        time_s: f64,
        bin_change: Measured,
        window_change: Measured,
        bins_in_window: usize,
        class: &[f64; 6],
    ) -> bool {
        if time_s - self.sampled_s < self.spacing_s {
            return false;
        }
        self.sampled_s = time_s;
        push(&mut self.bin_changes, bin_change);
        push(&mut self.window_changes, window_change);
        self.since_evaluation += 1;
        let count = self.window_changes.len();
        let due = self.since_evaluation >= EVALUATE_EVERY || (self.spread.is_none() && count == ENOUGH);
        if count < ENOUGH || !due {
            return false;
        }
        self.since_evaluation = 0;
        self.evaluate(bins_in_window, class);
        true
    }

    fn evaluate(&mut self, bins_in_window: usize, class: &[f64; 6]) {
        let sigma = Measured::from_fn(|c, _| {
            spread(&mut self.scratch, self.bin_changes.iter().map(|d| d[c])).1 / std::f64::consts::SQRT_2
        });
        self.noise = noise(&self.bin_changes, &sigma, class);
        let quietest = (2.0 / bins_in_window.max(1) as f64).sqrt();
        self.spread = Some(Measured::from_fn(|c, _| {
            let seen = spread(&mut self.scratch, self.window_changes.iter().map(|d| d[c])).1;
            seen.max(LEAST_PART_OF_CLASS * class[c] * quietest)
        }));
    }

    /// Standard deviation of a linear combination of the window changes.
    pub(super) fn spread_along(&mut self, weights: &Measured) -> f64 {
        spread(&mut self.scratch, self.window_changes.iter().map(|d| d.dot(weights))).1
    }
}

/// Covariance of one bin's noise from the changes between neighbours, outliers cut.
fn noise(changes: &VecDeque<Measured>, sigma: &Measured, class: &[f64; 6]) -> MeasuredCovariance {
    let mut sum = SMatrix::zeros();
    for change in changes {
        let limit = sigma * (CUT_AT * std::f64::consts::SQRT_2);
        let cut = change.zip_map(&limit, |d, l| d.clamp(-l, l));
        sum += cut * cut.transpose();
    }
    sum /= 2.0 * changes.len().max(1) as f64;
    for c in 0..6 {
        sum[(c, c)] = sum[(c, c)].max((LEAST_PART_OF_CLASS * class[c]).powi(2));
    }
    sum
}

fn push(ring: &mut VecDeque<Measured>, change: Measured) {
    if ring.len() == SAMPLES {
        ring.pop_front();
    }
    ring.push_back(change);
}

/// Median and scaled median absolute deviation.
fn spread(scratch: &mut Vec<f64>, values: impl Iterator<Item = f64>) -> (f64, f64) {
    scratch.clear();
    scratch.extend(values);
    let center = median(scratch);
    for value in scratch.iter_mut() {
        *value = (*value - center).abs();
    }
    (center, MAD_TO_SIGMA * median(scratch))
}

fn median(values: &mut [f64]) -> f64 {
    if values.is_empty() {
        return 0.0;
    }
    let middle = values.len() / 2;
    *values.select_nth_unstable_by(middle, f64::total_cmp).1
}
