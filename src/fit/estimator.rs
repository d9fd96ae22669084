//! Weighted least squares by Gauss–Newton on one topology (Schweppe 1970; Abur & Expósito 2004, ch. 2).
//!
//! Unknowns are, for each bus in service, the voltage per unit of nominal and the angle (but that of `to`, and that of `from`
//! where nothing tells it), and one angle common to all angle channels.

mod judge;
mod start;

use super::{
    gain::{Gain, Singular},
    meter::{Meter, Meters},
    wiring::{Flow, Wire, Wiring},
};
use crate::{
    grid::{BusIndex, Corridor, FROM, TO},
    network::C64,
};

const ITERATIONS: usize = 30;
const HALVINGS: usize = 8;
/// The next step would be smaller than this, per unit and radians.
const SETTLED: f64 = 1e-12;
/// The same for a robust estimate, from which one more step follows.
const SETTLED_ROBUST: f64 = 1e-5;
/// Voltages a corridor may stand at, per unit.
const POSSIBLE: std::ops::Range<f64> = 0.1..3.0;
/// No step is longer, per unit and radians.
const LONGEST_STEP: f64 = 0.5;

/// Measurements in use, unknowns, and everything that an iteration needs.
#[derive(Debug, Clone, Default)]
pub(super) struct Estimator {
    /// By meter: value, one over σ (0: not used), and the load drawn at nominal voltage where it is assumed.
    pub z: Vec<f64>,
    pub w: Vec<f64>,
    assumed: Vec<f64>,
    /// By bus: voltage per unit of nominal, angle.
    pub v: Vec<f64>,
    pub angle: Vec<f64>,
    offset: f64,
    /// Whether the angle between the terminals is told by anything.
    pub angle_known: bool,
    v_at: Vec<usize>,
    angle_at: Vec<usize>,
    offset_at: usize,
    pub unknowns: usize,
    flows: Vec<Flow>,
    gain: Gain,
    step: Vec<f64>,
    row: Vec<f64>,
    guesses: Vec<f64>,
}

/// Why there is no estimate.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Failure {
    /// The measurements do not fix the state.
    Open,
    /// The iteration does not settle, or not on possible voltages.
    Restless,
}

impl From<Singular> for Failure {
    fn from(_: Singular) -> Self {
        Self::Open
    }
}

/// Sum of squares; a robust one counts what is beyond its bend only linearly (Huber 1964).
#[derive(Debug, Clone, Copy)]
struct Loss {
    bend: f64,
    sum: f64,
}

impl Loss {
    /// Takes a weighted residual in and gives the factor of its row.
    fn take(&mut self, residual: f64) -> f64 {
        let size = residual.abs();
        if size > self.bend {
            self.sum += self.bend * (2.0 * size - self.bend);
            (self.bend / size).sqrt()
        } else {
            self.sum += size * size;
            1.0
        }
    }
}

fn wrapped(angle: f64) -> f64 {
    if angle.abs() < std::f64::consts::PI {
        return angle;
    }
    angle - std::f64::consts::TAU * (angle / std::f64::consts::TAU).round()
}

impl Estimator {
    /// Takes the measurements that concern this topology and lays the unknowns out.
    pub fn prepare(&mut self, corridor: &Corridor, meters: &Meters, wiring: &Wiring, z: &[f64], w: &[f64]) {
        self.z.clear();
        self.z.extend_from_slice(z);
        self.w.clear();
        self.w.resize(w.len(), 0.0);
        self.assumed.clear();
        self.assumed.resize(w.len(), 0.0);
        for meter in wiring.wires.iter().flat_map(|wire| wire.meters) {
            self.w[meter] = w[meter];
        }
        for (bus, _) in corridor.buses.iter().enumerate().filter(|(bus, _)| wiring.live(*bus)) {
            self.w[Meters::kv(bus)] = w[Meters::kv(bus)];
            self.w[Meters::deg(bus)] = w[Meters::deg(bus)];
        }
        for (bus, station) in corridor.buses.iter().enumerate().skip(TO + 1).filter(|(bus, _)| wiring.live(*bus)) {
            let configured = station.load.map_or([0.0; 2], |load| [load.mw, load.mvar]);
            for (meter, power) in Meters::load(bus).into_iter().zip(configured) {
                self.w[meter] = w[meter];
                if w[meter] == 0.0 {
                    (self.z[meter], self.w[meter]) = (0.0, meters.assumed_weight(meter));
                    self.assumed[meter] = power;
                }
            }
        }
        self.lay_out(wiring);
    }

    fn lay_out(&mut self, wiring: &Wiring) {
        let mut angles = [0, 0];
        for (bus, side) in wiring.side.iter().enumerate() {
            angles[side.unwrap_or(TO)] += usize::from(self.w[Meters::deg(bus)] > 0.0);
        }
        let angles_used = angles[FROM] + angles[TO] > 1;
        self.angle_known = wiring.joined() || (angles[FROM] > 0 && angles[TO] > 0);
        self.unknowns = 0;
        let mut next = |wanted: bool| {
            let index = self.unknowns;
            self.unknowns += usize::from(wanted);
            if wanted { index } else { usize::MAX }
        };
        self.v_at.clear();
        self.angle_at.clear();
        for bus in 0..wiring.side.len() {
            let live = wiring.live(bus);
            self.v_at.push(next(live));
            self.angle_at.push(next(live && bus != TO && (bus != FROM || self.angle_known)));
            if !angles_used {
                self.w[Meters::deg(bus)] = 0.0;
            }
        }
        self.offset_at = next(angles_used);
        // What is fixed goes to the one place past the unknowns.
        let fixed = self.unknowns;
        for at in self.v_at.iter_mut().chain(&mut self.angle_at).chain([&mut self.offset_at]) {
            *at = fixed.min(*at);
        }
    }

    /// Measurements in use.
    pub fn count(&self) -> usize {
        self.w.iter().filter(|w| **w > 0.0).count()
    }

    /// Iterates from where the unknowns stand to the least sum of squares and returns it. With a `bend`, residuals beyond it
    /// (in standard deviations) count only linearly.
    pub fn iterate(&mut self, wiring: &Wiring, bend: f64) -> Result<f64, Failure> {
        let settled = if bend.is_finite() { SETTLED_ROBUST } else { SETTLED };
        let (mut before, mut previous, mut halvings) = (f64::INFINITY, 0.0, 0);
        for _ in 0..ITERATIONS {
            let sum = self.assemble(wiring, bend);
            if !sum.is_finite() || sum > before * (1.0 + 1e-9) + 1e-9 {
                halvings += 1;
                if halvings > HALVINGS || before.is_infinite() {
                    return Err(Failure::Restless);
                }
                self.step.iter_mut().for_each(|s| *s *= 0.5);
                self.walk(-1.0);
                continue;
            }
            before = sum;
            self.gain.factor()?;
            self.gain.solve(&mut self.step);
            let mut size: f64 = self.step.iter().map(|s| s.abs()).sum();
            if size > LONGEST_STEP {
                self.step.iter_mut().for_each(|s| *s *= LONGEST_STEP / size);
                size = LONGEST_STEP;
            }
            self.walk(1.0);
            if size * (size / previous).min(1.0) < settled {
                let gained: f64 = self.step.iter().zip(&self.gain.b).map(|(s, b)| s * b).sum();
                let possible = self.v.iter().all(|v| POSSIBLE.contains(v));
                return if possible { Ok((sum - gained).max(0.0)) } else { Err(Failure::Restless) };
            }
            previous = size;
        }
        Err(Failure::Restless)
    }

    fn walk(&mut self, share: f64) {
        for (v, at) in self.v.iter_mut().zip(&self.v_at).chain(self.angle.iter_mut().zip(&self.angle_at)) {
            *v += share * self.step[*at];
        }
        self.offset += share * self.step[self.offset_at];
    }

    /// The normal equations where the unknowns stand; returns the sum of squares there.
    fn assemble(&mut self, wiring: &Wiring, bend: f64) -> f64 {
        let mut loss = Loss { bend, sum: 0.0 };
        self.gain.clear(self.unknowns);
        self.flows.clear();
        for wire in &wiring.wires {
            let [a, b] = wire.buses;
            let flow = wire.flow([self.v[a], self.v[b]], self.angle[a] - self.angle[b]);
            self.add_flow(wire, &flow, &mut loss);
            self.flows.push(flow);
        }
        let mut row = std::mem::take(&mut self.row);
        for bus in (0..wiring.side.len()).filter(|bus| wiring.live(*bus)) {
            let (kv, deg) = (Meters::kv(bus), Meters::deg(bus));
            let residual = self.w[kv] * (self.z[kv] - self.v[bus]);
            let factor = loss.take(residual);
            self.gain.add_ones(&[self.v_at[bus]], factor * self.w[kv], factor * residual);
            if self.w[deg] > 0.0 {
                let residual = self.w[deg] * wrapped(self.z[deg] - self.angle[bus] - self.offset);
                let factor = loss.take(residual);
                let at = [self.angle_at[bus], self.offset_at];
                self.gain.add_ones(&at, factor * self.w[deg], factor * residual);
            }
            for load in Meters::load(bus).into_iter().filter(|load| self.w[*load] > 0.0) {
                let residual = self.row_of(wiring, load, &mut row);
                let factor = loss.take(residual);
                for derivative in &mut row {
                    *derivative *= factor;
                }
                self.gain.add_row(&row, factor * residual);
            }
        }
        self.row = row;
        loss.sum
    }

    /// Adds a circuit's four measurements: first over its two voltages and the angle across, then spread to the unknowns.
    fn add_flow(&mut self, wire: &Wire, flow: &Flow, loss: &mut Loss) {
        let (mut square, mut side) = ([[0.0; 3]; 3], [0.0; 3]);
        for (k, meter) in wire.meters.into_iter().enumerate() {
            let residual = self.w[meter] * (self.z[meter] - flow.s[k]);
            let factor = loss.take(residual);
            let row = flow.d[k].map(|d| factor * self.w[meter] * d);
            for i in 0..3 {
                side[i] += row[i] * factor * residual;
                for j in 0..=i {
                    square[i][j] += row[i] * row[j];
                }
            }
        }
        let [a, b] = wire.buses;
        let at = [(self.v_at[a], 0), (self.v_at[b], 1), (self.angle_at[a], 2), (self.angle_at[b], 2)];
        let signs = [1.0, 1.0, 1.0, -1.0];
        for n in 0..4 {
            let (i, k) = at[n];
            self.gain.b[i] += signs[n] * side[k];
            for m in 0..=n {
                let (j, l) = at[m];
                self.gain.add(i, j, signs[n] * signs[m] * square[k.max(l)][k.min(l)]);
            }
        }
    }

    /// Weighted derivatives of a measurement by the unknowns; returns its weighted residual. Flows must be up to date.
    fn row_of(&self, wiring: &Wiring, meter: Meter, row: &mut Vec<f64>) -> f64 {
        row.clear();
        row.resize(self.unknowns + 1, 0.0);
        let w = self.w[meter];
        let mut add = |at: usize, derivative: f64| row[at] += w * derivative;
        let (bus, kind) = (meter / 4, meter % 4);
        let mut value = 0.0;
        let mut add_flow = |value: &mut f64, k: usize, index: usize, sign: f64| {
            let (flow, [a, b]) = (&self.flows[index], wiring.wires[index].buses);
            *value += sign * flow.s[k];
            let [by_a, by_b, by_angle] = flow.d[k].map(|d| sign * d);
            add(self.v_at[a], by_a);
            add(self.v_at[b], by_b);
            add(self.angle_at[a], by_angle);
            add(self.angle_at[b], -by_angle);
        };
        if bus >= wiring.side.len() {
            if let Some(index) = wiring.wires.iter().position(|wire| wire.meters[kind] == meter) {
                add_flow(&mut value, kind, index, 1.0);
            }
        } else if kind == 0 {
            value = self.v[bus];
            add(self.v_at[bus], 1.0);
        } else if kind == 1 {
            value = self.angle[bus] + self.offset;
            add(self.angle_at[bus], 1.0);
            add(self.offset_at, 1.0);
        } else {
            for (index, wire) in wiring.wires.iter().enumerate() {
                for end in (0..2).filter(|end| wire.buses[*end] == bus) {
                    add_flow(&mut value, 2 * end + kind - 2, index, -1.0);
                }
            }
            value -= self.assumed[meter] * self.v[bus].powi(2);
            add(self.v_at[bus], -2.0 * self.assumed[meter] * self.v[bus]);
        }
        row[self.unknowns] = 0.0;
        let residual = self.z[meter] - value;
        w * if kind == 1 && bus < wiring.side.len() { wrapped(residual) } else { residual }
    }

    /// Fitted voltage of a bus, kV.
    pub fn voltage(&self, corridor: &Corridor, bus: BusIndex) -> C64 {
        C64::from_polar(self.v[bus] * corridor.buses[bus].nominal_kv, self.angle[bus])
    }
}
