//! Loads as constant admittances, and the sentences that say which of them are assumed.

use std::sync::Arc;

use super::{
    meter::{Meter, Meters},
    wiring::Wiring,
};
use crate::{
    feed::End,
    grid::{Bus, BusIndex, Corridor, TO},
    network::C64,
};

/// Where a load's MW or Mvar come from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Origin {
    Channel,
    Assumed,
    /// A station whose assumed load was set aside.
    Balance,
}

/// Every sentence there may be, by bus and the origins of its MW and Mvar.
#[derive(Debug)]
pub(super) struct Assumptions(Vec<[[Option<Arc<str>>; 3]; 3]>);

impl Assumptions {
    pub fn new(corridor: &Corridor) -> Self {
        use Origin::{Assumed, Balance, Channel};
        let origins = [Channel, Assumed, Balance];
        Self(corridor.buses.iter().map(|bus| origins.map(|mw| origins.map(|mvar| sentence(bus, [mw, mvar])))).collect())
    }

    pub fn of(&self, bus: BusIndex, [mw, mvar]: [Origin; 2]) -> Option<&Arc<str>> {
        self.0[bus][mw as usize][mvar as usize].as_ref()
    }
}

fn sentence(bus: &Bus, origins: [Origin; 2]) -> Option<Arc<str>> {
    let configured = bus.load.map_or([0.0; 2], |load| [load.mw, load.mvar]);
    let part = |((origin, power), unit): ((Origin, f64), &str)| match origin {
        Origin::Channel => None,
        Origin::Assumed if bus.load.is_some() => Some(format!("{power} {unit} as configured")),
        Origin::Assumed => Some(format!("{power} {unit} assumed")),
        Origin::Balance => Some(format!("{unit} by balance")),
    };
    let parts: Vec<_> = origins.into_iter().zip(configured).zip(["MW", "Mvar"]).filter_map(part).collect();
    (!parts.is_empty()).then(|| format!("{} load: not measured, {}", bus.name, parts.join(", ")).into())
}

/// Load of a terminal at a voltage, S: the channel's, or the configured one at nominal voltage.
pub(super) fn terminal(corridor: &Corridor, bus: BusIndex, z: &[f64], w: &[f64], v: C64) -> C64 {
    let configured = corridor.buses[bus].load.map_or([0.0; 2], |load| [load.mw, load.mvar]);
    let part = |meter: Meter, configured: f64| {
        if w[meter] > 0.0 { z[meter] / v.norm_sqr() } else { configured / corridor.buses[bus].nominal_kv.powi(2) }
    };
    let [mw, mvar] = Meters::load(bus);
    C64::new(part(mw, configured[0]), -part(mvar, configured[1]))
}

/// Load of a station, S: what its circuits bring, so that the network reproduces the voltages exactly.
pub(super) fn station(wiring: &Wiring, bus: BusIndex, voltage: &[C64]) -> C64 {
    debug_assert!(bus > TO);
    let mut drawn = C64::new(0.0, 0.0);
    for wire in &wiring.wires {
        let [first, second] = wire.buses;
        for (end, at) in [(End::From, first), (End::To, second)] {
            if at == bus {
                drawn -= wire.branch.current(end, voltage[first], voltage[second]);
            }
        }
    }
    drawn / voltage[bus]
}
