use std::sync::Arc;

use serde::{Deserialize, Serialize};

use super::{
    Assessment, Basis, Binding, BusDetail, CircuitDetail, Criterion, Detail, FitRecord, Learned, Reclose, SourceRecord,
    State,
};
use crate::{
    config::{Config, LearningSettings, MeasurementSettings},
    feed::{Channels, Slot, Snapshot, Start},
    fit::{Fit, FittedState, Fitter, Standing},
    grid::{Circuit, Corridor, FROM, TO},
    margin::{Behind, Engine, Judgement, Present, Seated, Trend},
    network::Topology,
    source::{Learner, Observation, store::StoreError},
};

/// One corridor with what is remembered of it.
#[derive(Debug, Clone)]
pub struct CorridorDesk {
    corridor: Arc<Corridor>,
    channels: Arc<Channels>,
    fitter: Fitter,
    learner: Learner,
    engine: Engine,
    trend: Trend,
    /// Statuses of the frame before, and how often they have changed.
    topology: Option<Topology>,
    switchings: u64,
    detailed: bool,
    learned: Arc<Learned>,
    settings: Settings,
}

/// What of a configuration decides about every corridor.
#[derive(Debug, Clone, PartialEq)]
struct Settings {
    frequency_hz: f64,
    measurement: MeasurementSettings,
    learning: LearningSettings,
}

impl Settings {
    fn of(config: &Config) -> Self {
        // Whether anything is learned may be said on the command line, too; it makes no other corridor.
        let learning = LearningSettings { enabled: true, ..config.learning };
        Self { frequency_hz: config.grid.frequency_hz, measurement: config.measurement, learning }
    }
}

/// What is remembered of a corridor, as far as what follows depends on it.
#[derive(Debug, Serialize, Deserialize)]
pub struct CorridorMemory {
    learner: Learner,
    trend: Trend,
    topology: Option<Topology>,
    switchings: u64,
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

    /// This corridor at a snapshot.
    pub fn assess(&mut self, snapshot: &Snapshot) -> Assessment {
        let fit = self.fit(snapshot);
        match &fit.standing {
            Standing::Joined(state) => self.joined(snapshot, &fit, state),
            Standing::Parted { state, angle_known } => self.parted(snapshot, &fit, state, *angle_known),
            Standing::Blind => self.blank(snapshot, &fit),
        }
    }

    /// Learns from a snapshot without judging it: far cheaper where nobody looks at every frame.
    pub fn follow(&mut self, snapshot: &Snapshot) {
        let fit = self.fit(snapshot);
        if let Standing::Joined(state) = &fit.standing {
            let present = Present { topology: &fit.topology, voltage: &state.voltage, load: &state.load };
            let seated = self.engine.seat(&self.corridor, &present);
            self.learn(snapshot, &fit, state, &seated);
        }
    }

    /// What is remembered of it, to be taken up where a recording starts.
    pub fn memory(&self) -> CorridorMemory {
        CorridorMemory {
            learner: self.learner.kept(),
            trend: self.trend.clone(),
            topology: self.topology.clone(),
            switchings: self.switchings,
        }
    }

    /// Goes on as a recording says that this corridor stood. What is only quicker to keep is forgotten, so that who goes on
    /// from here has the same as who was here before.
    fn begin(&mut self, start: &Start) {
        let name = self.corridor.name.clone();
        let Some(CorridorMemory { learner, trend, topology, switchings }) = start.desk(&name) else { return };
        let is_same = start.config().is_some_and(|config| {
            Settings::of(config) == self.settings && config.grid.corridors.contains(&*self.corridor)
        });
        if !is_same {
            start.doubt(&name, &"recorded under another configuration; what was learned of other sources begins anew");
        }
        let resumed = if is_same { self.learner.resume(learner) } else { self.begin_anew(&learner) };
        if let Err(error) = resumed {
            start.doubt(&name, &error);
        }
        self.engine = Engine::new(self.settings.frequency_hz);
        (self.trend, self.topology, self.switchings) = match topology {
            Some(topology) if is_same && topology.is_of(&self.corridor) => (trend, Some(topology), switchings),
            _ => (Trend::default(), None, 0),
        };
        self.show_learned();
    }

    /// Another corridor than the one recorded: what was learned holds for it too where its configured sources are the same.
    fn begin_anew(&mut self, recorded: &Learner) -> Result<(), StoreError> {
        let learning = LearningSettings { enabled: self.learner.is_enabled(), ..self.settings.learning };
        self.learner = Learner::new(&self.corridor.sides.map(|side| side.source), learning);
        match recorded.memory() {
            Some(memory) if self.learner.is_enabled() => self.learner.recall(&memory),
            _ => Ok(()),
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
            self.topology = Some(fit.topology.clone());
        }
        fit
    }

    fn joined(&mut self, snapshot: &Snapshot, fit: &Fit, state: &FittedState) -> Assessment {
        let present = Present { topology: &fit.topology, voltage: &state.voltage, load: &state.load };
        let seated = self.engine.seat(&self.corridor, &present);
        self.learn(snapshot, fit, state, &seated);
        let estimate = self.learner.estimate();
        let behind = Behind {
            z_ohm: estimate.z_ohm(),
            covariance: &estimate.covariance,
            stored_energy_mws: fit.stored_energy_mws,
        };
        let judgement = self.engine.judge(&self.corridor, &present, &seated, &behind);
        if !judgement.headroom_mw.is_finite() {
            return self.blank(snapshot, fit);
        }
        let headroom = judgement.headroom_mw;
        self.trend.push(snapshot.time, headroom);
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
            minutes_to_thin: self.trend.minutes_to(thin_mw, sure),
            minutes_to_spent: self.trend.minutes_to(0.0, sure),
            detail: self.detailed.then(|| Arc::new(self.detail(fit, state, &seated, &judgement))),
            intact: Some(judgement.intact),
            outages: judgement.outages,
            binding: Some(judgement.binding),
            actions: judgement.actions,
            reclose: judgement.reclose,
            ..self.blank(snapshot, fit)
        }
    }

    fn learn(&mut self, snapshot: &Snapshot, fit: &Fit, state: &FittedState, seated: &Seated) {
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
    }

    fn show_learned(&mut self) {
        if self.detailed {
            self.learned = Arc::new(Learned {
                steps: self.learner.steps().copied().collect(),
                history: self.learner.history().copied().collect(),
            });
        }
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
            detail: None,
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

fn banks(circuit: &Circuit, inserted: &[bool]) -> Vec<(Arc<str>, bool)> {
    circuit.banks.iter().zip(inserted).map(|(bank, inserted)| (bank.name.clone(), *inserted)).collect()
}
