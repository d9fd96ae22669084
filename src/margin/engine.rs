//! One corridor judged: every outage, the limits, the headroom, what can be done.

use std::sync::Arc;

use nalgebra::Matrix4;

use super::{
    Action, Binding, Footing, Intact, Machine, OutageRecord, Picture, Reclose,
    case::{CaseSet, seat},
    outage::Outage,
    reclose,
    scene::{Scene, separation, tightest},
    sensitivity::Sensitivity,
    stress::Stress,
};
use crate::{
    grid::{BankIndex, BusIndex, Corridor, End, FROM, TO},
    network::{AMPERES, Admittance, C64, M2, Topology},
};

/// A corridor's state, closed circuits joining its terminals.
#[derive(Debug, Clone, Copy)]
pub struct Present<'a> {
    /// Statuses in force.
    pub topology: &'a Topology,
    /// Voltage by bus, kV, with `to` at angle 0.
    pub voltage: &'a [C64],
    /// Load admittance by bus, S.
    pub load: &'a [C64],
}

/// What stands behind its terminals, `from` and `to`.
#[derive(Debug, Clone, Copy)]
pub struct Behind<'a> {
    /// Settled impedances, ohm.
    pub z_ohm: [C64; 2],
    /// Covariance of R and X `from`, R and X `to`, ohm².
    pub covariance: &'a Matrix4<f64>,
    /// Stored energy, MW·s; `None`: infinite.
    pub stored_energy_mws: [Option<f64>; 2],
}

/// A state taken in: who exports, and what the sources see.
#[derive(Debug, Clone)]
pub struct Seated {
    /// The bus whose terminal sends MW into the circuits.
    pub exporter: BusIndex,
    /// Circuits and loads reduced to `from` and `to`, S.
    pub y: M2,
    /// Power that leaves each source, into circuits and terminal load, MVA.
    pub power_mva: [C64; 2],
    /// By circuit, also the open ones.
    pub circuits: Vec<CircuitFlow>,
    set: usize,
    /// By seat, S.
    pub(super) loads: Vec<C64>,
}

/// All that is found of a corridor in one state.
#[derive(Debug, Clone)]
pub struct Judgement {
    /// MW from the exporter's terminal into the circuits.
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
    /// What a change would start from.
    pub footing: Footing,
}

/// What a circuit carries.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct CircuitFlow {
    /// MW into it at its first bus.
    pub from_mw: f64,
    /// The larger of its end currents, A.
    pub amperes: f64,
}

/// Judges one corridor; keeps the networks of the topologies met last.
#[derive(Debug, Clone)]
pub struct Engine {
    frequency_hz: f64,
    without: Vec<Arc<str>>,
    pub(super) sets: Vec<(Topology, CaseSet)>,
    sensitivity: Option<Sensitivity>,
    pub(super) scratch: Admittance,
}

/// Topologies kept: the present one and those of the actions at hand, for both directions.
const SETS_KEPT: usize = 24;

impl Engine {
    /// For a corridor of a grid of this frequency, Hz.
    pub fn new(frequency_hz: f64) -> Self {
        let (without, sets) = (Vec::new(), Vec::new());
        Self { frequency_hz, without, sets, sensitivity: None, scratch: Admittance::new(2) }
    }

    /// Reckoning no longer with the outages of these names.
    #[must_use]
    pub fn without(self, outages: Vec<Arc<str>>) -> Self {
        Self { without: outages, sets: Vec::new(), ..self }
    }

    /// Takes a state in, before it is judged.
    pub fn seat(&mut self, corridor: &Corridor, now: &Present) -> Seated {
        let (circuits, sent_mw) = self.flows(corridor, now);
        let exporter = if sent_mw[TO] > sent_mw[FROM] { TO } else { FROM };
        let loads: Vec<_> = (0..corridor.buses.len()).map(|bus| now.load[seat(exporter, bus)]).collect();
        let set = self.prepare(corridor, now.topology, exporter, &loads);
        let reduced = self.sets[set].1.present.network.reduced.y;
        let y = if exporter == FROM { reduced } else { M2::new(reduced.m22, reduced.m21, reduced.m12, reduced.m11) };
        let [from, to] = [now.voltage[FROM], now.voltage[TO]];
        let power_mva = [from * (y.m11 * from + y.m12 * to).conj(), to * (y.m21 * from + y.m22 * to).conj()];
        Seated { exporter, y, power_mva, circuits, set, loads }
    }

    /// Judges the state that was taken in last.
    pub fn judge(&mut self, corridor: &Corridor, now: &Present, seated: &Seated, behind: &Behind) -> Judgement {
        let &Seated { exporter, ref loads, .. } = seated;
        let importer = 1 - exporter;
        let machine = Machine::new([exporter, importer].map(|side| behind.stored_energy_mws[side]), self.frequency_hz);
        let set = &self.sets[seated.set].1;

        let z = [exporter, importer].map(|side| behind.z_ohm[side]);
        let terminals = [exporter, importer].map(|bus| now.voltage[bus]);
        let scene = Scene { corridor, set, machine, loads, terminals };
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
        let known = self.sensitivity.take().filter(|known| known.holds_for(seated.set, &tightest, &stress));
        let sensitivity = known.unwrap_or_else(|| Sensitivity::of(&scene, seated.set, &tightest, &stress, angle));
        let reclose = reclose::judge(corridor, now.topology, &scene.view(&stress), &stress, angle, now.voltage);
        let judgement = Judgement {
            transfer_mw,
            bus_angle_rad: (terminals[0] * terminals[1].conj()).arg(),
            internal_angle_rad: angle,
            e_kv: [e[exporter], e[importer]],
            intact,
            headroom_mw: tightest.limit_mw - transfer_mw,
            headroom_sd_mw: sensitivity.sd_mw(behind.covariance),
            binding: Binding {
                outage: tightest.outage.map(|index| outages[index].name.clone()),
                criterion: tightest.criterion,
            },
            outages,
            actions: Vec::new(),
            reclose,
            picture: Picture { curve: stress.swing_curve(&point), p_m_mw: point.p_m_mw, angle_rad: point.angle_rad },
            footing: Footing { stress, angle_rad: angle },
        };
        self.sensitivity = Some(sensitivity);
        let actions = self.actions(corridor, now.topology, exporter, loads, &stress, stress.p_m_mw(angle));
        Judgement { actions, ..judgement }
    }

    /// What each circuit carries, and the MW that each terminal sends into them.
    fn flows(&mut self, corridor: &Corridor, now: &Present) -> (Vec<CircuitFlow>, [f64; 2]) {
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

    pub(super) fn find(&mut self, corridor: &Corridor, topology: &Topology, exporter: BusIndex) -> usize {
        let known = self.sets.iter().position(|(known, set)| set.exporter == exporter && known == topology);
        known.unwrap_or_else(|| {
            if self.sets.len() == SETS_KEPT {
                self.sets.clear();
                self.sensitivity = None;
            }
            self.sets.push((topology.clone(), CaseSet::new(corridor, topology, exporter, &self.without)));
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
            let stress = stress.in_network(&set.present);
            let headroom_mw = stress.settled.curve.rising_rad(p_m_mw).map(|angle| {
                let scene = Scene { corridor, set, machine: stress.machine, loads, terminals: [C64::default(); 2] };
                scene.tightest(&stress, angle).limit_mw - stress.transfer_at(angle)
            });
            actions.push(Action { action, headroom_mw });
        }
        actions
    }
}

fn separated(name: Arc<str>, corridor: &Corridor) -> OutageRecord {
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
