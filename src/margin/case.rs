//! The networks of one topology: as it is, after each outage, and with each fault on. The exporter's bus has seat 0 in
//! them, the importer's seat 1; stations keep their index.

use std::sync::Arc;

use crate::{
    grid::{BankIndex, BusIndex, Circuit, Corridor, End, FROM, TO},
    network::{Admittance, Branch, C64, FaultedBranch, Reduced, Topology},
};

/// A network of which only the loads change from frame to frame.
#[derive(Debug, Clone)]
pub(super) struct Network {
    base: Admittance,
    live: Vec<bool>,
    /// A terminal that a bolted fault holds at zero voltage.
    pub shorted: Option<usize>,
    /// What is left of it at the terminals, with the present loads.
    pub reduced: Reduced,
}

/// A circuit in service.
#[derive(Debug, Clone)]
pub(super) struct InService {
    pub circuit: usize,
    pub seats: [usize; 2],
    pub branch: Branch,
}

/// A network with what is needed to judge currents and voltages in it.
#[derive(Debug, Clone)]
pub(super) struct Case {
    pub network: Network,
    pub circuits: Vec<InService>,
    pub live: Vec<bool>,
}

/// What an outage leaves.
#[derive(Debug, Clone)]
pub(super) struct OutageCase {
    pub name: Arc<str>,
    /// `None`: the outage separates the corridor.
    pub after: Option<Case>,
    pub fault: Option<Network>,
}

/// All networks of one topology and direction.
#[derive(Debug, Clone)]
pub(super) struct CaseSet {
    pub exporter: BusIndex,
    pub present: Case,
    pub outages: Vec<OutageCase>,
}

/// The seat of a bus, or the bus of a seat.
pub(super) fn seat(exporter: BusIndex, bus: BusIndex) -> usize {
    match bus {
        FROM | TO if exporter == TO => 1 - bus,
        other => other,
    }
}

impl Network {
    fn new(size: usize, live: Vec<bool>) -> Self {
        Self { base: Admittance::new(size), live, shorted: None, reduced: Reduced::default() }
    }

    /// Takes the present loads (S, by seat) in.
    pub fn set_loads(&mut self, loads: &[C64], scratch: &mut Admittance) {
        scratch.copy_from(&self.base);
        for (seat, load) in loads.iter().enumerate() {
            scratch.add_shunt(seat, *load);
        }
        scratch.reduce_into(&self.live, &mut self.reduced);
    }
}

impl Case {
    fn new(corridor: &Corridor, topology: &Topology, exporter: BusIndex) -> Self {
        let live = topology.live(corridor);
        let mut network = Network::new(corridor.buses.len(), live.clone());
        let circuits: Vec<_> = (0..corridor.circuits.len())
            .filter(|circuit| topology.closed[*circuit])
            .map(|circuit| {
                let Circuit { between, .. } = corridor.circuits[circuit];
                let branch = Branch::of(&corridor.circuits[circuit], &topology.inserted[circuit]);
                InService { circuit, seats: between.map(|bus| seat(exporter, bus)), branch }
            })
            .collect();
        for InService { seats, branch, .. } in &circuits {
            network.base.add(*seats, *branch);
        }
        Self { network, circuits, live }
    }
}

impl CaseSet {
    /// Without the outages of these names.
    pub fn new(corridor: &Corridor, topology: &Topology, exporter: BusIndex, without: &[Arc<str>]) -> Self {
        let present = Case::new(corridor, topology, exporter);
        let outages = outages(corridor, topology)
            .filter(|(name, ..)| !without.contains(name))
            .map(|(name, circuits, banks)| {
                let after = topology.without(&circuits, &banks);
                let after = after.joins_terminals(corridor).then(|| Case::new(corridor, &after, exporter));
                let fault = match circuits.first() {
                    Some(&circuit) if after.is_some() => faulted(corridor, topology, &present, circuit, exporter),
                    _ => None,
                };
                OutageCase { name, after, fault }
            })
            .collect();
        Self { exporter, present, outages }
    }
}

/// Name, circuits in service and inserted banks of every outage to judge.
fn outages(corridor: &Corridor, topology: &Topology) -> impl Iterator<Item = (Arc<str>, Vec<usize>, Vec<BankIndex>)> {
    let closed = |circuit: &usize| topology.closed[*circuit];
    let inserted = move |bank: &BankIndex| closed(&bank.circuit) && topology.inserted[bank.circuit][bank.bank];
    let circuits = (0..corridor.circuits.len())
        .filter(closed)
        .map(|circuit| (corridor.circuits[circuit].name.clone(), vec![circuit], Vec::new()));
    let banks = corridor
        .banks()
        .filter(move |(index, _)| inserted(index))
        .map(|(index, bank)| (bank.name.clone(), Vec::new(), vec![index]));
    let combined = corridor.outages.iter().map(move |outage| {
        let circuits: Vec<_> = outage.circuits.iter().copied().filter(closed).collect();
        let banks: Vec<_> = outage.banks.iter().copied().filter(inserted).collect();
        (outage.name.clone(), circuits, banks)
    });
    let effective = |(_, circuits, banks): &(_, Vec<_>, Vec<_>)| !(circuits.is_empty() && banks.is_empty());
    circuits.chain(banks).chain(combined.filter(effective))
}

/// The present network with the configured fault on a circuit, counted from its end nearer to the exporter.
fn faulted(
    corridor: &Corridor,
    topology: &Topology,
    present: &Case,
    circuit: usize,
    exporter: BusIndex,
) -> Option<Network> {
    let fault = corridor.fault?;
    let Circuit { between: [first, second], .. } = corridor.circuits[circuit];
    let distance = Topology::distance(corridor, exporter);
    let second_is_nearer = match distance[first].cmp(&distance[second]) {
        std::cmp::Ordering::Less => false,
        std::cmp::Ordering::Equal => exporter == TO,
        std::cmp::Ordering::Greater => true,
    };
    let counted_from = if second_is_nearer { End::To } else { End::From };
    let on_fault =
        FaultedBranch::of(&corridor.circuits[circuit], &topology.inserted[circuit], fault.kind, fault.at, counted_from);
    let mut network = Network::new(corridor.buses.len(), present.live.clone());
    for other in &present.circuits {
        network.base.add(other.seats, if other.circuit == circuit { on_fault.branch } else { other.branch });
    }
    let shorted = on_fault.shorted.map(|end| seat(exporter, if end == End::From { first } else { second }));
    match shorted {
        Some(terminal @ (0 | 1)) => network.shorted = Some(terminal),
        Some(station) => network.live[station] = false,
        None => {}
    }
    Some(network)
}
