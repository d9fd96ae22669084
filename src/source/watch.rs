//! Whether what was learned still holds: a grid that changed contradicts it step after step.

use serde::{Deserialize, Serialize};

use super::{
    estimate::Belief,
    hypothesis::{Event, Verdict},
    log::Moved,
};

/// Normalised innovation beyond which a case does not explain a step.
const UNEXPLAINED: f64 = 5.0;
/// Two such steps within this time that agree are enough.
const WITHIN_S: f64 = 3600.0;
/// Normalised innovation up to which two such steps agree.
const AGREES: f64 = 3.0;
/// Cumulative sum of standardised corrections (Page, Biometrika 1954): what is let go at every step, in standard deviations;
/// the sum that says so; and the most that one step adds, for a step that moved both sides looks like a contradiction.
const ALLOWANCE: f64 = 0.5;
const ALARM: f64 = 12.0;
const MOST: f64 = 2.0;

/// Watches over one side's impedance.
#[derive(Debug, Clone, Copy, Default, Serialize, Deserialize)]
pub(super) struct Watch {
    /// When a step contradicted it, and what it would be after that step.
    doubt: Option<(f64, Belief)>,
    /// Sums of the corrections up and down.
    sums: [f64; 2],
}

/// Whether any case but that of both sides explains a step.
pub(super) fn is_explained(verdict: &Verdict) -> bool {
    verdict.cases[..3].iter().flatten().any(|case| case.innovation <= UNEXPLAINED)
}

/// The case of one side moving that fits better, and the side whose impedance it tests.
fn better_single(verdict: &Verdict) -> (Moved, usize) {
    let innovation = |k: usize| verdict.cases[k].as_ref().map_or(f64::INFINITY, |case| case.innovation);
    if innovation(1) < innovation(2) { (Moved::From, 1) } else { (Moved::To, 0) }
}

/// Which sides stood still, going by the better of the cases.
fn tested(verdict: &Verdict) -> [Option<usize>; 2] {
    match verdict.most_probable().0 {
        Moved::Neither => [Some(0), Some(0)],
        Moved::From => [None, Some(1)],
        Moved::To => [Some(2), None],
        Moved::Both => match better_single(verdict).1 {
            0 => [Some(2), None],
            _ => [None, Some(1)],
        },
    }
}

impl Watch {
    /// Looks at a step; returns which sides' impedances no longer hold.
    pub(super) fn look(
        sides: &mut [Self; 2],
        now_s: f64,
        event: &Event,
        verdict: &Verdict,
        prior: &Belief,
        configured: &Belief,
    ) -> [bool; 2] {
        let mut lost = [false; 2];
        for (side, case) in tested(verdict).into_iter().enumerate() {
            if let Some(case) = case.and_then(|k| verdict.cases[k].as_ref()) {
                lost[side] = sides[side].add(standardised(&case.belief, prior, 2 * side + 1));
            }
        }
        let (case, side) = better_single(verdict);
        if is_explained(verdict) {
            if tested(verdict)[side].is_some() && verdict.most_probable().0 != Moved::Both {
                sides[side].doubt = None;
            }
        } else {
            let opened = verdict.belief.opened(side, configured);
            lost[side] |= sides[side].contradict(now_s, event, case, &opened);
        }
        for side in (0..2).filter(|&side| lost[side]) {
            sides[side] = Self::default();
        }
        lost
    }

    /// Adds a correction to the sums.
    fn add(&mut self, correction: f64) -> bool {
        for (sum, sign) in self.sums.iter_mut().zip([1.0, -1.0]) {
            *sum = (*sum + (sign * correction).min(MOST) - ALLOWANCE).max(0.0);
        }
        self.sums.iter().any(|sum| *sum > ALARM)
    }

    /// Takes a step that fits no more; says whether the one before it agrees on another value.
    fn contradict(&mut self, now_s: f64, event: &Event, case: Moved, opened: &Belief) -> bool {
        let fits = |belief: &Belief| event.update(belief, case).filter(|case| case.innovation <= AGREES);
        let earlier = self.doubt.take().filter(|(then_s, _)| now_s - then_s <= WITHIN_S);
        if earlier.is_some_and(|(_, belief)| fits(&belief).is_some()) {
            return true;
        }
        self.doubt = fits(opened).map(|case| (now_s, case.belief));
        false
    }
}

/// How far a step corrects a value, against how far it should: normal with unit variance while the belief holds.
fn standardised(posterior: &Belief, prior: &Belief, k: usize) -> f64 {
    let gained = prior.covariance[(k, k)] - posterior.covariance[(k, k)];
    if gained > 1e-9 * prior.covariance[(k, k)] { (posterior.mean[k] - prior.mean[k]) / gained.sqrt() } else { 0.0 }
}
