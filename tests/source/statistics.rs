//! How many drills came how near to their truth.
#![allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a test's own times and counts")]

use std::fmt;

use chrono::{DateTime, TimeDelta, Utc};
use tautline::{
    config::LearningSettings,
    source::{Learner, Moved, Step},
};

use crate::simulator::{Drill, START, Simulator, TrueStep};

/// Steps at least this large are to be named, kV.
const LARGE_KV: f64 = 1.5;

/// Reactances and steps of some drills.
#[derive(Debug, Default)]
pub struct Statistics {
    /// Relative errors of the reactances.
    errors: Vec<f64>,
    /// The same in their own standard deviations.
    in_spreads: Vec<f64>,
    large: usize,
    named: usize,
    right: usize,
}

impl Statistics {
    pub fn of(drills: impl Iterator<Item = Drill>) -> Self {
        let mut all = Self::default();
        for drill in drills {
            all.add(drill);
        }
        all.errors.sort_by(|a, b| a.abs().total_cmp(&b.abs()));
        all
    }

    fn add(&mut self, drill: Drill) {
        let mut simulator = Simulator::new(drill);
        let mut learner = Learner::new(&simulator.configured, LearningSettings::default());
        let mut steps = Vec::new();
        for seen in simulator.by_ref() {
            steps.extend(learner.observe(&seen));
        }
        let (mean, sd) = (learner.estimate().mean, learner.estimate().sd());
        for side in 0..2 {
            let off = mean[2 * side + 1] - simulator.truth[side].im;
            self.errors.push(off / simulator.truth[side].im);
            self.in_spreads.push(off / sd[2 * side + 1]);
        }
        let judged = 1800.0..drill.hours * 3600.0 - 60.0;
        for step in simulator.steps.iter().filter(|step| judged.contains(&step.time_s)) {
            self.compare(step, &steps);
        }
    }

    fn compare(&mut self, truth: &TrueStep, steps: &[Step]) {
        let moved = match truth.de_kv {
            [from, 0.0] if from.abs() > LARGE_KV => Moved::From,
            [0.0, to] if to.abs() > LARGE_KV => Moved::To,
            _ => return,
        };
        let start: DateTime<Utc> = START.parse().unwrap();
        let at = start + TimeDelta::milliseconds((truth.time_s * 1e3) as i64);
        self.large += 1;
        if let Some(step) = steps.iter().find(|step| (step.time - at).abs() < TimeDelta::seconds(8)) {
            self.named += 1;
            self.right += usize::from(step.moved == moved);
        }
    }

    /// Quantile of the absolute relative errors.
    pub fn error(&self, part: f64) -> f64 {
        self.errors[(part * (self.errors.len() - 1) as f64).round() as usize].abs()
    }

    pub fn within(&self, error: f64) -> f64 {
        part(self.errors.iter().filter(|e| e.abs() <= error).count(), self.errors.len())
    }

    pub fn within_two_spreads(&self) -> f64 {
        part(self.in_spreads.iter().filter(|e| e.abs() <= 2.0).count(), self.in_spreads.len())
    }

    /// Part of the large steps in the log whose side is right.
    pub fn right_side(&self) -> f64 {
        part(self.right, self.named)
    }

    /// Part of the large steps that are in the log.
    pub fn named(&self) -> f64 {
        part(self.named, self.large)
    }
}

fn part(count: usize, of: usize) -> f64 {
    count as f64 / of as f64
}

impl fmt::Display for Statistics {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let bias = self.errors.iter().sum::<f64>() / self.errors.len() as f64;
        write!(
            f,
            "error median {:.2} %, 90 % below {:.2} %, mean {:.2} %, {:.1} % within 12 %; truth within two spreads \
             {:.1} %; of {} steps above {LARGE_KV} kV {:.1} % logged, {:.1} % of these with the right side",
            100.0 * self.error(0.5),
            100.0 * self.error(0.9),
            100.0 * bias,
            100.0 * self.within(0.12),
            100.0 * self.within_two_spreads(),
            self.large,
            100.0 * self.named(),
            100.0 * self.right_side(),
        )
    }
}
