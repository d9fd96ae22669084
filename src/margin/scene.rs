//! One topology between sources: the stress from there, the limits, the tightest of them.

use super::{
    Criterion, Intact, IntactLimits, Machine, OutageLimits,
    case::CaseSet,
    outage::Outage,
    stress::{Sources, Stress},
    view::View,
};
use crate::{
    grid::{Circuit, Corridor},
    network::C64,
};

/// What sets the headroom, by index.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Tightest {
    pub limit_mw: f64,
    /// `None`: the intact corridor.
    pub outage: Option<usize>,
    pub criterion: Criterion,
}

/// One topology with everything that does not depend on the impedance of the sources.
pub(super) struct Scene<'a> {
    pub corridor: &'a Corridor,
    pub set: &'a CaseSet,
    pub machine: Machine,
    pub loads: &'a [C64],
    /// Voltages of exporter and importer, kV.
    pub terminals: [C64; 2],
}

fn continuous(circuit: &Circuit) -> Option<f64> {
    circuit.rating_a
}

impl Scene<'_> {
    /// E = V + Z·I with the present voltages and currents, and the stress from there; exporter first.
    pub fn stress(&self, z: [C64; 2]) -> (Stress, [C64; 2]) {
        let y = &self.set.present.network.reduced.y;
        let [vx, vi] = self.terminals;
        let e = [vx + z[0] * (y.m11 * vx + y.m12 * vi), vi + z[1] * (y.m21 * vx + y.m22 * vi)];
        let [x, i] = [self.set.exporter, 1 - self.set.exporter];
        let swing_x_ohm = [x, i].map(|side| self.corridor.sides[side].source.swing_x_ohm);
        let sources = Sources { z, swing_x_ohm, e_kv: e.map(C64::norm) };
        (Stress::new(&self.set.present, sources, self.machine, self.loads[0]), e)
    }

    pub fn view<'b>(&'b self, stress: &'b Stress) -> View<'b> {
        View {
            corridor: self.corridor,
            exporter: self.set.exporter,
            case: &self.set.present,
            settled: &stress.settled,
            e_kv: stress.sources.e_kv,
        }
    }

    pub fn intact(&self, stress: &Stress, angle_rad: f64) -> Intact {
        let loaded = self.view(stress).loading(angle_rad, continuous);
        Intact {
            peak_mw: stress.settled.peak_mw(),
            angle_margin_deg: (stress.end_rad - angle_rad).to_degrees(),
            loading_pct: loaded.as_ref().map(|loaded| loaded.pct),
            loaded_circuit: loaded.map(|loaded| loaded.circuit),
            limit_mw: self.intact_limits(stress),
        }
    }

    pub fn intact_limits(&self, stress: &Stress) -> IntactLimits {
        let view = self.view(stress);
        let angle = stress.end_rad - self.corridor.require.intact_angle_margin_deg.to_radians();
        let within = |angle: f64| (angle < stress.end_rad).then(|| stress.transfer_at(angle));
        IntactLimits {
            angle: Some(stress.transfer_at(angle.max(stress.start_rad))),
            loading: view.overload_rad(stress.start_rad, continuous).and_then(within),
            voltage: view.sag_rad(stress.start_rad).and_then(within),
        }
    }

    pub fn tightest(&self, stress: &Stress, now_rad: f64) -> Tightest {
        let limits = self.set.outages.iter().map(|case| {
            Outage::new(self.corridor, self.set.exporter, case, stress)
                .map_or_else(|| separation(self.corridor), |outage| outage.limits(now_rad))
        });
        tightest(limits, &self.intact_limits(stress), stress)
    }
}

/// The tightest of all limits; the peak of the present curve where there is none.
pub(super) fn tightest(
    outages: impl Iterator<Item = OutageLimits>,
    intact: &IntactLimits,
    stress: &Stress,
) -> Tightest {
    let peak = stress.transfer_at(stress.end_rad);
    let mut tightest = Tightest { limit_mw: peak, outage: None, criterion: Criterion::Angle };
    let mut consider = |outage, criterion, limit: Option<f64>| {
        if let Some(limit_mw) = limit.filter(|limit_mw| *limit_mw < tightest.limit_mw) {
            tightest = Tightest { limit_mw, outage, criterion };
        }
    };
    for (index, limits) in outages.enumerate() {
        consider(Some(index), Criterion::Separation, limits.separation);
        consider(Some(index), Criterion::Angle, limits.angle);
        consider(Some(index), Criterion::Area, limits.area);
        consider(Some(index), Criterion::Loading, limits.loading);
        consider(Some(index), Criterion::Voltage, limits.voltage);
    }
    consider(None, Criterion::Angle, intact.angle);
    consider(None, Criterion::Loading, intact.loading);
    consider(None, Criterion::Voltage, intact.voltage);
    tightest
}

/// Limits of an outage that separates the corridor.
pub(super) fn separation(corridor: &Corridor) -> OutageLimits {
    OutageLimits { separation: (!corridor.require.accept_separation).then_some(0.0), ..OutageLimits::default() }
}
