//! From a snapshot to the fitted state of one corridor: weighted least squares, χ² test, named suspects.
//!
//! A snapshot seldom agrees with itself. [`Fitter::fit`] finds the bus voltages that agree best with all of it, tests how well
//! they do, and where they do not, looks for the explanation that blames the fewest channels: single measurements by their
//! normalised residuals, statuses that their circuits' flows contradict, and banks.
//!
//! Sources: Schweppe, IEEE Trans. PAS 1970; Abur and Expósito, Power System State Estimation, 2004, ch. 2 and 5.

mod estimator;
mod explanation;
mod gain;
mod load;
mod meter;
mod wiring;

use std::sync::Arc;

use statrs::distribution::{ChiSquared, ContinuousCDF};

use crate::{
    config::MeasurementSettings,
    feed::{Channels, Slot, Snapshot},
    grid::{Corridor, FROM, TO},
    network::{C64, Topology},
};
use estimator::Estimator;
use explanation::Explanation;
use load::{Assumptions, Origin};
use meter::{Meters, usable};
use wiring::{Branches, Wiring};

/// Confidence of the χ² test.
const CONFIDENCE: f64 = 0.99;

/// What one snapshot says of a corridor.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Statuses in force: flows have won over flags.
    pub topology: Topology,
    /// The state.
    pub standing: Standing,
    /// Sum of squared residuals over their variances; `None` without a state.
    pub chi2: Option<f64>,
    /// Measurements in use less unknowns.
    pub dof: usize,
    /// The 99 % quantile for these degrees of freedom; `None` without any.
    pub limit: Option<f64>,
    /// Channels set aside: statuses, then measurements, worst first.
    pub suspects: Vec<Slot>,
    /// Channels without a usable value: kV, MW and Mvar of what is in service.
    pub missing: Vec<Slot>,
    /// Loads that no channel brings, as short sentences.
    pub assumed: Vec<Arc<str>>,
    /// Stored kinetic energy of the sides, MW·s; `None`: an infinite bus.
    pub stored_energy_mws: [Option<f64>; 2],
}

/// How the corridor stands.
#[derive(Debug, Clone, PartialEq)]
pub enum Standing {
    /// Closed circuits join the terminals.
    Joined(FittedState),
    /// Nothing joins the terminals: two parts, each with what still hangs on it.
    Parted {
        /// Voltages of both parts.
        state: FittedState,
        /// Whether angle channels tell the angle between the parts; if not, each has its own terminal at angle 0.
        angle_known: bool,
    },
    /// Too little is measured; [`Fit::missing`] says what would help.
    Blind,
}

/// Voltages and loads by bus.
#[derive(Debug, Clone, PartialEq)]
pub struct FittedState {
    /// Voltage, kV line-to-line, with `to` at angle 0; zero where not in service.
    pub voltage: Vec<C64>,
    /// Load as constant admittance, S. A station's is what its circuits bring at these voltages.
    pub load: Vec<C64>,
    /// In service: joined to a terminal.
    pub live: Vec<bool>,
}

impl Fit {
    /// The state of a corridor whose terminals are joined.
    pub fn joined(&self) -> Option<&FittedState> {
        match &self.standing {
            Standing::Joined(state) => Some(state),
            Standing::Parted { .. } | Standing::Blind => None,
        }
    }
}

/// Fits one corridor, snapshot after snapshot. It remembers nothing of earlier ones but what is quicker to keep.
#[derive(Debug, Clone)]
pub struct Fitter {
    corridor: Arc<Corridor>,
    meters: Meters,
    assumptions: Assumptions,
    /// χ² quantiles by degrees of freedom.
    limits: Vec<Option<f64>>,
    branches: Branches,
    wiring: Wiring,
    estimator: Estimator,
    terminal_sigma: [f64; 6],
    z: Vec<f64>,
    w: Vec<f64>,
}

impl Fitter {
    /// A fitter for a corridor of the configuration that the channels were made from.
    pub fn new(corridor: Arc<Corridor>, channels: &Channels, settings: &MeasurementSettings) -> Self {
        let meters = Meters::new(&corridor, channels, settings);
        let quantile = |dof| ChiSquared::new(dof as f64).ok().map(|chi2| chi2.inverse_cdf(CONFIDENCE));
        let kv = [FROM, TO].map(|bus| meters.sigma(Meters::kv(bus)));
        let power = [FROM, TO].map(|bus| {
            let at_bus = corridor.circuits.iter().enumerate().filter(|(_, circuit)| circuit.between.contains(&bus));
            at_bus.map(|(index, _)| meters.sigma(meters.flow(index)[0]).powi(2)).sum::<f64>().sqrt()
        });
        let terminal_sigma = [kv[FROM], kv[TO], power[FROM], power[TO], power[FROM], power[TO]];
        let mut branches = Branches::new(&corridor);
        let wiring = Wiring::new(&corridor, &Topology::complete(&corridor), &meters, &mut branches);
        Self {
            assumptions: Assumptions::new(&corridor),
            limits: (0..=meters.len()).map(quantile).collect(),
            corridor,
            meters,
            branches,
            wiring,
            estimator: Estimator::default(),
            terminal_sigma,
            z: Vec::new(),
            w: Vec::new(),
        }
    }

    /// Metering class at the terminals: kV, MW and Mvar of all circuits there together, `from` and `to` each.
    pub fn terminal_sigma(&self) -> [f64; 6] {
        self.terminal_sigma
    }

    /// The state that agrees best with a snapshot.
    pub fn fit(&mut self, snapshot: &Snapshot) -> Fit {
        let (mut z, mut w) = (std::mem::take(&mut self.z), std::mem::take(&mut self.w));
        self.meters.read(snapshot, &mut z, &mut w);
        (self.z, self.w) = (z, w);
        let flags = self.flags(snapshot);
        let Explanation { topology, statuses, set_aside, verdict } = self.explain(flags);
        let known = verdict.known();
        let pseudo = |meter: &usize| self.w[*meter] == 0.0;
        let blamed = set_aside.iter().filter(|meter| !pseudo(meter)).map(|meter| self.meters.slots[*meter]);
        Fit {
            standing: if known { self.standing() } else { Standing::Blind },
            chi2: known.then_some(verdict.chi2),
            dof: if known { verdict.dof } else { 0 },
            limit: if known { verdict.limit } else { None },
            suspects: statuses.iter().copied().chain(blamed).collect(),
            missing: self.missing(),
            assumed: self.assumed(&set_aside),
            stored_energy_mws: [0, 1].map(|side| {
                let channel = usable(snapshot, self.meters.stored_energy[side]).map(|reading| reading.value);
                channel.filter(|mws| *mws > 0.0).or(self.corridor.sides[side].stored_energy_mws)
            }),
            topology,
        }
    }

    /// Statuses as their channels say; in service where they never said anything.
    fn flags(&self, snapshot: &Snapshot) -> Topology {
        let flag = |&slot: &Slot| usable(snapshot, slot).is_none_or(|reading| reading.value >= 0.5);
        Topology {
            closed: self.meters.closed.iter().map(flag).collect(),
            inserted: self.meters.inserted.iter().map(|banks| banks.iter().map(flag).collect()).collect(),
        }
    }

    fn standing(&self) -> Standing {
        let buses = 0..self.corridor.buses.len();
        let live: Vec<bool> = buses.clone().map(|bus| self.wiring.live(bus)).collect();
        let nothing = C64::new(0.0, 0.0);
        let voltage_of = |bus| if live[bus] { self.estimator.voltage(&self.corridor, bus) } else { nothing };
        let voltage: Vec<C64> = buses.clone().map(voltage_of).collect();
        let load_of = |bus: usize| match bus {
            _ if !live[bus] => nothing,
            0..=TO => load::terminal(&self.corridor, bus, &self.z, &self.w, voltage[bus]),
            _ => load::station(&self.wiring, bus, &voltage),
        };
        let load = buses.map(load_of).collect();
        let state = FittedState { voltage, load, live };
        if self.wiring.joined() {
            Standing::Joined(state)
        } else {
            Standing::Parted { state, angle_known: self.estimator.angle_known }
        }
    }

    fn missing(&self) -> Vec<Slot> {
        let kv = (0..self.corridor.buses.len()).filter(|bus| self.wiring.live(*bus)).map(Meters::kv);
        let flows = self.wiring.wires.iter().flat_map(|wire| wire.meters);
        kv.chain(flows).filter(|meter| self.w[*meter] == 0.0).map(|meter| self.meters.slots[meter]).collect()
    }

    fn assumed(&self, set_aside: &[usize]) -> Vec<Arc<str>> {
        let origin = |meter| match self.w[meter] > 0.0 {
            true => Origin::Channel,
            false if set_aside.contains(&meter) => Origin::Balance,
            false => Origin::Assumed,
        };
        let live = (0..self.corridor.buses.len()).filter(|bus| self.wiring.live(*bus));
        live.filter_map(|bus| self.assumptions.of(bus, Meters::load(bus).map(origin)).cloned()).collect()
    }
}
