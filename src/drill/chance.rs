//! Everything random, each purpose on a stream of its own: what one draws does not move another.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Exp1, StandardNormal};

use super::{RandomSteps, Wander};

/// What a stream of random numbers is for.
#[derive(Debug, Clone, Copy)]
pub(super) enum Purpose {
    Wander,
    StepsFrom,
    StepsTo,
    CoincidentSteps,
    Skew,
    Noise,
}

/// The stream of a purpose in a corridor.
pub(super) fn stream(seed: u64, corridor: usize, purpose: Purpose) -> ChaCha8Rng {
    let mut stream = ChaCha8Rng::seed_from_u64(seed);
    stream.set_stream((corridor as u64) << 8 | purpose as u64);
    stream
}

/// Where a wander has got to.
#[derive(Debug, Clone, Default)]
pub(super) struct Wandering {
    pub value: f64,
}

impl Wandering {
    /// Goes on for a time, by the exact solution (Uhlenbeck and Ornstein 1930).
    pub fn advance(&mut self, wander: Wander, time_s: f64, random: &mut ChaCha8Rng) {
        let kept = (-time_s / wander.memory_s).exp();
        let moved: f64 = random.sample(StandardNormal);
        self.value = kept * self.value + wander.sd * (1.0 - kept * kept).sqrt() * moved;
    }
}

/// A random step, its direction still open.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Draw {
    pub kv: f64,
    /// Between 0 and 1.
    pub lot: f64,
}

impl Draw {
    /// The step in kV: up or down, the more likely towards where the voltage is planned the further it is off.
    pub fn directed(self, offset_kv: f64, steps: &RandomSteps) -> f64 {
        let pull = offset_kv / (4.0 * steps.kv[1]);
        if self.lot < 0.5 - pull { self.kv } else { -self.kv }
    }
}

/// Random steps (a Poisson process): when, and a draw for each of two sides.
pub(super) fn draw_steps(steps: &RandomSteps, duration_s: f64, mut random: ChaCha8Rng) -> Vec<(f64, [Draw; 2])> {
    let mean_s = 3600.0 / steps.per_hour;
    let mut time_s = 0.0;
    std::iter::from_fn(|| {
        time_s += mean_s * random.sample::<f64, _>(Exp1);
        let draws = [0, 1].map(|_| Draw { kv: random.random_range(steps.kv[0]..=steps.kv[1]), lot: random.random() });
        (time_s < duration_s).then_some((time_s, draws))
    })
    .collect()
}
