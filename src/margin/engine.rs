//! One corridor judged: every outage, the limits, the headroom, what can be done.

use nalgebra::Matrix4;

use super::{
    Action, Binding, Criterion, Intact, IntactLimits, Machine, OutageLimits, OutageRecord, Picture, Reclose,
    case::{CaseSet, seat},
    outage::Outage,
    reclose,
    stress::{Sources, Stress},
    view::View,
};
use crate::{
    feed::End,
    grid::{BankIndex, BusIndex, Circuit, Corridor, FROM, TO},
    network::{AMPERES, Admittance, C64, Topology},
};

/// The present state of a corridor and what stands behind its terminals.
#[derive(Debug, Clone, Copy)]
pub struct Operating<'a> {
    /// Statuses in force.
    pub topology: &'a Topology,
    /// Voltage by bus, kV, with `to` at angle 0.
    pub voltage: &'a [C64],
    /// Load admittance by bus, S.
    pub load: &'a [C64],
    /// Settled impedances behind `from` and `to`, ohm.
    pub z_ohm: [C64; 2],
    /// Covariance of R and X behind `from`, then `to`, ohm².
    pub covariance: &'a Matrix4<f64>,
    /// Stored energy behind `from` and `to`, MW·s; `None`: infinite.
    pub stored_energy_mws: [Option<f64>; 2],
}

/// All that is found of a corridor in one state.
#[derive(Debug, Clone)]
pub struct Judgement {
    /// The bus whose terminal sends MW into the circuits.
    pub exporter: BusIndex,
    /// MW from there into the circuits.
    pub transfer_mw: f64,
    /// Exporter minus importer, between the terminals, rad.
    pub bus_angle_rad: f64,
    /// Exporter minus importer, between the settled sources, rad.
    pub internal_angle_rad: f64,
    /// Settled voltages behind `from` and `to`, kV, with the `to` bus at angle 0.
    pub e_kv: [C64; 2],
    /// The corridor as it is.
    pub intact: Intact,
    /// Every outage judged.
    pub outages: Vec<OutageRecord>,
    /// Smallest limit minus transfer, MW.
    pub headroom_mw: f64,
    /// Standard deviation of the headroom, MW.
    pub headroom_sd_mw: f64,
    /// What sets the headroom.
    pub binding: Binding,
    /// The headroom after each action at hand.
    pub actions: Vec<Action>,
    /// Open circuits.
    pub reclose: Vec<Reclose>,
    /// The present curve, sources of the swing.
    pub picture: Picture,
    /// By circuit, also the open ones.
    pub circuits: Vec<CircuitFlow>,
}

/// What a circuit carries.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct CircuitFlow {
    /// MW into it at its first bus.
    pub from_mw: f64,
    /// The larger of its end currents, A.
    pub amperes: f64,
}

/// What sets the headroom, by index.
#[derive(Debug, Clone, Copy)]
struct Tightest {
    limit_mw: f64,
    outage: Option<usize>,
    criterion: Criterion,
}

/// Judges one corridor; keeps the networks of the topologies met last.
#[derive(Debug, Clone)]
pub struct Engine {
    frequency_hz: f64,
    sets: Vec<(Topology, CaseSet)>,
    scratch: Admittance,
}

/// Topologies kept: the present one and those of the actions at hand, for both directions.
const SETS_KEPT: usize = 24;

impl Engine {
    /// For a corridor of a grid of this frequency, Hz.
    pub fn new(frequency_hz: f64) -> Self {
        Self { frequency_hz, sets: Vec::new(), scratch: Admittance::new(2) }
    }

    /// Judges a state in which closed circuits join the terminals.
    pub fn judge(&mut self, corridor: &Corridor, now: &Operating) -> Judgement {
        let (circuits, sent_mw) = self.flows(corridor, now);
        let exporter = if sent_mw[TO] > sent_mw[FROM] { TO } else { FROM };
        let importer = 1 - exporter;
        let loads: Vec<_> = (0..corridor.buses.len()).map(|bus| now.load[seat(exporter, bus)]).collect();
        let machine = Machine::new([exporter, importer].map(|side| now.stored_energy_mws[side]), self.frequency_hz);
        let index = self.prepare(corridor, now.topology, exporter, &loads);
        let set = &self.sets[index].1;

        let z = [exporter, importer].map(|side| now.z_ohm[side]);
        let terminals = [exporter, importer].map(|bus| now.voltage[bus]);
        let scene = Scene { corridor, set, machine, loads: &loads, terminals };
        let (stress, e) = scene.stress(z);
        let angle = (e[0] * e[1].conj()).arg();
        let transfer_mw = stress.transfer_at(angle);
        let point = stress.swing_at(angle);

        let mut outages = Vec::with_capacity(set.outages.len());
        for case in &set.outages {
            outages.push(match Outage::new(corridor, exporter, case, &stress) {
                Some(outage) => outage.record(angle, &point, outage.limits(angle)),
                None => separated(case.name.clone(), corridor),
            });
        }
        let intact = scene.intact(&stress, angle);
        let tightest = tightest(outages.iter().map(|outage| outage.limit_mw), &intact.limit_mw, &stress);
        let variance = scene.variance(&stress, angle, &tightest, now.covariance);
        let reclose = reclose::judge(corridor, now.topology, &scene.view(&stress), &stress, angle, now.voltage);
        let judgement = Judgement {
            exporter,
            transfer_mw,
            bus_angle_rad: (terminals[0] * terminals[1].conj()).arg(),
            internal_angle_rad: angle,
            e_kv: [e[exporter], e[importer]],
            intact,
            headroom_mw: tightest.limit_mw - transfer_mw,
            headroom_sd_mw: variance.max(0.0).sqrt(),
            binding: Binding {
                outage: tightest.outage.map(|index| outages[index].name.clone()),
                criterion: tightest.criterion,
            },
            outages,
            actions: Vec::new(),
            reclose,
            picture: Picture { curve: stress.swing_curve(&point), p_m_mw: point.p_m_mw, angle_rad: point.angle_rad },
            circuits,
        };
        let actions = self.actions(corridor, now.topology, exporter, &loads, &stress, stress.p_m_mw(angle));
        Judgement { actions, ..judgement }
    }

    /// What each circuit carries, and the MW that each terminal sends into them.
    fn flows(&mut self, corridor: &Corridor, now: &Operating) -> (Vec<CircuitFlow>, [f64; 2]) {
        let index = self.find(corridor, now.topology, FROM);
        let mut sent_mw = [0.0; 2];
        let mut flows = vec![CircuitFlow::default(); corridor.circuits.len()];
        for on in &self.sets[index].1.present.circuits {
            let [first, second] = on.seats.map(|bus| now.voltage[bus]);
            let current = [End::From, End::To].map(|end| on.branch.current(end, first, second));
            let mw = [(first * current[0].conj()).re, (second * current[1].conj()).re];
            for (bus, mw) in on.seats.into_iter().zip(mw).filter(|(bus, _)| *bus <= TO) {
                sent_mw[bus] += mw;
            }
            let amperes = AMPERES * current[0].norm().max(current[1].norm());
            flows[on.circuit] = CircuitFlow { from_mw: mw[0], amperes };
        }
        (flows, sent_mw)
    }

    fn find(&mut self, corridor: &Corridor, topology: &Topology, exporter: BusIndex) -> usize {
        let known = self.sets.iter().position(|(known, set)| set.exporter == exporter && known == topology);
        known.unwrap_or_else(|| {
            if self.sets.len() == SETS_KEPT {
                self.sets.remove(0);
            }
            self.sets.push((topology.clone(), CaseSet::new(corridor, topology, exporter)));
            self.sets.len() - 1
        })
    }

    /// The networks of a topology with the present loads in.
    fn prepare(&mut self, corridor: &Corridor, topology: &Topology, exporter: BusIndex, loads: &[C64]) -> usize {
        let index = self.find(corridor, topology, exporter);
        let set = &mut self.sets[index].1;
        set.present.network.set_loads(loads, &mut self.scratch);
        for outage in &mut set.outages {
            if let Some(after) = &mut outage.after {
                after.network.set_loads(loads, &mut self.scratch);
            }
            if let Some(fault) = &mut outage.fault {
                fault.set_loads(loads, &mut self.scratch);
            }
        }
        index
    }

    /// The headroom after inserting each bypassed bank of a circuit in service and closing each open circuit: the
    /// machines deliver what they did, the angle settles anew.
    fn actions(
        &mut self,
        corridor: &Corridor,
        topology: &Topology,
        exporter: BusIndex,
        loads: &[C64],
        stress: &Stress,
        p_m_mw: f64,
    ) -> Vec<Action> {
        let insert = corridor.banks().filter(|(BankIndex { circuit, bank }, _)| {
            topology.closed[*circuit] && !topology.inserted[*circuit][*bank]
        });
        let insert = insert.map(|(BankIndex { circuit, bank }, b)| {
            let mut after = topology.clone();
            after.inserted[circuit][bank] = true;
            (format!("insert {}", b.name), after)
        });
        let close = (0..corridor.circuits.len()).filter(|circuit| !topology.closed[*circuit]).map(|circuit| {
            let mut after = topology.clone();
            after.closed[circuit] = true;
            (format!("close {}", corridor.circuits[circuit].name), after)
        });
        let mut actions = Vec::new();
        for (action, after) in insert.chain(close) {
            let index = self.prepare(corridor, &after, exporter, loads);
            let set = &self.sets[index].1;
            let stress = Stress::new(&set.present, stress.sources, stress.machine, loads[0]);
            let headroom_mw = stress.settled.curve.rising_rad(p_m_mw).map(|angle| {
                let scene = Scene { corridor, set, machine: stress.machine, loads, terminals: [C64::default(); 2] };
                scene.tightest(&stress, angle).limit_mw - stress.transfer_at(angle)
            });
            actions.push(Action { action, headroom_mw });
        }
        actions
    }
}

/// One topology with everything that does not depend on the impedance of the sources.
struct Scene<'a> {
    corridor: &'a Corridor,
    set: &'a CaseSet,
    machine: Machine,
    loads: &'a [C64],
    /// Voltages of exporter and importer, kV.
    terminals: [C64; 2],
}

fn continuous(circuit: &Circuit) -> Option<f64> {
    circuit.rating_a
}

impl Scene<'_> {
    /// E = V + Z·I with the present voltages and currents, and the stress from there; exporter first.
    fn stress(&self, z: [C64; 2]) -> (Stress, [C64; 2]) {
        let y = &self.set.present.network.reduced.y;
        let [vx, vi] = self.terminals;
        let e = [vx + z[0] * (y.m11 * vx + y.m12 * vi), vi + z[1] * (y.m21 * vx + y.m22 * vi)];
        let [x, i] = [self.set.exporter, 1 - self.set.exporter];
        let swing_x_ohm = [x, i].map(|side| self.corridor.sides[side].source.swing_x_ohm);
        let sources = Sources { z, swing_x_ohm, e_kv: e.map(C64::norm) };
        (Stress::new(&self.set.present, sources, self.machine, self.loads[0]), e)
    }

    fn view<'b>(&'b self, stress: &'b Stress) -> View<'b> {
        View {
            corridor: self.corridor,
            exporter: self.set.exporter,
            case: &self.set.present,
            settled: &stress.settled,
            e_kv: stress.sources.e_kv,
        }
    }

    fn intact(&self, stress: &Stress, angle_rad: f64) -> Intact {
        let loaded = self.view(stress).loading(angle_rad, continuous);
        Intact {
            peak_mw: stress.settled.peak_mw(),
            angle_margin_deg: (stress.end_rad - angle_rad).to_degrees(),
            loading_pct: loaded.as_ref().map(|loaded| loaded.pct),
            loaded_circuit: loaded.map(|loaded| loaded.circuit),
            limit_mw: self.intact_limits(stress),
        }
    }

    fn intact_limits(&self, stress: &Stress) -> IntactLimits {
        let view = self.view(stress);
        let angle = stress.end_rad - self.corridor.require.intact_angle_margin_deg.to_radians();
        let within = |angle: f64| (angle < stress.end_rad).then(|| stress.transfer_at(angle));
        IntactLimits {
            angle: Some(stress.transfer_at(angle.max(stress.start_rad))),
            loading: view.overload_rad(stress.start_rad, continuous).and_then(within),
            voltage: view.sag_rad(stress.start_rad).and_then(within),
        }
    }

    fn tightest(&self, stress: &Stress, now_rad: f64) -> Tightest {
        let limits = self.set.outages.iter().map(|case| {
            Outage::new(self.corridor, self.set.exporter, case, stress)
                .map_or_else(|| separation(self.corridor), |outage| outage.limits(now_rad))
        });
        tightest(limits, &self.intact_limits(stress), stress)
    }

    /// gᵀ C g with g the gradient of the tightest limit by R and X of both sides; the transfer is measured.
    fn variance(&self, base: &Stress, now_rad: f64, tightest: &Tightest, covariance: &Matrix4<f64>) -> f64 {
        const STEP: f64 = 1e-3;
        let crossing = match (tightest.outage, tightest.criterion) {
            (Some(index), Criterion::Area) => self.crossing(base, index, now_rad),
            _ => None,
        };
        let mut gradient = nalgebra::Vector4::zeros();
        for (parameter, slope) in gradient.iter_mut().enumerate() {
            if covariance[(parameter, parameter)] <= 0.0 {
                continue;
            }
            let side = usize::from(parameter / 2 != self.set.exporter);
            let mut z = base.sources.z;
            let step = STEP * z[side].norm();
            z[side] += if parameter % 2 == 0 { C64::new(step, 0.0) } else { C64::new(0.0, step) };
            let (stress, _) = self.stress(z);
            let limit_mw = self.limit(&stress, tightest, crossing.as_ref());
            *slope = limit_mw.map_or(0.0, |limit_mw| (limit_mw - tightest.limit_mw) / step);
        }
        (gradient.transpose() * covariance * gradient)[0]
    }

    /// Where an outage's area margin crosses the required one, and how steeply.
    fn crossing(&self, stress: &Stress, outage: usize, now_rad: f64) -> Option<Crossing> {
        const STEP_RAD: f64 = 1e-4;
        let outage = Outage::new(self.corridor, self.set.exporter, &self.set.outages[outage], stress)?;
        let angle_rad = outage.area_limit_rad(now_rad)?;
        let excess = outage.area_excess(angle_rad);
        let slope = (excess - outage.area_excess(angle_rad - STEP_RAD)) / STEP_RAD;
        (slope < 0.0).then_some(Crossing { angle_rad, excess, slope })
    }

    /// The limit that was the tightest one, with slightly other sources.
    fn limit(&self, stress: &Stress, tightest: &Tightest, crossing: Option<&Crossing>) -> Option<f64> {
        let Some(index) = tightest.outage else {
            let limits = self.intact_limits(stress);
            return match tightest.criterion {
                Criterion::Loading => limits.loading,
                Criterion::Voltage => limits.voltage,
                _ => limits.angle,
            };
        };
        let outage = Outage::new(self.corridor, self.set.exporter, &self.set.outages[index], stress)?;
        match tightest.criterion {
            Criterion::Angle => outage.angle_limit(),
            Criterion::Area => crossing.map(|crossing| {
                // The implicit function theorem: the crossing moves by the change of the excess over its slope.
                let moved = (outage.area_excess(crossing.angle_rad) - crossing.excess) / crossing.slope;
                stress.transfer_at(crossing.angle_rad - moved)
            }),
            Criterion::Loading => outage.loading_limit(),
            Criterion::Voltage => outage.voltage_limit(),
            Criterion::Separation => None,
        }
    }
}

/// A point where an excess falls through zero.
#[derive(Debug, Clone, Copy)]
struct Crossing {
    angle_rad: f64,
    excess: f64,
    slope: f64,
}

fn tightest(outages: impl Iterator<Item = OutageLimits>, intact: &IntactLimits, stress: &Stress) -> Tightest {
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

fn separation(corridor: &Corridor) -> OutageLimits {
    OutageLimits { separation: (!corridor.require.accept_separation).then_some(0.0), ..OutageLimits::default() }
}

fn separated(name: std::sync::Arc<str>, corridor: &Corridor) -> OutageRecord {
    OutageRecord {
        name,
        separates: true,
        peak_mw: None,
        angle_deg: None,
        angle_margin_deg: None,
        swing_peak_deg: None,
        area_margin: None,
        critical_ms: None,
        loading_pct: None,
        loaded_circuit: None,
        kv: None,
        limit_mw: separation(corridor),
        picture: None,
    }
}
