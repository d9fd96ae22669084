//! One corridor as it really is, moving through time.

use std::sync::Arc;

use rand_chacha::ChaCha8Rng;

use super::{
    CorridorTruth, Source, What,
    agenda::{Due, agenda},
    chance::{Purpose, Wandering, stream},
    plan::{Plan, impedances, share_from},
    plant::{FaultOn, Plant},
    swing::{Inertia, Swing},
    truth::rounded,
};
use crate::{
    feed::{Point, Quantity},
    grid::Corridor,
    margin::PowerAngle,
    network::{C64, Topology},
};

/// A disturbance is swung out after so many times the decay: less than a thousandth of it is left.
const DECAYS_TO_REST: f64 = 7.0;

/// Swings between grids are ten times slower; machines so light are taken to follow at once.
const FASTEST_RAD_PER_S: f64 = 100.0;

/// A corridor with everything that moves in it.
#[derive(Debug, Clone)]
pub(super) struct World {
    pub(super) corridor: Corridor,
    pub(super) truth: CorridorTruth,
    plan: Plan,
    inertia: Option<Inertia>,
    share_from: f64,
    due: Vec<(f64, Due)>,
    random: ChaCha8Rng,

    pub(super) now_s: f64,
    pub(super) topology: Topology,
    pub(super) fault: Option<FaultOn>,
    pub(super) z_ohm: [C64; 2],
    /// By how much steps have moved the planned voltages, kV.
    pub(super) stepped_kv: [f64; 2],
    wander_kv: [Wandering; 2],
    wander_mw: Wandering,
    p_m_mw: f64,
    swing: Swing,
    swinging_until_s: f64,

    plant: Plant,
    joined: bool,
    curve: PowerAngle,
    pub(super) voltages_kv: Vec<C64>,
    log: Vec<(f64, What)>,
}

impl World {
    /// At the start, at rest.
    pub fn new(corridor: &Corridor, truth: &CorridorTruth, frequency_hz: f64, duration_s: f64, seed: u64) -> Self {
        let topology = Topology::complete(corridor);
        let stored_energy_mws = [0, 1].map(|side| truth.sides[side].stored_energy_mws);
        let mut world = Self {
            plan: Plan::new(corridor, truth),
            inertia: Inertia::of(stored_energy_mws, frequency_hz, truth.swing_decay_s),
            share_from: share_from(truth),
            due: agenda(truth, duration_s, seed),
            random: stream(seed, truth.corridor, Purpose::Wander),
            now_s: 0.0,
            plant: Plant::new(corridor, &topology, None),
            joined: true,
            topology,
            fault: None,
            z_ohm: impedances(truth),
            stepped_kv: [0.0; 2],
            wander_kv: Default::default(),
            wander_mw: Wandering::default(),
            p_m_mw: 0.0,
            swing: Swing::default(),
            swinging_until_s: 0.0,
            curve: PowerAngle::default(),
            voltages_kv: Vec::new(),
            log: Vec::new(),
            corridor: corridor.clone(),
            truth: truth.clone(),
        };
        world.plan_ahead();
        world.solve();
        world.inertia = world.inertia.filter(|inertia| inertia.pace(&world.curve) < FASTEST_RAD_PER_S);
        world.solve();
        world
    }

    /// Goes on to a time. What happens on the way happens at its own time; what drifts is brought up to date at the end.
    pub fn advance(&mut self, to_s: f64) {
        let began_s = self.now_s;
        while let Some((at_s, due)) = self.due.pop_if(|(at_s, _)| *at_s <= to_s) {
            self.swing_to(at_s);
            self.happen(due);
        }
        self.swing_to(to_s);
        self.drift(to_s - began_s);
        self.plan_ahead();
        self.solve();
    }

    fn drift(&mut self, time_s: f64) {
        for (side, wandering) in self.truth.sides.iter().zip(&mut self.wander_kv) {
            if let Some(wander) = side.wander {
                wandering.advance(wander, time_s, &mut self.random);
            }
        }
        if let Some(wander) = self.truth.wander {
            self.wander_mw.advance(wander, time_s, &mut self.random);
        }
    }

    fn plan_ahead(&mut self) {
        self.plan.go_to(&self.truth, self.now_s);
        self.p_m_mw = self.plan.p_m_mw(&self.truth.dispatch, self.now_s) + self.wander_mw.value;
    }

    /// Voltage behind each terminal, kV.
    pub fn e_kv(&self) -> [f64; 2] {
        [0, 1].map(|side| self.plan.e_kv[side] + self.stepped_kv[side] + self.wander_kv[side].value)
    }

    fn sources(&self) -> [C64; 2] {
        let [from, to] = self.e_kv();
        [C64::from_polar(from, self.swing.angle_rad), C64::new(to, 0.0)]
    }

    /// Brings curve, angle and voltages up to date.
    pub(super) fn solve(&mut self) {
        self.plant.attach(&self.plan.load_s, self.z_ohm);
        self.curve = self.plant.swing_curve(self.e_kv(), self.share_from);
        self.rest();
        self.plant.voltages(self.sources(), &mut self.voltages_kv);
    }

    /// Another topology or fault.
    pub(super) fn switch(&mut self) {
        self.plant = Plant::new(&self.corridor, &self.topology, self.fault);
        self.joined = self.topology.joins_terminals(&self.corridor);
    }

    /// Lets the machines swing from here.
    pub(super) fn disturb(&mut self) {
        self.swinging_until_s = self.now_s + DECAYS_TO_REST * self.truth.swing_decay_s;
        self.solve();
    }

    /// Where nothing swings, the angle stands where the machines' power goes through.
    fn rest(&mut self) {
        let swings = self.inertia.is_some() && self.now_s < self.swinging_until_s;
        if swings || !self.joined || self.fault.is_some() {
            return;
        }
        let sine = (self.p_m_mw - self.curve.mean_mw) / self.curve.amplitude_mw;
        if sine.abs() < 1.0 {
            self.swing = Swing { angle_rad: self.curve.shift_rad + sine.asin(), speed_rad_per_s: 0.0 };
        } else if self.inertia.is_some() {
            self.swinging_until_s = self.now_s + DECAYS_TO_REST * self.truth.swing_decay_s;
        } else {
            self.fall_out_of_step();
        }
    }

    fn swing_to(&mut self, to_s: f64) {
        let time_s = to_s.min(self.swinging_until_s) - self.now_s;
        self.now_s = to_s;
        let Some(inertia) = self.inertia.filter(|_| self.joined && time_s > 0.0) else { return };
        self.swing.advance(&self.curve, self.p_m_mw, inertia, time_s);
        // Half a turn past the curve's zero is past every tipping point.
        if (self.swing.angle_rad - self.curve.shift_rad).abs() > std::f64::consts::PI {
            self.fall_out_of_step();
        }
    }

    /// Protection parts two sides that slip past each other.
    fn fall_out_of_step(&mut self) {
        self.record(What::OutOfStep);
        self.topology.closed.fill(false);
        self.fault = None;
        self.switch();
        self.plant.attach(&self.plan.load_s, self.z_ohm);
    }

    pub(super) fn record(&mut self, what: What) {
        self.log.push((self.now_s, what));
    }

    /// What happened since the last call, with its times.
    pub fn take_log(&mut self) -> Vec<(f64, What)> {
        std::mem::take(&mut self.log)
    }

    /// How the corridor stands.
    pub fn state(&self) -> What {
        let e_kv = self.e_kv();
        let source = |side: usize| Source {
            bus: Arc::clone(&self.corridor.buses[side].name),
            e_kv: rounded(e_kv[side]),
            r_ohm: self.z_ohm[side].re,
            x_ohm: self.z_ohm[side].im,
        };
        What::State {
            sources: [source(0), source(1)],
            internal_angle_deg: rounded(self.swing.angle_rad.to_degrees()),
            transfer_mw: rounded(self.transfer_mw()),
        }
    }

    /// From the `from` terminal into the circuits, MW.
    pub fn transfer_mw(&self) -> f64 {
        self.plant.transfer_mw(self.sources())
    }

    /// The true value of a point.
    pub fn value(&self, point: Point) -> f64 {
        let part = |power: C64, quantity| match quantity {
            Quantity::Active => power.re,
            Quantity::Reactive => power.im,
        };
        match point {
            Point::Kv(bus) => self.voltages_kv[bus].norm(),
            Point::Deg(bus) => self.voltages_kv[bus].arg().to_degrees(),
            Point::Load(bus, quantity) => {
                part(self.plan.load_s[bus].conj() * self.voltages_kv[bus].norm_sqr(), quantity)
            }
            Point::StoredEnergy(side) => self.truth.sides[side].stored_energy_mws.unwrap_or_default(),
            Point::Flow(circuit, end, quantity) => part(self.plant.flow(circuit, end, &self.voltages_kv), quantity),
            Point::Closed(circuit) => f64::from(u8::from(self.topology.closed[circuit])),
            Point::Inserted(index) => f64::from(u8::from(self.topology.inserted[index.circuit][index.bank])),
        }
    }
}
