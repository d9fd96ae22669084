//! The circuits in service of one topology, as the measurements see them.

use super::meter::{Meter, Meters};
use crate::{
    feed::End,
    grid::{BusIndex, Circuit, Corridor, FROM, TO},
    network::{Branch, C64, Topology},
};

/// Bank states of a circuit whose branch is remembered.
const REMEMBERED: usize = 8;

/// A circuit in service.
#[derive(Debug)]
pub(super) struct Wire {
    pub buses: [BusIndex; 2],
    pub meters: [Meter; 4],
    pub branch: Branch,
    /// Conjugates of the branch admittances at nominal voltages, MVA: first bus, transfer, second bus.
    y: [C64; 3],
}

/// MW and Mvar at the first bus, MW and Mvar at the second; each with its derivatives by the first voltage, the second
/// (per unit of nominal) and the angle of the first bus against the second.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Flow {
    pub s: [f64; 4],
    pub d: [[f64; 3]; 4],
}

/// What one topology joins.
#[derive(Debug)]
pub(super) struct Wiring {
    pub topology: Topology,
    /// By bus: the terminal that holds it, `TO` where both do; `None`: not in service.
    pub side: Vec<Option<BusIndex>>,
    pub wires: Vec<Wire>,
}

/// Branches of circuits by the state of their banks.
#[derive(Debug)]
pub(super) struct Branches(Vec<Vec<(Vec<bool>, Branch)>>);

impl Branches {
    pub fn new(corridor: &Corridor) -> Self {
        Self(vec![Vec::new(); corridor.circuits.len()])
    }

    fn of(&mut self, index: usize, circuit: &Circuit, inserted: &[bool]) -> Branch {
        let known = &mut self.0[index];
        if let Some((_, branch)) = known.iter().find(|(state, _)| state == inserted) {
            return *branch;
        }
        if known.len() == REMEMBERED {
            known.clear();
        }
        let branch = Branch::of(circuit, inserted);
        known.push((inserted.to_vec(), branch));
        branch
    }
}

impl Wire {
    /// S₁ = v₁²·Y₁₁* + v₁v₂·e^{jδ}·Y₁₂*, S₂ likewise (Abur & Expósito 2004, §2.5), with their derivatives.
    pub fn flow(&self, [v1, v2]: [f64; 2], angle: f64) -> Flow {
        let [y11, y12, y22] = self.y;
        let (sin, cos) = angle.sin_cos();
        let ahead = C64::new(cos, sin) * y12;
        let behind = C64::new(cos, -sin) * y12;
        let s1 = y11 * (v1 * v1) + ahead * (v1 * v2);
        let s2 = y22 * (v2 * v2) + behind * (v1 * v2);
        let d1 = [y11 * (2.0 * v1) + ahead * v2, ahead * v1, C64::i() * ahead * (v1 * v2)];
        let d2 = [behind * v2, y22 * (2.0 * v2) + behind * v1, -C64::i() * behind * (v1 * v2)];
        Flow {
            s: [s1.re, s1.im, s2.re, s2.im],
            d: [d1.map(|d| d.re), d1.map(|d| d.im), d2.map(|d| d.re), d2.map(|d| d.im)],
        }
    }

    /// Angle of the first bus against the second that MW at an end mean, on the stable side.
    pub fn angle_by_mw(&self, end: End, mw: f64, [v1, v2]: [f64; 2]) -> f64 {
        let [y11, y12, y22] = self.y;
        let through = match end {
            End::From => mw - v1 * v1 * y11.re,
            End::To => mw - v2 * v2 * y22.re,
        };
        // through = v₁v₂·|Y₁₂|·cos(angle + arg Y₁₂*), where the argument is near -90°, or 90° when overcompensated.
        let lean = y12.arg();
        let arc = (through / (v1 * v2 * y12.norm())).clamp(-1.0, 1.0).acos();
        let angle = -lean + arc.copysign(lean);
        match end {
            End::From => angle,
            End::To => -angle,
        }
    }
}

impl Wiring {
    pub fn new(corridor: &Corridor, topology: &Topology, meters: &Meters, branches: &mut Branches) -> Self {
        let side = sides(corridor, topology);
        let wire = |(index, circuit): (usize, &Circuit)| {
            let [first, second] = circuit.between;
            let branch = branches.of(index, circuit, &topology.inserted[index]);
            let [u1, u2] = circuit.between.map(|bus| corridor.buses[bus].nominal_kv);
            let y = [branch.y11 * (u1 * u1), branch.y12 * (u1 * u2), branch.y22 * (u2 * u2)].map(|y| y.conj());
            Wire { buses: [first, second], meters: meters.flow(index), branch, y }
        };
        let in_service =
            |(index, circuit): &(usize, &Circuit)| topology.closed[*index] && side[circuit.between[0]].is_some();
        let wires = corridor.circuits.iter().enumerate().filter(in_service).map(wire).collect();
        Self { topology: topology.clone(), side, wires }
    }

    /// Whether closed circuits join the terminals.
    pub fn joined(&self) -> bool {
        self.side[FROM] == Some(TO)
    }

    pub fn live(&self, bus: BusIndex) -> bool {
        self.side[bus].is_some()
    }
}

fn sides(corridor: &Corridor, topology: &Topology) -> Vec<Option<BusIndex>> {
    let mut side = vec![None; corridor.buses.len()];
    for terminal in [TO, FROM] {
        side[terminal] = side[terminal].or(Some(terminal));
        let mut grew = true;
        while grew {
            grew = false;
            for (circuit, _) in corridor.circuits.iter().zip(&topology.closed).filter(|(_, closed)| **closed) {
                let [a, b] = circuit.between;
                if side[a].is_some() != side[b].is_some() {
                    let held = side[a].or(side[b]);
                    (side[a], side[b]) = (held, held);
                    grew = true;
                }
            }
        }
    }
    side
}
