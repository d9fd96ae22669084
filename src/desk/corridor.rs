use std::sync::Arc;

use super::{
    Alternative, Assessment, Basis, Binding, BusDetail, CircuitDetail, Criterion, Detail, FitRecord, Learned, Reclose,
    SourceRecord, State, Switch, SwitchKind,
};
use crate::{
    config::{Config, LearningSettings, MeasurementSettings},
    feed::{Channels, Slot, Snapshot},
    fit::{Fit, FittedState, Fitter, Standing},
    grid::{Circuit, Corridor, FROM, TO},
    margin::{Behind, Engine, Footing, Judgement, Present, Seated, Trend},
    network::Topology,
    source::{Estimate, Learner, Observation, Step},
};

/// One corridor with what is remembered of it.
#[derive(Debug, Clone)]
pub struct CorridorDesk {
    pub(super) corridor: Arc<Corridor>,
    pub(super) channels: Arc<Channels>,
    pub(super) fitter: Fitter,
    pub(super) learner: Learner,
    pub(super) engine: Engine,
    pub(super) trend: Trend,
    /// Statuses of the frame before, and how often they have changed.
    pub(super) topology: Option<Topology>,
    pub(super) switches: Arc<[Switch]>,
    pub(super) switchings: u64,
    pub(super) detailed: bool,
    pub(super) learned: Arc<Learned>,
    pub(super) settings: Settings,
}

/// What of a configuration decides about every corridor.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Settings {
    pub frequency_hz: f64,
    pub measurement: MeasurementSettings,
    pub learning: LearningSettings,
}

impl Settings {
    pub fn of(config: &Config) -> Self {
        // Whether anything is learned may be said on the command line, too; it makes no other corridor.
        let learning = LearningSettings { enabled: true, ..config.learning };
        Self { frequency_hz: config.grid.frequency_hz, measurement: config.measurement, learning }
    }
}

impl CorridorDesk {
    pub(super) fn new(corridor: &Corridor, config: &Config, channels: &Arc<Channels>) -> Self {
        let corridor = Arc::new(corridor.clone());
        Self {
            fitter: Fitter::new(corridor.clone(), channels, &config.measurement),
            learner: Learner::new(&corridor.sides.map(|side| side.source), config.learning),
            engine: Engine::new(config.grid.frequency_hz),
            trend: Trend::default(),
            topology: None,
            switches: Arc::default(),
            switchings: 0,
            detailed: false,
            learned: Arc::default(),
            settings: Settings::of(config),
            channels: channels.clone(),
            corridor,
        }
    }

    /// The corridor.
    pub fn corridor(&self) -> &Arc<Corridor> {
        &self.corridor
    }

    /// What is being learned of its sources.
    pub fn learner(&self) -> &Learner {
        &self.learner
    }

    /// What is being learned of its sources, to take up what was kept.
    pub fn learner_mut(&mut self) -> &mut Learner {
        &mut self.learner
    }

    /// Brings what a screen draws with every assessment.
    pub(super) fn detailed(self) -> Self {
        Self { detailed: true, ..self }
    }

    /// Brings nothing but the record.
    pub(super) fn plain(self) -> Self {
        Self { detailed: false, ..self }
    }

    /// This corridor at a snapshot.
    pub fn assess(&mut self, snapshot: &Snapshot) -> Assessment {
        let fit = self.fit(snapshot);
        self.assess_fit(snapshot, &fit).0
    }

    /// This corridor at a snapshot, as [`Self::assess`] says, and what it would be with a change: one fit, learned from
    /// once, judged twice. Blind or parted, it stays what it is; where the change leaves no balance, it is spent, bound
    /// by its own angle, and has no headroom.
    pub fn assess_with(&mut self, snapshot: &Snapshot, alternative: &mut Alternative) -> (Assessment, Assessment) {
        let fit = self.fit(snapshot);
        let topology = alternative.topology(&fit.topology);
        let (present, ground) = self.assess_fit(snapshot, &fit);
        let altered = match (&fit.standing, ground) {
            (Standing::Joined(state), Some((seated, footing))) if present.state != State::Blind => {
                let altered = alternative.alter(&self.corridor, &fit, state, &seated, &footing, topology);
                altered.map_or_else(|| self.unbalanced(snapshot, &fit), |fit| self.altered(snapshot, &fit, alternative))
            }
            _ => present.clone(),
        };
        let altered = Assessment { step: present.step, ..altered };
        (present, altered)
    }

    /// The assessment of a fit, and what a change would start from.
    fn assess_fit(&mut self, snapshot: &Snapshot, fit: &Fit) -> (Assessment, Option<(Seated, Footing)>) {
        let Standing::Joined(state) = &fit.standing else { return (self.apart(snapshot, fit), None) };
        let (seated, step) = self.take_in(snapshot, fit, state);
        let behind = behind(fit, self.learner.estimate());
        let judgement = self.engine.judge(&self.corridor, &present(fit, state), &seated, &behind);
        self.trend.push(snapshot.time, judgement.headroom_mw);
        let footing = judgement.footing;
        let assessment = self.joined(snapshot, fit, state, &seated, judgement, &self.trend);
        (Assessment { step, ..assessment }, Some((seated, footing)))
    }

    /// The assessment of a fit that a change was made to.
    fn altered(
        &self,
        snapshot: &Snapshot,
        fit: &Fit,
        Alternative { engine, trend, .. }: &mut Alternative,
    ) -> Assessment {
        let Standing::Joined(state) = &fit.standing else { return self.apart(snapshot, fit) };
        let present = present(fit, state);
        let seated = engine.seat(&self.corridor, &present);
        let behind = behind(fit, self.learner.estimate());
        let judgement = engine.judge(&self.corridor, &present, &seated, &behind);
        trend.push(snapshot.time, judgement.headroom_mw);
        self.joined(snapshot, fit, state, &seated, judgement, trend)
    }

    /// Learns from a snapshot without judging it: far cheaper where nobody looks at every frame.
    pub fn follow(&mut self, snapshot: &Snapshot) {
        let fit = self.fit(snapshot);
        if let Standing::Joined(state) = &fit.standing {
            self.take_in(snapshot, &fit, state);
        }
    }

    fn fit(&mut self, snapshot: &Snapshot) -> Fit {
        if let Some(start) = snapshot.start() {
            self.begin(start);
        }
        let fit = self.fitter.fit(snapshot);
        if self.topology.as_ref() != Some(&fit.topology) {
            // A trend does not reach across a switching.
            self.trend.clear();
            self.switchings += 1;
            self.switches = switches(&self.corridor, &fit.topology);
            self.topology = Some(fit.topology.clone());
        }
        fit
    }

    /// Seats a state and learns from it.
    fn take_in(&mut self, snapshot: &Snapshot, fit: &Fit, state: &FittedState) -> (Seated, Option<Step>) {
        let seated = self.engine.seat(&self.corridor, &present(fit, state));
        let step = self.learn(snapshot, fit, state, &seated);
        (seated, step)
    }

    /// Closed circuits join the terminals.
    fn joined(
        &self,
        snapshot: &Snapshot,
        fit: &Fit,
        state: &FittedState,
        seated: &Seated,
        judgement: Judgement,
        trend: &Trend,
    ) -> Assessment {
        if !judgement.headroom_mw.is_finite() {
            return self.blank(snapshot, fit);
        }
        let headroom = judgement.headroom_mw;
        let thin_mw = self.corridor.thin_mw;
        let sure = headroom - self.corridor.state_spreads * judgement.headroom_sd_mw;
        let [from, to] = judgement.e_kv;
        let [source_from, source_to] = self.sources();
        Assessment {
            state: match sure {
                _ if sure <= 0.0 => State::Spent,
                _ if sure < thin_mw => State::Thin,
                _ => State::Ample,
            },
            exporter: Some(self.corridor.buses[seated.exporter].name.clone()),
            transfer_mw: Some(judgement.transfer_mw),
            bus_angle_deg: Some(judgement.bus_angle_rad.to_degrees()),
            internal_angle_deg: Some(judgement.internal_angle_rad.to_degrees()),
            swing_angle_deg: Some(judgement.picture.angle_rad.to_degrees()),
            sources: [
                SourceRecord { e_kv: Some(from.norm()), angle_deg: Some(from.arg().to_degrees()), ..source_from },
                SourceRecord { e_kv: Some(to.norm()), angle_deg: Some(to.arg().to_degrees()), ..source_to },
            ],
            headroom_mw: Some(headroom),
            headroom_sd_mw: Some(judgement.headroom_sd_mw),
            minutes_to_thin: trend.minutes_to(thin_mw, sure),
            minutes_to_spent: trend.minutes_to(0.0, sure),
            detail: self.detailed.then(|| Arc::new(self.detail(fit, state, seated, &judgement))),
            intact: Some(judgement.intact),
            outages: judgement.outages,
            binding: Some(judgement.binding),
            actions: judgement.actions,
            reclose: judgement.reclose,
            ..self.blank(snapshot, fit)
        }
    }

    fn learn(&mut self, snapshot: &Snapshot, fit: &Fit, state: &FittedState, seated: &Seated) -> Option<Step> {
        let step = self.learner.observe(&Observation {
            time: snapshot.time,
            kv: [FROM, TO].map(|bus| state.voltage[bus].norm()),
            mw: seated.power_mva.map(|power| power.re),
            mvar: seated.power_mva.map(|power| power.im),
            y: seated.y,
            topology: self.switchings,
            sigma: self.fitter.terminal_sigma(),
            fit_ok: fit.chi2.zip(fit.limit).is_none_or(|(chi2, limit)| chi2 <= limit),
        });
        if self.detailed && (step.is_some() || self.learner.history().next_back() != self.learned.history.last()) {
            self.show_learned();
        }
        step
    }

    pub(super) fn show_learned(&mut self) {
        if self.detailed {
            self.learned = Arc::new(Learned {
                steps: self.learner.steps().copied().collect(),
                history: self.learner.history().copied().collect(),
            });
        }
    }

    /// Closed circuits do not join the terminals, or too little is known to say.
    fn apart(&self, snapshot: &Snapshot, fit: &Fit) -> Assessment {
        match &fit.standing {
            Standing::Parted { state, angle_known } => self.parted(snapshot, fit, state, *angle_known),
            Standing::Joined(_) | Standing::Blind => self.blank(snapshot, fit),
        }
    }

    /// What a change asks for is beyond the peak of the curve.
    fn unbalanced(&self, snapshot: &Snapshot, fit: &Fit) -> Assessment {
        let binding = Some(Binding { outage: None, criterion: Criterion::Angle });
        Assessment { state: State::Spent, binding, ..self.blank(snapshot, fit) }
    }

    /// Nothing joins the terminals: not a megawatt more, until a circuit is closed.
    fn parted(&self, snapshot: &Snapshot, fit: &Fit, state: &FittedState, angle_known: bool) -> Assessment {
        let open = (0..self.corridor.circuits.len()).filter(|circuit| !fit.topology.closed[*circuit]);
        let reclose = open.map(|circuit| {
            let voltage = self.corridor.circuits[circuit].between.map(|bus| state.voltage[bus]);
            let reclose = Reclose::of(&self.corridor, circuit, voltage);
            if angle_known { reclose } else { Reclose { angle_deg: None, allowed: None, ..reclose } }
        });
        Assessment {
            state: State::Spent,
            transfer_mw: Some(0.0),
            bus_angle_deg: angle_known.then(|| (state.voltage[FROM] * state.voltage[TO].conj()).arg().to_degrees()),
            headroom_mw: Some(0.0),
            binding: Some(Binding { outage: None, criterion: Criterion::Separation }),
            reclose: reclose.collect(),
            ..self.blank(snapshot, fit)
        }
    }

    /// What can be said without a state.
    fn blank(&self, snapshot: &Snapshot, fit: &Fit) -> Assessment {
        let named = |slots: &[Slot]| slots.iter().map(|slot| self.channels.name(*slot).clone()).collect();
        Assessment {
            time: snapshot.time,
            corridor: self.corridor.name.clone(),
            state: State::Blind,
            exporter: None,
            transfer_mw: None,
            bus_angle_deg: None,
            internal_angle_deg: None,
            swing_angle_deg: None,
            sources: self.sources(),
            fit: FitRecord {
                chi2: fit.chi2,
                dof: fit.dof,
                limit: fit.limit,
                suspects: named(&fit.suspects),
                missing: named(&fit.missing),
                assumed: fit.assumed.clone(),
            },
            intact: None,
            outages: Vec::new(),
            headroom_mw: None,
            headroom_sd_mw: None,
            binding: None,
            actions: Vec::new(),
            reclose: Vec::new(),
            minutes_to_thin: None,
            minutes_to_spent: None,
            thin_mw: self.corridor.thin_mw,
            switches: self.switches(&fit.topology),
            step: None,
            detail: None,
        }
    }

    fn switches(&self, topology: &Topology) -> Arc<[Switch]> {
        if self.topology.as_ref() == Some(topology) {
            self.switches.clone()
        } else {
            switches(&self.corridor, topology)
        }
    }

    fn sources(&self) -> [SourceRecord; 2] {
        let estimate = self.learner.estimate();
        let sd = estimate.sd();
        [FROM, TO].map(|side| SourceRecord {
            bus: self.corridor.buses[side].name.clone(),
            e_kv: None,
            angle_deg: None,
            r_ohm: estimate.mean[2 * side],
            x_ohm: estimate.mean[2 * side + 1],
            r_sd: sd[2 * side],
            x_sd: sd[2 * side + 1],
            basis: if estimate.steps[side] > 0 { Basis::Learned } else { Basis::Configured },
            steps: estimate.steps[side],
        })
    }

    fn detail(&self, fit: &Fit, state: &FittedState, seated: &Seated, judgement: &Judgement) -> Detail {
        let live = (0..self.corridor.buses.len()).filter(|bus| state.live[*bus]);
        let buses = live.map(|bus| {
            let voltage = state.voltage[bus];
            let load = state.load[bus].conj() * voltage.norm_sqr();
            BusDetail {
                name: self.corridor.buses[bus].name.clone(),
                kv: voltage.norm(),
                deg: voltage.arg().to_degrees(),
                load_mw: load.re,
                load_mvar: load.im,
            }
        });
        let circuits = self.corridor.circuits.iter().zip(&seated.circuits).enumerate();
        let circuits = circuits.map(|(index, (circuit, present))| CircuitDetail {
            name: circuit.name.clone(),
            closed: fit.topology.closed[index],
            from_mw: present.from_mw,
            loading_pct: circuit.rating_a.map(|rating_a| 100.0 * present.amperes / rating_a),
            banks: banks(circuit, &fit.topology.inserted[index]),
        });
        Detail {
            buses: buses.collect(),
            circuits: circuits.collect(),
            picture: judgement.picture,
            learned: self.learned.clone(),
        }
    }
}

pub(super) fn switches(corridor: &Corridor, topology: &Topology) -> Arc<[Switch]> {
    let circuits = corridor.circuits.iter().zip(&topology.closed).zip(&topology.inserted);
    let each = circuits.flat_map(|((circuit, closed), inserted)| {
        let switch = |name: &Arc<str>, kind, on| Switch { name: name.clone(), kind, on };
        let banks = circuit.banks.iter().zip(inserted);
        let banks = banks.map(move |(bank, inserted)| switch(&bank.name, SwitchKind::Bank, *inserted));
        [switch(&circuit.name, SwitchKind::Circuit, *closed)].into_iter().chain(banks)
    });
    each.collect()
}

fn present<'a>(fit: &'a Fit, state: &'a FittedState) -> Present<'a> {
    Present { topology: &fit.topology, voltage: &state.voltage, load: &state.load }
}

fn behind<'a>(fit: &Fit, estimate: &'a Estimate) -> Behind<'a> {
    Behind { z_ohm: estimate.z_ohm(), covariance: &estimate.covariance, stored_energy_mws: fit.stored_energy_mws }
}

fn banks(circuit: &Circuit, inserted: &[bool]) -> Vec<(Arc<str>, bool)> {
    circuit.banks.iter().zip(inserted).map(|(bank, inserted)| (bank.name.clone(), *inserted)).collect()
}
