//! What is wrong with a snapshot that does not agree with itself: the explanation that blames the fewest channels.
//!
//! Flows win over status flags (an open circuit that carries power counts as closed), and single measurements are set aside by
//! their normalised residuals. Where that blames more than one, or a circuit that is flagged closed is dead at both ends, other
//! states of single circuits and banks are tried, and the one that leaves the fewest channels to blame is believed:
//!
//! - closed but dead at both ends: counts as open if that blames no more channels than before;
//! - flagged open but carrying: stays open after all if its flows, and not its flag, are what disagrees with the rest (they
//!   may be old values of a circuit that has just tripped);
//! - a bank: toggled if that blames fewer, so never on the word of one measurement.

use super::{Fitter, estimator::Failure, meter::Meter, wiring::Wiring};
use crate::{feed::Slot, grid::BankIndex, network::Topology};

/// Standard deviations of MW that are more than the charging losses of an open circuit, at both ends.
const CARRYING: f64 = 5.0;
/// The same at one end, where the other is not measured.
const CLEARLY_CARRYING: f64 = 10.0;
/// Standard deviations within which a flow is none.
const DEAD: f64 = 4.0;

/// The χ² test of one fit.
#[derive(Debug, Clone, Copy)]
pub(super) struct Verdict {
    pub chi2: f64,
    pub dof: usize,
    pub limit: Option<f64>,
}

impl Verdict {
    const UNKNOWN: Self = Self { chi2: f64::INFINITY, dof: 0, limit: None };

    pub fn known(&self) -> bool {
        self.chi2.is_finite()
    }

    fn passes(&self) -> bool {
        self.known() && self.limit.is_none_or(|limit| self.chi2 <= limit)
    }
}

/// A topology and what must be blamed for it to hold.
#[derive(Debug)]
pub(super) struct Explanation {
    pub topology: Topology,
    /// Channels blamed for the topology.
    pub statuses: Vec<Slot>,
    /// Measurements set aside, worst first.
    pub set_aside: Vec<Meter>,
    pub verdict: Verdict,
}

impl Explanation {
    /// Smaller is better.
    fn blame(&self) -> (bool, usize) {
        (!self.verdict.passes(), self.statuses.len() + self.set_aside.len())
    }
}

/// One change of a topology.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Change {
    Open(usize),
    StayOpen(usize),
    Toggle(BankIndex),
}

impl Fitter {
    /// The best explanation of the measurements given the statuses as flagged; the estimator stands at its state.
    pub(super) fn explain(&mut self, flags: Topology) -> Explanation {
        let mut topology = flags;
        let mut statuses = Vec::new();
        let carrying: Vec<usize> =
            (0..topology.closed.len()).filter(|c| !topology.closed[*c] && self.carries(*c)).collect();
        for &circuit in &carrying {
            topology.closed[circuit] = true;
            statuses.push(self.meters.closed[circuit]);
        }
        let mut best = self.try_topology(topology, statuses);
        let mut changes = Vec::new();
        while !best.verdict.passes() || !best.set_aside.is_empty() {
            let better = self
                .changes(&best, &carrying)
                .into_iter()
                .filter(|change| !changes.contains(change))
                .map(|change| (change, self.change(&best, change)))
                .filter(|(change, other)| match change {
                    Change::Open(_) => other.blame() <= best.blame(),
                    Change::StayOpen(_) | Change::Toggle(_) => other.blame() < best.blame(),
                })
                .min_by_key(|(_, other)| other.blame());
            let Some((change, other)) = better else { break };
            changes.push(change);
            best = other;
        }
        self.try_again(&best);
        best
    }

    /// Changes worth a try.
    fn changes(&self, present: &Explanation, carrying: &[usize]) -> Vec<Change> {
        let closed = |circuit: &usize| present.topology.closed[*circuit];
        let circuits = 0..self.corridor.circuits.len();
        let mut changes: Vec<Change> =
            circuits.filter(closed).filter(|c| !carrying.contains(c) && self.is_dead(*c)).map(Change::Open).collect();
        if present.set_aside.len() > 1 || !present.verdict.passes() {
            changes.extend(carrying.iter().copied().filter(closed).map(Change::StayOpen));
            let banks = self.corridor.banks().filter(|(bank, _)| closed(&bank.circuit));
            changes.extend(banks.map(|(bank, _)| Change::Toggle(bank)));
        }
        changes
    }

    fn change(&mut self, present: &Explanation, change: Change) -> Explanation {
        let (mut topology, mut statuses) = (present.topology.clone(), present.statuses.clone());
        match change {
            Change::Open(circuit) => {
                topology.closed[circuit] = false;
                statuses.push(self.meters.closed[circuit]);
            }
            Change::StayOpen(circuit) => {
                topology.closed[circuit] = false;
                statuses.retain(|slot| *slot != self.meters.closed[circuit]);
                let [from_mw, _, to_mw, _] = self.meters.flow(circuit);
                statuses
                    .extend([from_mw, to_mw].into_iter().filter(|m| self.w[*m] > 0.0).map(|m| self.meters.slots[m]));
            }
            Change::Toggle(BankIndex { circuit, bank }) => {
                let inserted = &mut topology.inserted[circuit][bank];
                *inserted = !*inserted;
                statuses.push(self.meters.inserted[circuit][bank]);
            }
        }
        self.try_topology(topology, statuses)
    }

    /// Fits on a topology and sets aside one measurement after another until the test passes or nothing is left to spare.
    fn try_topology(&mut self, topology: Topology, statuses: Vec<Slot>) -> Explanation {
        self.wire(&topology);
        let mut set_aside = Vec::new();
        let mut verdict = self.solve();
        while verdict.limit.is_some() && !verdict.passes() {
            let Some(worst) = self.estimator.worst(&self.wiring) else { break };
            self.estimator.w[worst] = 0.0;
            set_aside.push(worst);
            verdict = self.solve();
        }
        Explanation { topology, statuses, set_aside, verdict }
    }

    /// Brings the estimator back to the state of an explanation, if another was tried since.
    fn try_again(&mut self, explanation: &Explanation) {
        if self.wiring.topology != explanation.topology {
            self.wire(&explanation.topology);
            for &meter in &explanation.set_aside {
                self.estimator.w[meter] = 0.0;
            }
            self.solve();
        }
    }

    /// Takes a topology and all measurements that concern it.
    fn wire(&mut self, topology: &Topology) {
        if self.wiring.topology != *topology {
            self.wiring = Wiring::new(&self.corridor, topology, &self.meters, &mut self.branches);
        }
        self.estimator.prepare(&self.corridor, &self.meters, &self.wiring, &self.z, &self.w);
    }

    fn solve(&mut self) -> Verdict {
        let Some(dof) = self.estimator.count().checked_sub(self.estimator.unknowns) else { return Verdict::UNKNOWN };
        self.estimator.start(&self.wiring);
        match self.estimator.iterate(&self.wiring, f64::INFINITY) {
            Ok(_) if !self.estimator.angles_fixed(&self.wiring) => Verdict::UNKNOWN,
            Ok(chi2) => Verdict { chi2, dof, limit: self.limits[dof] },
            Err(Failure::Restless) => Verdict { chi2: f64::INFINITY, dof, limit: self.limits[dof] },
            Err(Failure::Open) => Verdict::UNKNOWN,
        }
    }

    /// MW at the ends of a circuit, in standard deviations.
    fn mw(&self, circuit: usize) -> [Option<f64>; 2] {
        let [from_mw, _, to_mw, _] = self.meters.flow(circuit);
        [from_mw, to_mw].map(|meter| (self.w[meter] > 0.0).then(|| (self.z[meter] * self.w[meter]).abs()))
    }

    fn carries(&self, circuit: usize) -> bool {
        match self.mw(circuit) {
            [Some(from), Some(to)] => from.min(to) > CARRYING,
            [Some(mw), None] | [None, Some(mw)] => mw > CLEARLY_CARRYING,
            [None, None] => false,
        }
    }

    fn is_dead(&self, circuit: usize) -> bool {
        self.mw(circuit).iter().all(Option::is_some)
            && self.meters.flow(circuit).iter().all(|meter| (self.z[*meter] * self.w[*meter]).abs() < DEAD)
    }
}
