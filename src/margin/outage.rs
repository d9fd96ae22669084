//! One outage: what it leaves at any point of the stress, and the transfers up to which each criterion holds.

use std::f64::consts::TAU;

use super::{
    OutageLimits, OutagePicture, OutageRecord, PowerAngle,
    case::{Case, Network, OutageCase},
    equal_area::Well,
    face::{Face, Kernel},
    root,
    stress::{Settled, Stress, SwingPoint},
    swing::{Moment, Swing},
    view::View,
};
use crate::{
    grid::{BusIndex, Circuit, Corridor},
    network::C64,
};

/// Beyond this a critical clearing time is not looked for, s.
const LONGEST_FAULT_S: f64 = 2.0;
const ANGLE_TOLERANCE_RAD: f64 = 1e-8;

/// The network after an outage, with the settled sources and those of the swing.
pub(super) struct Outage<'a> {
    corridor: &'a Corridor,
    case: &'a OutageCase,
    after: &'a Case,
    exporter: BusIndex,
    stress: &'a Stress,
    settled: Settled,
    swing: Kernel,
    fault: Option<Kernel>,
}

/// The swing after an outage at one point of the stress.
struct FirstSwing {
    curve: PowerAngle,
    fault: Option<Swing>,
    start_rad: f64,
    cleared: Moment,
    well: Option<Well>,
    /// ½ M ω² + V(δ) when the fault is cleared, MW·rad.
    energy: f64,
}

fn short_time(circuit: &Circuit) -> Option<f64> {
    circuit.short_time_rating_a
}

impl<'a> Outage<'a> {
    /// `None` where the outage separates the corridor.
    pub fn new(corridor: &'a Corridor, exporter: BusIndex, case: &'a OutageCase, stress: &'a Stress) -> Option<Self> {
        let after = case.after.as_ref()?;
        let settled = Settled::new(after, &stress.sources, &stress.machine, stress.load);
        let z = stress.sources.swing_z();
        let swing = swing_face(&after.network, z).kernel(&stress.machine);
        let fault = case.fault.as_ref().map(|network| swing_face(network, z).kernel(&stress.machine));
        Some(Self { corridor, case, after, exporter, stress, settled, swing, fault })
    }

    fn view(&self) -> View<'_> {
        let Self { corridor, exporter, after, settled, stress, .. } = self;
        View { corridor, exporter: *exporter, case: after, settled, e_kv: stress.sources.e_kv }
    }

    fn first_swing(&self, point: &SwingPoint) -> FirstSwing {
        let &SwingPoint { e_kv, angle_rad, p_m_mw } = point;
        let curve = self.swing.curve(e_kv);
        let inertia = self.stress.machine.inertia;
        let fault = self.fault.filter(|_| inertia.is_finite()).map(|kernel| Swing {
            curve: kernel.curve(e_kv),
            p_m_mw,
            inertia,
        });
        let (cleared, kinetic) = match (&fault, &self.corridor.fault) {
            (Some(swing), Some(fault)) => {
                let cleared = swing.after(Moment::at_rest(angle_rad), fault.clear_ms / 1000.0);
                // What cannot be followed is not survived: past any tipping point.
                let cleared = cleared.unwrap_or_else(|| Moment::at_rest(angle_rad + 2.0 * TAU));
                (cleared, swing.kinetic(&cleared))
            }
            _ => (Moment::at_rest(angle_rad), 0.0),
        };
        let well = Well::new(curve, p_m_mw);
        let energy = kinetic + well.as_ref().map_or(0.0, |well| well.potential(cleared.angle_rad)).max(0.0);
        FirstSwing { curve, fault, start_rad: angle_rad, cleared, well, energy }
    }

    /// Everything about the outage at the present internal angle.
    pub fn record(&self, angle_rad: f64, point: &SwingPoint, limit_mw: OutageLimits) -> OutageRecord {
        let equilibrium = self.settled.curve.rising_rad(self.stress.p_m_mw(angle_rad));
        let view = self.view();
        let loaded = equilibrium.and_then(|angle| view.loading(angle, short_time));
        let swing = self.first_swing(point);
        let swing_peak_rad = swing.peak_rad();
        OutageRecord {
            name: self.case.name.clone(),
            separates: false,
            peak_mw: Some(self.settled.peak_mw()),
            angle_deg: equilibrium.map(f64::to_degrees),
            angle_margin_deg: equilibrium.map(|angle| (self.settled.curve.peak_rad() - angle).to_degrees()),
            swing_peak_deg: swing_peak_rad.map(f64::to_degrees),
            area_margin: Some(swing.area_margin()),
            critical_ms: swing.critical_s().map(|time_s| 1000.0 * time_s),
            loading_pct: loaded.as_ref().map(|loaded| loaded.pct),
            loaded_circuit: loaded.map(|loaded| loaded.circuit),
            kv: equilibrium.map(|angle| view.kv(angle)),
            limit_mw,
            picture: Some(OutagePicture {
                curve: swing.curve,
                fault: swing.fault.map(|fault| fault.curve),
                cleared_rad: swing.cleared.angle_rad,
                equilibrium_rad: swing.well.map(|well| well.equilibrium_rad),
                tipping_rad: swing.well.map(|well| well.tipping_rad),
                swing_peak_rad,
            }),
        }
    }

    /// The transfers at which each criterion first stops holding; `now_rad` is the present internal angle.
    pub fn limits(&self, now_rad: f64) -> OutageLimits {
        OutageLimits {
            angle: self.angle_limit(),
            area: self.area_limit_rad(now_rad).map(|angle| self.stress.transfer_at(angle)),
            loading: self.loading_limit(),
            voltage: self.voltage_limit(),
            separation: None,
        }
    }

    /// P_m up to which there is an equilibrium with the required angle margin.
    pub fn angle_limit(&self) -> Option<f64> {
        let margin = self.corridor.require.angle_margin_deg.to_radians();
        self.stress.transfer_for(self.settled.curve.mean_mw + self.settled.curve.amplitude_mw * margin.cos())
    }

    pub fn loading_limit(&self) -> Option<f64> {
        self.first_beyond(|start_rad| self.view().overload_rad(start_rad, short_time))
    }

    pub fn voltage_limit(&self) -> Option<f64> {
        self.first_beyond(|start_rad| self.view().sag_rad(start_rad))
    }

    /// The transfer whose new equilibrium is the first angle that `crossing` finds from a start on, or that has none.
    fn first_beyond(&self, crossing: impl Fn(f64) -> Option<f64>) -> Option<f64> {
        let Settled { curve, .. } = self.settled;
        let start = curve.rising_rad(self.stress.p_m_mw(self.stress.start_rad));
        let crossing = crossing(start.unwrap_or(curve.peak_rad()))?;
        if start.is_none() {
            return Some(self.stress.transfer_at(self.stress.start_rad));
        }
        self.stress.transfer_for(curve.at(crossing.min(curve.peak_rad())))
    }

    /// The internal angle at which the area margin falls below the required one. On the way up the margin rises to 1,
    /// where the fault neither speeds up nor brakes, and falls from there: where it holds at the start it fails once.
    /// `near_rad` is any angle on the way; the nearer the limit, the less work.
    pub fn area_limit_rad(&self, near_rad: f64) -> Option<f64> {
        let &Stress { start_rad, end_rad, .. } = self.stress;
        let [start, near] =
            [start_rad, near_rad.clamp(start_rad, end_rad)].map(|angle| (angle, self.area_excess(angle)));
        if start.1 < 0.0 {
            return Some(start_rad);
        }
        let bracket = if near.1 < 0.0 { (start, near) } else { (near, (end_rad, self.area_excess(end_rad))) };
        (bracket.1.1 < 0.0)
            .then(|| root::bracketed(bracket.0, bracket.1, ANGLE_TOLERANCE_RAD, |angle| self.area_excess(angle)))
    }

    /// Positive while the area margin is above the required one: of smooth, almost straight course.
    pub fn area_excess(&self, angle_rad: f64) -> f64 {
        let swing = self.first_swing(&self.stress.swing_at(angle_rad));
        let required = self.corridor.require.area_margin;
        match &swing.well {
            None => -swing.curve.amplitude_mw.sqrt(),
            Some(well) if swing.cleared.angle_rad > well.tipping_rad => -swing.energy.max(well.critical).sqrt(),
            Some(well) => ((1.0 - required) * well.critical).sqrt() - swing.energy.sqrt(),
        }
    }
}

impl FirstSwing {
    fn area_margin(&self) -> f64 {
        self.well.as_ref().map_or(-1.0, |well| well.area_margin(self.cleared.angle_rad, self.energy))
    }

    fn peak_rad(&self) -> Option<f64> {
        let well = self.well.as_ref()?;
        well.swing_peak_rad(self.energy).filter(|_| self.cleared.angle_rad <= well.tipping_rad)
    }

    /// The first time along the fault-on swing at which ½ M ω² + V(δ) reaches V_crit.
    fn critical_s(&self) -> Option<f64> {
        let fault = self.fault.as_ref()?;
        let Some(well) = &self.well else { return Some(0.0) };
        if self.start_rad > well.tipping_rad || well.potential(self.start_rad) >= well.critical {
            return Some(0.0);
        }
        let spent = well.spent_rad(&fault.curve, self.start_rad)?;
        fault.time_between(self.start_rad, spent, LONGEST_FAULT_S)
    }
}

fn swing_face(network: &Network, z: [C64; 2]) -> Face {
    match network.shorted {
        Some(terminal) => Face::shorted(&network.reduced.y, z, terminal),
        None => Face::new(&network.reduced.y, z),
    }
}
