//! Which switches are closed, and what that joins.

use serde::{Deserialize, Serialize};

use crate::grid::{BankIndex, BusIndex, Corridor, FROM, TO};

/// Statuses of a corridor's circuits and banks.
#[derive(Debug, Clone, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub struct Topology {
    /// By circuit: in service.
    pub closed: Vec<bool>,
    /// By circuit and bank: inserted.
    pub inserted: Vec<Vec<bool>>,
}

impl Topology {
    /// Everything in service.
    pub fn complete(corridor: &Corridor) -> Self {
        Self {
            closed: vec![true; corridor.circuits.len()],
            inserted: corridor.circuits.iter().map(|c| vec![true; c.banks.len()]).collect(),
        }
    }

    /// Whether it is one of a corridor's.
    pub fn is_of(&self, corridor: &Corridor) -> bool {
        let complete = Self::complete(corridor);
        let banks = |topology: &Self| topology.inserted.iter().map(Vec::len).collect::<Vec<_>>();
        self.closed.len() == complete.closed.len() && banks(self) == banks(&complete)
    }

    /// With circuits out and banks bypassed.
    #[must_use]
    pub fn without(&self, circuits: &[usize], banks: &[BankIndex]) -> Self {
        let mut left = self.clone();
        for &circuit in circuits {
            left.closed[circuit] = false;
        }
        for bank in banks {
            left.inserted[bank.circuit][bank.bank] = false;
        }
        left
    }

    /// By bus: joined to a terminal by closed circuits (a terminal is to itself).
    pub fn live(&self, corridor: &Corridor) -> Vec<bool> {
        let mut live = vec![false; corridor.buses.len()];
        live[FROM] = true;
        live[TO] = true;
        self.spread(corridor, &mut live);
        live
    }

    /// Whether closed circuits join the terminals.
    pub fn joins_terminals(&self, corridor: &Corridor) -> bool {
        let mut reached = vec![false; corridor.buses.len()];
        reached[FROM] = true;
        self.spread(corridor, &mut reached);
        reached[TO]
    }

    /// By bus: number of circuits between it and a terminal, whatever their status; `None` where there is no way.
    pub fn distance(corridor: &Corridor, terminal: BusIndex) -> Vec<Option<usize>> {
        let complete = Self::complete(corridor);
        let mut distance = vec![None; corridor.buses.len()];
        distance[terminal] = Some(0);
        for step in 0..corridor.buses.len() {
            for [a, b] in complete.edges(corridor) {
                for [near, far] in [[a, b], [b, a]] {
                    if distance[near] == Some(step) && distance[far].is_none() {
                        distance[far] = Some(step + 1);
                    }
                }
            }
        }
        distance
    }

    fn edges<'a>(&'a self, corridor: &'a Corridor) -> impl Iterator<Item = [BusIndex; 2]> + 'a {
        corridor.circuits.iter().zip(&self.closed).filter(|(_, closed)| **closed).map(|(circuit, _)| circuit.between)
    }

    fn spread(&self, corridor: &Corridor, reached: &mut [bool]) {
        loop {
            let before = reached.iter().filter(|r| **r).count();
            for [a, b] in self.edges(corridor) {
                let either = reached[a] || reached[b];
                reached[a] = either;
                reached[b] = either;
            }
            if reached.iter().filter(|r| **r).count() == before {
                return;
            }
        }
    }
}
