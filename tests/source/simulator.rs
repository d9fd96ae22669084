//! A compact corridor with known sources: both sides wander, step at random, and are seen through poor telemetry.
#![allow(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    clippy::struct_excessive_bools,
    reason = "a test's own times and counts"
)]

use chrono::{DateTime, TimeDelta, Utc};
use nalgebra::{Matrix2, Vector2};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Exp1, StandardNormal};
use tautline::{grid::ConfiguredSource, source::Observation};

use crate::corridor::{C, Line};

pub const START: &str = "2031-03-14T00:00:00Z";

/// What one drill is made of.
#[derive(Debug, Clone, Copy)]
pub struct Drill {
    pub seed: u64,
    pub hours: f64,
    pub frame_s: f64,
    pub steps_per_hour: f64,
    pub coincident_per_hour: f64,
    pub trip: bool,
    pub skew: bool,
    pub deadband: bool,
    pub swing: bool,
}

impl Drill {
    /// A day at one frame in two seconds through skewed, deadbanded telemetry, every other one with a trip.
    pub fn day(seed: u64) -> Self {
        Self {
            seed,
            hours: 24.0,
            frame_s: 2.0,
            steps_per_hour: 6.0,
            coincident_per_hour: 0.0,
            trip: seed.is_multiple_of(2),
            skew: true,
            deadband: true,
            swing: true,
        }
    }
}

/// A step as it truly was.
#[derive(Debug, Clone, Copy)]
pub struct TrueStep {
    pub time_s: f64,
    pub de_kv: [f64; 2],
}

pub struct Simulator {
    drill: Drill,
    dice: ChaCha8Rng,
    pub truth: [C; 2],
    pub configured: [ConfiguredSource; 2],
    pub steps: Vec<TrueStep>,
    lines: Vec<Line>,
    inputs: Inputs,
    network: Network,
    next_step_s: [f64; 2],
    trip_s: [f64; 2],
    tick_s: f64,
    ticks: usize,
    past: [Snapshot; 8],
    delay: Vec<usize>,
    held: Vec<f64>,
}

/// What drives the corridor.
#[derive(Debug, Clone, Copy)]
struct Inputs {
    center_kv: [f64; 2],
    e_kv: [f64; 2],
    angle: f64,
    base_angle: f64,
    drift: f64,
    slow: f64,
    fast: f64,
    swing: f64,
    swing_since_s: f64,
    swing_hz: f64,
    swing_damping_s: f64,
}

/// The network and its response to unit voltages behind the sources.
#[derive(Debug, Clone)]
struct Network {
    closed: Vec<bool>,
    y: Matrix2<C>,
    each: Vec<Matrix2<C>>,
    /// Terminal voltages by source voltages.
    divide: Matrix2<C>,
}

type Snapshot = ([f64; 2], Vec<[C; 2]>);

const WANDER_KV_PER_SQRT_S: f64 = 0.047;
const CENTER_S: f64 = 7200.0;

impl Simulator {
    pub fn new(drill: Drill) -> Self {
        let mut dice = ChaCha8Rng::seed_from_u64(drill.seed);
        let truth = [0, 1].map(|_| {
            let x = dice.random_range(10.0..36.0);
            C::new(x * dice.random_range(0.03..0.12), x)
        });
        let configured = truth.map(|z| ConfiguredSource {
            r_ohm: z.re * dice.random_range(0.6..1.4),
            x_ohm: z.im * dice.random_range(0.6..1.4),
            spread: 0.4,
            swing_x_ohm: 0.0,
        });
        let km = dice.random_range(160.0..320.0);
        let count = dice.random_range(2..4);
        let lines: Vec<Line> = (0..count)
            .map(|_| Line { km: km * dice.random_range(0.95..1.1), r: 0.029, x: 0.33, b: 3.5, capacitor: 0.0 })
            .collect();
        let reach = truth[0].im + truth[1].im + 0.33 * km / f64::from(count);
        let transfer_mw = dice.random_range(400.0..1100.0);
        let base_angle = (transfer_mw * reach / (420.0 * 420.0)).clamp(-0.7, 0.7).asin();
        let center_kv = [dice.random_range(415.0..430.0), dice.random_range(410.0..425.0)];
        let trip_s = if drill.trip {
            let at = dice.random_range(0.2..0.6) * drill.hours * 3600.0;
            [at, at + dice.random_range(0.05..0.2) * drill.hours * 3600.0]
        } else {
            [f64::INFINITY; 2]
        };
        let inputs = Inputs {
            center_kv,
            e_kv: center_kv,
            angle: base_angle,
            base_angle,
            drift: dice.random_range(0.0..std::f64::consts::TAU),
            slow: 0.0,
            fast: 0.0,
            swing: 0.0,
            swing_since_s: 0.0,
            swing_hz: dice.random_range(0.4..0.8),
            swing_damping_s: dice.random_range(1.5..3.0),
        };
        let tick_s = drill.frame_s.min(1.0);
        let most = (2.0 / tick_s) as usize;
        let channels = 2 + 4 * lines.len();
        let delay = (0..channels).map(|_| if drill.skew { dice.random_range(0..=most.min(7)) } else { 0 }).collect();
        let network = Network::new(&lines, vec![true; lines.len()], &truth);
        let first = network.snapshot(&inputs);
        let mut simulator = Self {
            drill,
            dice,
            truth,
            configured,
            steps: Vec::new(),
            lines,
            inputs,
            network,
            next_step_s: [0.0; 2],
            trip_s,
            tick_s,
            ticks: 0,
            past: std::array::from_fn(|_| first.clone()),
            delay,
            held: vec![f64::NAN; channels],
        };
        simulator.next_step_s = [simulator.wait(drill.steps_per_hour), simulator.wait(drill.coincident_per_hour)];
        simulator
    }

    /// The grid behind a side changes.
    pub fn replace_source(&mut self, side: usize, z: C) {
        self.truth[side] = z;
        self.network = Network::new(&self.lines, self.network.closed.clone(), &self.truth);
    }

    fn normal(&mut self) -> f64 {
        StandardNormal.sample(&mut self.dice)
    }

    fn wait(&mut self, per_hour: f64) -> f64 {
        let exponential: f64 = Exp1.sample(&mut self.dice);
        if per_hour > 0.0 { exponential * 3600.0 / per_hour } else { f64::INFINITY }
    }

    fn move_side(&mut self, side: usize) -> f64 {
        let size = 2.2 * self.normal();
        let off = self.inputs.e_kv[side] - self.inputs.center_kv[side];
        let size = if off * size > 0.0 && off.abs() > 8.0 { -size } else { size };
        self.inputs.e_kv[side] += size;
        size
    }

    fn tick(&mut self) {
        let now_s = self.ticks as f64 * self.tick_s;
        self.ticks += 1;
        let root = self.tick_s.sqrt();
        for side in 0..2 {
            let pull = (self.inputs.center_kv[side] - self.inputs.e_kv[side]) * self.tick_s / CENTER_S;
            self.inputs.e_kv[side] += pull + WANDER_KV_PER_SQRT_S * root * self.normal();
        }
        // A second-order random angle with the spread that a recorded day shows, and a load shape.
        let kick = self.normal();
        self.inputs.slow += -self.inputs.slow * self.tick_s / 60.0 + kick * root * 0.0035;
        self.inputs.fast += (self.inputs.slow - self.inputs.fast) * self.tick_s / 15.0;
        let day = (std::f64::consts::TAU * now_s / 86_400.0 + self.inputs.drift).sin();
        let mut stepped = [0.0; 2];
        if now_s >= self.next_step_s[0] {
            let side = usize::from(self.dice.random::<bool>());
            stepped[side] = self.move_side(side);
            self.next_step_s[0] = now_s + self.wait(self.drill.steps_per_hour);
        }
        if now_s >= self.next_step_s[1] {
            stepped = [self.move_side(0), self.move_side(1)];
            self.next_step_s[1] = now_s + self.wait(self.drill.coincident_per_hour);
        }
        let size = stepped[0].abs() + stepped[1].abs();
        if size > 0.0 {
            self.steps.push(TrueStep { time_s: now_s, de_kv: stepped });
            self.start_swing(now_s, 0.004 * size);
        }
        let out = now_s >= self.trip_s[0] && now_s < self.trip_s[1];
        if self.network.closed[1] == out {
            let mut closed = self.network.closed.clone();
            closed[1] = !out;
            self.network = Network::new(&self.lines, closed, &self.truth);
            self.start_swing(now_s, 0.05);
        }
        let since = now_s - self.inputs.swing_since_s;
        let swing = self.inputs.swing
            * (-since / self.inputs.swing_damping_s).exp()
            * (std::f64::consts::TAU * self.inputs.swing_hz * since).sin();
        self.inputs.angle = self.inputs.base_angle * (1.0 + 0.5 * day) + self.inputs.fast + swing;
        self.past.rotate_right(1);
        self.past[0] = self.network.snapshot(&self.inputs);
    }

    fn start_swing(&mut self, now_s: f64, size: f64) {
        if self.drill.swing {
            self.inputs.swing = size;
            self.inputs.swing_since_s = now_s;
        }
    }

    fn see(&mut self, channel: usize, value: f64, sigma: f64, deadband: f64) -> f64 {
        let noisy = value + sigma * self.normal();
        let held = self.held[channel];
        if !self.drill.deadband || held.is_nan() || (noisy - held).abs() > deadband {
            self.held[channel] = noisy;
        }
        self.held[channel]
    }

    fn frame(&mut self) -> Observation {
        let start: DateTime<Utc> = START.parse().unwrap();
        let now_s = (self.ticks - 1) as f64 * self.tick_s;
        let (mut kv, mut mw, mut mvar) = ([0.0; 2], [0.0; 2], [0.0; 2]);
        for end in 0..2 {
            let value = self.past[self.delay[end]].0[end];
            kv[end] = self.see(end, value, 0.4, 0.2);
            for line in 0..self.lines.len() {
                let channel = 2 + 4 * line + 2 * end;
                let (p, q) = (
                    self.past[self.delay[channel]].1[line][end].re,
                    self.past[self.delay[channel + 1]].1[line][end].im,
                );
                if self.network.closed[line] {
                    mw[end] += self.see(channel, p, 1.5, 1.0);
                    mvar[end] += self.see(channel + 1, q, 1.5, 1.0);
                }
            }
        }
        let power_sigma = 1.2 * (self.lines.len() as f64).sqrt();
        Observation {
            time: start + TimeDelta::microseconds((now_s * 1e6).round() as i64),
            kv,
            mw,
            mvar,
            y: self.network.y,
            topology: self.network.closed.iter().fold(0, |t, c| 2 * t + u64::from(*c)),
            sigma: [0.6, 0.6, power_sigma, power_sigma, power_sigma, power_sigma],
            fit_ok: true,
        }
    }
}

impl Iterator for Simulator {
    type Item = Observation;

    fn next(&mut self) -> Option<Observation> {
        if self.ticks as f64 * self.tick_s >= self.drill.hours * 3600.0 {
            return None;
        }
        let per_frame = (self.drill.frame_s / self.tick_s).round().max(1.0) as usize;
        for _ in 0..per_frame {
            self.tick();
        }
        Some(self.frame())
    }
}

impl Network {
    fn new(lines: &[Line], closed: Vec<bool>, truth: &[C; 2]) -> Self {
        let each: Vec<Matrix2<C>> = lines.iter().map(|line| line.admittance(false)).collect();
        let y = each.iter().zip(&closed).filter(|(_, closed)| **closed).fold(Matrix2::zeros(), |sum, (y, _)| sum + y);
        let behind = Matrix2::new(truth[0], C::ZERO, C::ZERO, truth[1]);
        let divide = (Matrix2::identity() + behind * y).try_inverse().unwrap();
        Self { closed, y, each, divide }
    }

    fn snapshot(&self, inputs: &Inputs) -> Snapshot {
        let e = Vector2::new(C::from_polar(inputs.e_kv[0], inputs.angle), C::from(inputs.e_kv[1]));
        let v = self.divide * e;
        let flows = self.each.iter().map(|y| {
            let i = y * v;
            [v[0] * i[0].conj(), v[1] * i[1].conj()]
        });
        ([v[0].norm(), v[1].norm()], flows.collect())
    }
}
