//! A corridor between its two sources, solved.

use crate::{
    feed::End,
    grid::{BusIndex, Circuit, Corridor, FROM, Fault, TO},
    margin::PowerAngle,
    network::{Admittance, Branch, C64, FaultedBranch, M2, Reduced, Topology},
};

const ZERO: C64 = C64::new(0.0, 0.0);

/// A fault on a circuit, and the end of it that its place is counted from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct FaultOn {
    pub circuit: usize,
    pub fault: Fault,
    pub counted_from: End,
}

/// The corridor in one topology, with its loads and what stands behind its terminals.
#[derive(Debug, Clone)]
pub(super) struct Plant {
    branches: Vec<Branch>,
    between: Vec<[BusIndex; 2]>,
    circuits: Admittance,
    /// Buses that are neither cut off nor shorted.
    live: Vec<bool>,
    all: Admittance,
    reduced: Reduced,
    terminal_load_s: [C64; 2],
    z_ohm: [C64; 2],
    /// Terminal voltages = `gain` · source voltages.
    gain: M2,
}

impl Plant {
    /// Without loads, between stiff buses, until [`Self::attach`].
    pub fn new(corridor: &Corridor, topology: &Topology, fault: Option<FaultOn>) -> Self {
        let mut circuits = Admittance::new(corridor.buses.len());
        let mut live = topology.live(corridor);
        let branch = |(index, circuit): (usize, &Circuit)| {
            let inserted = &topology.inserted[index];
            let branch = match fault.filter(|on| on.circuit == index) {
                _ if !topology.closed[index] => Branch { y11: ZERO, y12: ZERO, y22: ZERO },
                None => Branch::of(circuit, inserted),
                Some(FaultOn { fault, counted_from, .. }) => {
                    let faulted = FaultedBranch::of(circuit, inserted, fault.kind, fault.at, counted_from);
                    if let Some(end) = faulted.shorted {
                        live[circuit.between[end as usize]] = false;
                    }
                    faulted.branch
                }
            };
            circuits.add(circuit.between, branch);
            branch
        };
        let branches = corridor.circuits.iter().enumerate().map(branch).collect();
        Self {
            branches,
            between: corridor.circuits.iter().map(|circuit| circuit.between).collect(),
            circuits,
            live,
            all: Admittance::new(0),
            reduced: Reduced::default(),
            terminal_load_s: [ZERO; 2],
            z_ohm: [ZERO; 2],
            gain: M2::identity(),
        }
    }

    /// Connects loads (S, by bus) and the sources' impedances.
    ///
    /// With I = Y V and E = V + Z I at the terminals, V = (1 + Z Y)⁻¹ E; a shorted terminal stays at zero and
    /// leaves the other on its own.
    pub fn attach(&mut self, load_s: &[C64], z_ohm: [C64; 2]) {
        self.all.copy_from(&self.circuits);
        for (bus, y) in load_s.iter().enumerate() {
            self.all.add_shunt(bus, *y);
        }
        self.all.reduce_into(&self.live, &mut self.reduced);
        self.terminal_load_s = [load_s[FROM], load_s[TO]];
        self.z_ohm = z_ohm;
        let y = self.reduced.y;
        let one = C64::new(1.0, 0.0);
        let (a, b) = (one + z_ohm[0] * y.m11, z_ohm[0] * y.m12);
        let (c, d) = (z_ohm[1] * y.m21, one + z_ohm[1] * y.m22);
        self.gain = match (self.live[FROM], self.live[TO]) {
            (true, true) => M2::new(d, -b, -c, a) / (a * d - b * c),
            (true, false) => M2::new(a.inv(), ZERO, ZERO, ZERO),
            (false, true) => M2::new(ZERO, ZERO, ZERO, d.inv()),
            (false, false) => M2::zeros(),
        };
    }

    fn terminals(&self, e_kv: [C64; 2]) -> [C64; 2] {
        [self.gain.m11 * e_kv[0] + self.gain.m12 * e_kv[1], self.gain.m21 * e_kv[0] + self.gain.m22 * e_kv[1]]
    }

    /// Voltages of all buses, kV.
    pub fn voltages(&self, e_kv: [C64; 2], voltages_kv: &mut Vec<C64>) {
        let v = self.terminals(e_kv);
        voltages_kv.clear();
        voltages_kv.extend(v);
        voltages_kv.extend(self.reduced.stations.iter().map(|row| row[0] * v[0] + row[1] * v[1]));
    }

    /// Power from a bus into a circuit, MVA, given the voltages of all buses.
    pub fn flow(&self, circuit: usize, end: End, voltages_kv: &[C64]) -> C64 {
        let [first, second] = self.between[circuit].map(|bus| voltages_kv[bus]);
        let own = match end {
            End::From => first,
            End::To => second,
        };
        own * self.branches[circuit].current(end, first, second).conj()
    }

    /// Active power that leaves the two sources, MW.
    pub fn source_mw(&self, e_kv: [C64; 2]) -> [f64; 2] {
        let v = self.terminals(e_kv);
        let y = self.reduced.y;
        let drawn = [y.m11 * v[0] + y.m12 * v[1], y.m21 * v[0] + y.m22 * v[1]];
        [0, 1].map(|side| {
            let z = self.z_ohm[side];
            let current = if z.norm_sqr() > 0.0 { (e_kv[side] - v[side]) / z } else { drawn[side] };
            (e_kv[side] * current.conj()).re
        })
    }

    /// Active power from the `from` terminal into the circuits, MW.
    pub fn transfer_mw(&self, e_kv: [C64; 2]) -> f64 {
        let v = self.terminals(e_kv);
        let y = self.reduced.y;
        let current = (y.m11 - self.terminal_load_s[FROM]) * v[0] + y.m12 * v[1];
        (v[0] * current.conj()).re
    }

    /// A power of this plant over the angle between sources of these magnitudes.
    ///
    /// Any such power is C + D sin(δ − γ) (Kimbark 1948, vol. 1, ch. 4), so three angles fix it.
    pub fn curve(&self, e_kv: [f64; 2], power_mw: impl Fn(&Self, [C64; 2]) -> f64) -> PowerAngle {
        let at = |re: f64, im: f64| power_mw(self, [C64::new(re, im) * e_kv[0], C64::new(e_kv[1], 0.0)]);
        let (ahead, abeam, opposite) = (at(1.0, 0.0), at(0.0, 1.0), at(-1.0, 0.0));
        let mean_mw = f64::midpoint(ahead, opposite);
        let (cosine, sine) = (f64::midpoint(ahead, -opposite), abeam - mean_mw);
        PowerAngle { mean_mw, amplitude_mw: sine.hypot(cosine), shift_rad: (-cosine).atan2(sine) }
    }

    /// `P_e` of the two-machine equivalent: a·Pf − (1 − a)·Pt with the powers that leave the two sources and the
    /// `from` side's share a.
    pub fn swing_curve(&self, e_kv: [f64; 2], share_from: f64) -> PowerAngle {
        self.curve(e_kv, |plant, e| {
            let [from, to] = plant.source_mw(e);
            share_from * from - (1.0 - share_from) * to
        })
    }
}
