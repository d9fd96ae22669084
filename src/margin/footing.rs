//! From one state to another: switches thrown, the transfer shifted, between the sources and with the loads of the first.

use super::{Engine, Present, Seated, case::seat, stress::Stress, view::View};
use crate::{
    grid::{Corridor, TO},
    network::{C64, Topology},
};

/// Where a state stands on its settled curve, and between which sources.
#[derive(Debug, Clone, Copy)]
pub struct Footing {
    pub(super) stress: Stress,
    pub(super) angle_rad: f64,
}

impl Engine {
    /// Voltages by bus, kV with `to` at angle 0, once the switches stand as in `after` and the exporter's transfer is
    /// shifted by so many MW. The machines deliver through the switching what they did, the angle settles anew; then
    /// it opens or closes until the transfer fits. `None` where there is no such balance. Where nothing joins the
    /// terminals any more, the angle between the two parts has no meaning.
    pub fn moved(
        &mut self,
        corridor: &Corridor,
        now: &Present,
        seated: &Seated,
        footing: &Footing,
        after: &Topology,
        shift_mw: f64,
    ) -> Option<Vec<C64>> {
        let exporter = seated.exporter;
        let index = self.find(corridor, after, exporter);
        let case = &mut self.sets[index].1.present;
        case.network.set_loads(&seated.loads, &mut self.scratch);
        let stress = footing.stress.in_network(case);
        let angle_rad = if after.joins_terminals(corridor) {
            let p_m_mw = footing.stress.p_m_mw(footing.angle_rad);
            let stays = now.topology == after;
            let settled_rad = if stays { footing.angle_rad } else { stress.settled.curve.rising_rad(p_m_mw)? };
            stress.shifted_rad(settled_rad, shift_mw)?
        } else {
            footing.angle_rad
        };
        let view = View { corridor, exporter, case, settled: &stress.settled, e_kv: stress.sources.e_kv };
        let voltage_of = |bus| view.voltage(seat(exporter, bus)).at(angle_rad);
        let upright = C64::cis(-voltage_of(TO).arg());
        Some((0..corridor.buses.len()).map(|bus| voltage_of(bus) * upright).collect())
    }
}
