//! One corridor's part of every frame.

use std::collections::VecDeque;

use rand::RngExt;
use rand_chacha::ChaCha8Rng;

use super::{
    CorridorTruth, Scenario, What,
    chance::{Purpose, stream},
    meter::{AGES, Meter},
    world::World,
};
use crate::{
    config::Config,
    feed::{Channels, Point, Quality, Reading, Slot},
};

/// How often the truth says how a corridor stands, s.
const STATE_EVERY_S: f64 = 60.0;

/// A world with its meters. Values of different ages are taken from the world in the order of their instants, so that
/// those of the frames to come wait in a queue.
#[derive(Debug, Clone)]
pub(super) struct CorridorFeed {
    world: World,
    meters: Vec<Meter>,
    noise: ChaCha8Rng,
    interval_s: f64,
    ages_s: Vec<f64>,
    /// The next frame to take values for, by age.
    next: Vec<u64>,
    /// True values by frame and meter, from the next frame on.
    waiting: VecDeque<Vec<f64>>,
    next_state_s: f64,
}

impl CorridorFeed {
    pub fn new(config: &Config, channels: &Channels, scenario: &Scenario, truth: &CorridorTruth) -> Self {
        let corridor = &config.grid.corridors[truth.corridor];
        let ages = if scenario.metering.skew_s > 0.0 { AGES } else { 1 };
        let mut random = stream(scenario.seed, truth.corridor, Purpose::Skew);
        let reported = |point: &Point| match *point {
            Point::Deg(_) => truth.reports_angles,
            Point::StoredEnergy(side) => truth.reports_stored_energy && truth.sides[side].stored_energy_mws.is_some(),
            Point::Load(bus, _) => truth.loads[bus].is_some(),
            _ => true,
        };
        let meter = |point| {
            let slot = channels.slot(corridor, point);
            Meter::new(slot, point, random.random_range(0..ages), &scenario.metering, truth)
        };
        Self {
            world: World::new(corridor, truth, config.grid.frequency_hz, scenario.duration_s, scenario.seed),
            meters: Point::of(corridor).into_iter().filter(reported).map(meter).collect(),
            noise: stream(scenario.seed, truth.corridor, Purpose::Noise),
            interval_s: scenario.interval_s,
            ages_s: (0..ages).map(|age| scenario.metering.skew_s * age as f64 / (AGES - 1) as f64).collect(),
            next: vec![0; ages],
            waiting: VecDeque::new(),
            next_state_s: 0.0,
        }
    }

    /// This corridor's readings of the frame after the last one, and what became true until then.
    pub fn frame(&mut self, frame: u64, readings: &mut Vec<(Slot, Reading)>, truth: &mut Vec<(f64, What)>) {
        while self.next[0] <= frame {
            self.take(frame);
        }
        let time_s = frame as f64 * self.interval_s;
        truth.append(&mut self.world.take_log());
        if time_s >= self.next_state_s {
            truth.push((time_s, self.world.state()));
            self.next_state_s = time_s + STATE_EVERY_S;
        }
        let values = self.waiting.pop_front().unwrap_or_default();
        for (meter, value) in self.meters.iter_mut().zip(values) {
            if let Some(says) = meter.turn(time_s) {
                let channel = meter.point.name(&self.world.corridor).into();
                truth.push((time_s, What::Meter { channel, says }));
            }
            if let Some(value) = meter.read(value, time_s, &mut self.noise) {
                readings.push((meter.slot, Reading { value, quality: Quality::Good }));
            }
        }
    }

    /// Takes the values that come first in time.
    fn take(&mut self, frame: u64) {
        let instant_s = |age: usize| (self.next[age] as f64 * self.interval_s - self.ages_s[age]).max(0.0);
        let sooner = |a: &usize, b: &usize| instant_s(*a).total_cmp(&instant_s(*b)).then(b.cmp(a));
        let age = (0..self.next.len()).min_by(sooner).unwrap_or(0);
        let instant_s = instant_s(age);
        if instant_s > self.world.now_s {
            self.world.advance(instant_s);
        }
        let place = usize::try_from(self.next[age] - frame).unwrap_or(usize::MAX);
        if place == self.waiting.len() {
            self.waiting.push_back(vec![0.0; self.meters.len()]);
        }
        for (meter, value) in self.meters.iter().zip(&mut self.waiting[place]).filter(|(meter, _)| meter.age == age) {
            *value = self.world.value(meter.point);
        }
        self.next[age] += 1;
    }
}
