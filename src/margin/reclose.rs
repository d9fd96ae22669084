//! Whether an open circuit may be closed now: standing angle and voltage difference across it against the
//! synchronism-check setting.

use super::{Reclose, case::seat, root, stress::Stress, view::View};
use crate::{
    grid::Corridor,
    network::{C64, Topology},
};

/// Every open circuit, `voltage` being the present one by bus (zero: dead).
pub(super) fn judge(
    corridor: &Corridor,
    topology: &Topology,
    view: &View,
    stress: &Stress,
    angle_rad: f64,
    voltage: &[C64],
) -> Vec<Reclose> {
    let open = (0..corridor.circuits.len()).filter(|circuit| !topology.closed[*circuit]);
    open.map(|circuit| {
        let between = corridor.circuits[circuit].between;
        let mut reclose = Reclose::of(corridor, circuit, between.map(|bus| voltage[bus]));
        let widest = corridor.reclose.max_angle_deg.to_radians();
        if reclose.angle_deg.is_some_and(|angle| angle > corridor.reclose.max_angle_deg) {
            let [first, second] = between.map(|bus| view.voltage(seat(view.exporter, bus)));
            let room = |angle: f64| widest - (first.at(angle) * second.at(angle).conj()).arg().abs();
            let least = room(stress.start_rad);
            reclose.transfer_to_fit_mw = (least >= 0.0).then(|| {
                let now = (angle_rad, room(angle_rad));
                stress.transfer_at(root::bracketed((stress.start_rad, least), now, 1e-9, room))
            });
        }
        reclose
    })
    .collect()
}

impl Reclose {
    /// An open circuit with the voltages of its two buses, kV; zero where one is dead.
    pub(crate) fn of(corridor: &Corridor, circuit: usize, [first, second]: [C64; 2]) -> Self {
        let ends = &corridor.circuits[circuit];
        let alive = first.norm_sqr() > 0.0 && second.norm_sqr() > 0.0;
        let angle_deg = alive.then(|| (first * second.conj()).arg().to_degrees().abs());
        let nominal_kv = corridor.buses[ends.between[0]].nominal_kv;
        let voltage_pct = alive.then(|| 100.0 * (first.norm() - second.norm()).abs() / nominal_kv);
        let setting = corridor.reclose;
        let allowed = angle_deg
            .zip(voltage_pct)
            .map(|(angle, voltage)| angle <= setting.max_angle_deg && voltage <= setting.max_voltage_pct);
        Self { circuit: ends.name.clone(), angle_deg, voltage_pct, allowed, transfer_to_fit_mw: None }
    }
}
