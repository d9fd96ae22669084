//! How near many drills come to their truth.

use std::fmt;

use chrono::TimeDelta;
use rayon::prelude::*;
use tautline::{
    drill::What,
    source::{Moved, Step},
};

use crate::course::{Course, Outcome};

/// Steps that must be told apart.
const LARGE_KV: f64 = 1.5;
/// Until the background is known, nothing is a step.
const WARM_UP: TimeDelta = TimeDelta::minutes(30);
/// A step in the log may be off by so much.
const NEAR: TimeDelta = TimeDelta::seconds(8);

#[derive(Debug, Default)]
pub struct Statistics {
    /// Of both reactances: relative, and in their own spreads.
    errors: Vec<f64>,
    in_spreads: Vec<f64>,
    /// Mean error of the headroom by drill, MW: learned, and as configured.
    headroom_off_mw: Vec<[f64; 2]>,
    headroom_in_spreads: Vec<f64>,
    large: usize,
    logged: usize,
    right: usize,
}

impl Statistics {
    pub fn of(courses: impl Iterator<Item = Course>) -> Self {
        let courses: Vec<Course> = courses.collect();
        let outcomes: Vec<Outcome> = courses.par_iter().map(Course::run).collect();
        let mut all = Self::default();
        for outcome in &outcomes {
            all.add(outcome);
        }
        all
    }

    fn add(&mut self, outcome: &Outcome) {
        let (mean, sd) = (outcome.estimate.mean, outcome.estimate.sd());
        for (side, truth) in outcome.true_x_ohm.into_iter().enumerate() {
            let off = mean[2 * side + 1] - truth;
            self.errors.push(off / truth);
            self.in_spreads.push(off / sd[2 * side + 1]);
        }
        let looks = &outcome.looks;
        self.headroom_in_spreads.extend(looks.iter().map(|look| look.learned_off / look.learned_sd));
        let mean = |sum: f64| sum / looks.len() as f64;
        self.headroom_off_mw.push([
            mean(looks.iter().map(|look| look.learned_off.abs()).sum()),
            mean(looks.iter().map(|look| look.configured_off.abs()).sum()),
        ]);
        let start = outcome.facts[0].time;
        let end = outcome.facts[outcome.facts.len() - 1].time;
        for fact in outcome.facts.iter().filter(|fact| (start + WARM_UP..end).contains(&fact.time)) {
            let What::Step { kv } = fact.what else { continue };
            let moved = match kv.map(|kv| kv.abs() > LARGE_KV) {
                [true, true] => Moved::Both,
                [true, false] => Moved::From,
                [false, true] => Moved::To,
                [false, false] => continue,
            };
            let near: Vec<&Step> = outcome.steps.iter().filter(|s| (s.time - fact.time).abs() < NEAR).collect();
            self.large += 1;
            self.logged += usize::from(!near.is_empty());
            self.right += usize::from(near.iter().any(|step| step.moved == moved));
        }
    }

    /// Quantile of the absolute relative errors.
    pub fn error(&self, part: f64) -> f64 {
        quantile(self.errors.iter().map(|error| error.abs()), part)
    }

    pub fn within(&self, error: f64) -> f64 {
        share(&self.errors, error)
    }

    pub fn within_two_spreads(&self) -> f64 {
        share(&self.in_spreads, 2.0)
    }

    pub fn headroom_within_two_spreads(&self) -> f64 {
        share(&self.headroom_in_spreads, 2.0)
    }

    /// Part of the large steps that are in the log with the right side, both at once included.
    pub fn right_side(&self) -> f64 {
        self.right as f64 / self.large as f64
    }

    /// Quantile over the drills of the part of the headroom's error that learning leaves.
    pub fn headroom_error_left(&self, part: f64) -> f64 {
        quantile(self.headroom_off_mw.iter().map(|[learned, configured]| learned / configured), part)
    }

    fn headroom_off_mw(&self, of: usize) -> f64 {
        quantile(self.headroom_off_mw.iter().map(|off| off[of]), 0.5)
    }
}

#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a place in a list")]
fn quantile(values: impl Iterator<Item = f64>, part: f64) -> f64 {
    let mut values: Vec<f64> = values.collect();
    values.sort_by(f64::total_cmp);
    values[(part * (values.len() - 1) as f64).round() as usize]
}

/// Part of the values no larger than `limit` either way.
fn share(values: &[f64], limit: f64) -> f64 {
    values.iter().filter(|value| value.abs() <= limit).count() as f64 / values.len() as f64
}

impl fmt::Display for Statistics {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{} drills: error median {:.2} %, 90 % below {:.2} %, mean {:+.2} %, {:.1} % within 12 %; truth within two \
             spreads {:.1} %; of {} steps above {LARGE_KV} kV {:.1} % logged, {:.1} % with the right side; headroom \
             off by {:.1} MW instead of {:.1} (median), learning leaves {:.0} % of the error (median; 90 % of the drills \
             below {:.0} %), truth within two spreads {:.1} %",
            self.headroom_off_mw.len(),
            100.0 * self.error(0.5),
            100.0 * self.error(0.9),
            100.0 * self.errors.iter().sum::<f64>() / self.errors.len() as f64,
            100.0 * self.within(0.12),
            100.0 * self.within_two_spreads(),
            self.large,
            100.0 * self.logged as f64 / self.large as f64,
            100.0 * self.right_side(),
            self.headroom_off_mw(0),
            self.headroom_off_mw(1),
            100.0 * self.headroom_error_left(0.5),
            100.0 * self.headroom_error_left(0.9),
            100.0 * self.headroom_within_two_spreads(),
        )
    }
}
