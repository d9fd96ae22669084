//! What a corridor was planned to be at a time: complete, undisturbed, delivering what it is told to.

use super::{CorridorTruth, Dispatch, LoadTruth, plant::Plant};
use crate::{
    grid::Corridor,
    margin::PowerAngle,
    network::{C64, Topology},
};

/// The complete corridor between its sources as planned.
#[derive(Debug, Clone)]
pub(super) struct Plan {
    plant: Plant,
    nominal_kv: Vec<f64>,
    share_from: f64,
    /// Loads of the moment by bus, S.
    pub load_s: Vec<C64>,
    /// Planned voltages of the moment, kV.
    pub e_kv: [f64; 2],
}

impl Plan {
    /// A plan that has not begun.
    pub fn new(corridor: &Corridor, truth: &CorridorTruth) -> Self {
        Self {
            plant: Plant::new(corridor, &Topology::complete(corridor), None),
            nominal_kv: corridor.buses.iter().map(|bus| bus.nominal_kv).collect(),
            share_from: share_from(truth),
            load_s: Vec::new(),
            e_kv: [0.0; 2],
        }
    }

    /// Goes to a time.
    pub fn go_to(&mut self, truth: &CorridorTruth, time_s: f64) {
        self.e_kv = [0, 1].map(|side| truth.sides[side].e_kv.at(time_s));
        self.load_s.clear();
        self.load_s.extend(truth.loads.iter().zip(&self.nominal_kv).map(|(load, kv)| {
            let drawn =
                |load: &LoadTruth| C64::new(load.nominal.mw, -load.nominal.mvar) * load.shape.at(time_s) / (kv * kv);
            load.as_ref().map_or(C64::new(0.0, 0.0), drawn)
        }));
        self.plant.attach(&self.load_s, impedances(truth));
    }

    /// Transfer over the internal angle.
    pub fn transfer(&self) -> PowerAngle {
        self.plant.curve(self.e_kv, Plant::transfer_mw)
    }

    /// What the machines deliver between them, MW: `P_e` of the plan at the angle it needs.
    pub fn p_m_mw(&self, dispatch: &Dispatch, time_s: f64) -> f64 {
        let angle_rad = match dispatch {
            Dispatch::Angle(shape) => shape.at(time_s),
            Dispatch::Transfer(shape) => {
                let curve = self.transfer();
                curve.shift_rad + ((shape.at(time_s) - curve.mean_mw) / curve.amplitude_mw).clamp(-1.0, 1.0).asin()
            }
        };
        self.plant.swing_curve(self.e_kv, self.share_from).at(angle_rad)
    }
}

/// The impedances that both sides begin with, ohm.
pub(super) fn impedances(truth: &CorridorTruth) -> [C64; 2] {
    [0, 1].map(|side| C64::new(truth.sides[side].r_ohm, truth.sides[side].x_ohm))
}

/// The `from` side's share in `P_e`: `W_to/(W_from + W_to)`, half where both sides are infinite.
pub(super) fn share_from(truth: &CorridorTruth) -> f64 {
    match [0, 1].map(|side| truth.sides[side].stored_energy_mws) {
        [Some(from), Some(to)] => to / (from + to),
        [Some(_), None] => 1.0,
        [None, Some(_)] => 0.0,
        [None, None] => 0.5,
    }
}
