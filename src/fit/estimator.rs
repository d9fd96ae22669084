//! Weighted least squares by Gauss–Newton on one topology (Schweppe 1970; Abur & Expósito 2004, ch. 2).
//!
//! Unknowns are, for each bus in service, the voltage per unit of nominal and the angle (but that of `to`, and that of `from`
//! where nothing tells it), and one angle common to all angle channels.

use super::{
    gain::{Gain, Singular},
    meter::{Meter, Meters},
    wiring::{Flow, Wiring},
};
use crate::{
    feed::End,
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
#[derive(Debug, Default)]
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
    angle - std::f64::consts::TAU * (angle / std::f64::consts::TAU).round()
}

impl Estimator {
    /// Takes the measurements that concern this topology and lays the unknowns out.
    pub fn prepare(&mut self, corridor: &Corridor, meters: &Meters, wiring: &Wiring, z: &[f64], w: &[f64]) {
        let buses = corridor.buses.len();
        self.z.clear();
        self.z.extend_from_slice(z);
        self.w.clear();
        self.w.resize(w.len(), 0.0);
        self.assumed.clear();
        self.assumed.resize(w.len(), 0.0);
        for wire in &wiring.wires {
            for meter in wire.meters {
                self.w[meter] = w[meter];
            }
        }
        let mut angles = [0, 0];
        for bus in 0..buses {
            let Some(side) = wiring.side[bus] else { continue };
            self.w[Meters::kv(bus)] = w[Meters::kv(bus)];
            angles[side] += usize::from(w[Meters::deg(bus)] > 0.0);
            if bus > TO {
                let configured = corridor.buses[bus].load.map_or([0.0; 2], |load| [load.mw, load.mvar]);
                for (meter, power) in Meters::load(bus).into_iter().zip(configured) {
                    self.w[meter] = w[meter];
                    if w[meter] == 0.0 {
                        self.w[meter] = meters.assumed_weight(meter);
                        self.z[meter] = 0.0;
                        self.assumed[meter] = power;
                    }
                }
            }
        }
        let angles_used = angles[FROM] + angles[TO] >= 2;
        self.angle_known = wiring.joined() || (angles[FROM] > 0 && angles[TO] > 0);
        self.unknowns = 0;
        let mut next = |wanted: bool| {
            let index = self.unknowns;
            self.unknowns += usize::from(wanted);
            if wanted { index } else { usize::MAX }
        };
        self.v_at.clear();
        self.angle_at.clear();
        for bus in 0..buses {
            let live = wiring.live(bus);
            self.v_at.push(next(live));
            self.angle_at.push(next(live && bus != TO && (bus != FROM || self.angle_known)));
            if live && angles_used {
                self.w[Meters::deg(bus)] = w[Meters::deg(bus)];
            }
        }
        self.offset_at = next(angles_used);
        let fixed = self.unknowns;
        for at in self.v_at.iter_mut().chain(&mut self.angle_at).chain([&mut self.offset_at]) {
            *at = fixed.min(*at);
        }
    }

    /// Measurements in use.
    pub fn count(&self) -> usize {
        self.w.iter().filter(|w| **w > 0.0).count()
    }

    /// A start near the state even if some measurements are far off: measured voltages where they are possible, and angles
    /// from bus to bus as the middle one of what the MW readings say.
    pub fn start(&mut self, wiring: &Wiring) {
        let buses = wiring.side.len();
        self.v.clear();
        self.v.extend((0..buses).map(|bus| {
            let kv = Meters::kv(bus);
            if self.w[kv] > 0.0 && (0.5..1.5).contains(&self.z[kv]) { self.z[kv] } else { 1.0 }
        }));
        self.angle.clear();
        self.angle.resize(buses, f64::NAN);
        self.angle[TO] = 0.0;
        if !wiring.joined() {
            self.angle[FROM] = 0.0;
        }
        for _ in 0..buses {
            for bus in 0..buses {
                if wiring.live(bus) && self.angle[bus].is_nan() {
                    self.angle[bus] = self.guess_angle(wiring, bus).unwrap_or(f64::NAN);
                }
            }
        }
        let reference = (0..buses).find(|bus| self.w[Meters::deg(*bus)] > 0.0);
        self.offset = reference.map_or(0.0, |bus| self.z[Meters::deg(bus)] - self.angle[bus]);
    }

    /// The middle of what the circuits to buses of known angle say; `None` without such a circuit.
    fn guess_angle(&mut self, wiring: &Wiring, bus: BusIndex) -> Option<f64> {
        self.guesses.clear();
        let mut neighbour = None;
        for wire in &wiring.wires {
            let [first, second] = wire.buses;
            let (known, sign) = if first == bus { (self.angle[second], 1.0) } else { (self.angle[first], -1.0) };
            if (first != bus && second != bus) || known.is_nan() {
                continue;
            }
            neighbour = Some(known);
            let v = wire.buses.map(|bus| self.v[bus]);
            for (end, mw) in [(End::From, wire.meters[0]), (End::To, wire.meters[2])] {
                if self.w[mw] > 0.0 {
                    self.guesses.push(known + sign * wire.angle_by_mw(end, self.z[mw], v));
                }
            }
        }
        self.guesses.sort_unstable_by(f64::total_cmp);
        let count = self.guesses.len();
        if count == 0 {
            return neighbour;
        }
        let [low, high] = [self.guesses[(count - 1) / 2], self.guesses[count / 2]];
        Some(if high.abs() < low.abs() { high } else { low })
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
            // First over the two voltages and the angle across, then spread to the unknowns.
            let (mut square, mut side) = ([[0.0; 3]; 3], [0.0; 3]);
            for k in 0..4 {
                let w = self.w[wire.meters[k]];
                let residual = w * (self.z[wire.meters[k]] - flow.s[k]);
                let factor = loss.take(residual);
                let row = flow.d[k].map(|d| factor * w * d);
                for i in 0..3 {
                    side[i] += row[i] * factor * residual;
                    for j in 0..=i {
                        square[i][j] += row[i] * row[j];
                    }
                }
            }
            let at = [
                (self.v_at[a], 0, 1.0),
                (self.v_at[b], 1, 1.0),
                (self.angle_at[a], 2, 1.0),
                (self.angle_at[b], 2, -1.0),
            ];
            for (n, (i, k, sign)) in at.into_iter().enumerate() {
                self.gain.b[i] += sign * side[k];
                for &(j, l, other) in &at[..=n] {
                    self.gain.add(i, j, sign * other * square[k.max(l)][k.min(l)]);
                }
            }
            self.flows.push(flow);
        }
        for bus in (0..wiring.side.len()).filter(|bus| wiring.live(*bus)) {
            let kv = Meters::kv(bus);
            let w = self.w[kv];
            let residual = w * (self.z[kv] - self.v[bus]);
            let factor = loss.take(residual);
            self.gain.b[self.v_at[bus]] += factor * factor * w * residual;
            self.gain.add(self.v_at[bus], self.v_at[bus], (factor * w).powi(2));
            for meter in kv + 1..kv + 4 {
                if self.w[meter] > 0.0 {
                    let mut row = std::mem::take(&mut self.row);
                    let residual = self.row_of(wiring, meter, &mut row);
                    let factor = loss.take(residual);
                    row.iter_mut().for_each(|a| *a *= factor);
                    self.gain.add_row(&row, factor * residual);
                    self.row = row;
                }
            }
        }
        loss.sum
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

    /// Whether MW and angle channels alone fix the angles: Mvar cannot tell which way power goes.
    pub fn angles_fixed(&mut self, wiring: &Wiring) -> bool {
        if wiring.wires.iter().all(|wire| self.w[wire.meters[0]] + self.w[wire.meters[2]] > 0.0) {
            return true;
        }
        self.assemble(wiring, f64::INFINITY);
        self.gain.clear(self.unknowns);
        let mut row = std::mem::take(&mut self.row);
        for meter in (0..self.w.len()).filter(|meter| self.w[*meter] > 0.0) {
            let active = if meter / 4 < wiring.side.len() { matches!(meter % 4, 1 | 2) } else { meter % 2 == 0 };
            if active {
                let residual = self.row_of(wiring, meter, &mut row);
                self.v_at.iter().for_each(|at| row[*at] = 0.0);
                self.gain.add_row(&row, residual);
            }
        }
        self.row = row;
        for &at in &self.v_at {
            self.gain.add(at, at, f64::MAX.sqrt());
        }
        self.gain.factor().is_ok()
    }

    /// The measurement with the largest normalised residual |r|/√Ω (Abur & Expósito 2004, §5.7), where the equations are made
    /// linear at a robust estimate, which a gross error does not drag along. Critical measurements (Ω = 0) say nothing.
    pub fn worst(&mut self, wiring: &Wiring) -> Option<Meter> {
        const BEND: f64 = 3.0;
        const CRITICAL: f64 = 1e-5;
        self.start(wiring);
        // Wherever it ends is nearer than where it started.
        let _ = self.iterate(wiring, BEND);
        self.assemble(wiring, f64::INFINITY);
        self.gain.factor().ok()?;
        self.gain.solve(&mut self.step);
        let mut row = std::mem::take(&mut self.row);
        let mut worst = None;
        let mut largest = 0.0;
        for meter in (0..self.w.len()).filter(|meter| self.w[*meter] > 0.0) {
            let before = self.row_of(wiring, meter, &mut row);
            let residual = before - row.iter().zip(&self.step).map(|(h, s)| h * s).sum::<f64>();
            self.gain.forward(&mut row);
            let omega = 1.0 - row[..self.unknowns].iter().map(|y| y * y).sum::<f64>();
            let normalised = residual.abs() / omega.sqrt();
            if omega > CRITICAL && normalised > largest * (1.0 + 1e-9) {
                (worst, largest) = (Some(meter), normalised);
            }
        }
        self.row = row;
        worst
    }

    /// Fitted voltage of a bus, kV.
    pub fn voltage(&self, corridor: &Corridor, bus: BusIndex) -> C64 {
        C64::from_polar(self.v[bus] * corridor.buses[bus].nominal_kv, self.angle[bus])
    }
}
