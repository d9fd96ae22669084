//! Currents and voltages in a network between settled sources, against ratings and floors.

use std::sync::Arc;

use super::{
    case::{Case, seat},
    power_angle::Phasor,
    stress::Settled,
};
use crate::{
    grid::{BusIndex, Circuit, Corridor, End},
    network::{AMPERES, C64},
};

/// Which of a circuit's ratings counts, A.
pub(super) type Rating = fn(&Circuit) -> Option<f64>;

/// A network as ratings and floors see it.
#[derive(Clone, Copy)]
pub(super) struct View<'a> {
    pub corridor: &'a Corridor,
    pub exporter: BusIndex,
    pub case: &'a Case,
    pub settled: &'a Settled,
    pub e_kv: [f64; 2],
}

/// The most loaded circuit.
#[derive(Debug, Clone)]
pub(super) struct Loaded {
    pub pct: f64,
    pub circuit: Arc<str>,
}

impl View<'_> {
    /// Voltage of a bus by its seat.
    pub fn voltage(&self, seat: usize) -> Phasor {
        self.settled.face.voltage(&self.case.network.reduced, seat, self.e_kv)
    }

    /// Rating (kV/ohm) and current of both ends of every rated circuit in service.
    fn rated(&self, rating: Rating) -> impl Iterator<Item = (usize, f64, Phasor)> {
        self.case
            .circuits
            .iter()
            .filter_map(move |on| Some((on, rating(&self.corridor.circuits[on.circuit])?)))
            .flat_map(|(on, rating_a)| {
                let [first, second] = on.seats.map(|seat| self.voltage(seat));
                [End::From, End::To].map(|end| {
                    let x = on.branch.current(end, first.x, second.x);
                    let i = on.branch.current(end, first.i, second.i);
                    (on.circuit, rating_a / AMPERES, Phasor { x, i })
                })
            })
    }

    /// The largest end current against its rating at an angle; `None` where nothing is rated.
    pub fn loading(&self, angle_rad: f64, rating: Rating) -> Option<Loaded> {
        let rotation = C64::cis(angle_rad);
        let ratio = |(circuit, rating, current): (usize, f64, Phasor)| (circuit, current.magnitude(rotation) / rating);
        let (circuit, ratio) = self.rated(rating).map(ratio).max_by(|a, b| a.1.total_cmp(&b.1))?;
        Some(Loaded { pct: 100.0 * ratio, circuit: self.corridor.circuits[circuit].name.clone() })
    }

    /// The first angle from `start_rad` on with a current above its rating: `None` where nothing is rated,
    /// infinity where it never is.
    pub fn overload_rad(&self, start_rad: f64, rating: Rating) -> Option<f64> {
        self.rated(rating)
            .map(|(_, rating, current)| {
                current.square().first_above(rating * rating, start_rad).unwrap_or(f64::INFINITY)
            })
            .reduce(f64::min)
    }

    /// The first angle from `start_rad` on with a bus under its floor, likewise.
    pub fn sag_rad(&self, start_rad: f64) -> Option<f64> {
        self.buses()
            .filter_map(|bus| Some((self.corridor.buses[bus].min_kv?, self.voltage(seat(self.exporter, bus)))))
            .map(|(floor, voltage)| voltage.square().first_below(floor * floor, start_rad).unwrap_or(f64::INFINITY))
            .reduce(f64::min)
    }

    /// kV of every live bus at an angle.
    pub fn kv(&self, angle_rad: f64) -> Vec<(Arc<str>, f64)> {
        let rotation = C64::cis(angle_rad);
        self.buses()
            .map(|bus| {
                let kv = self.voltage(seat(self.exporter, bus)).magnitude(rotation);
                (self.corridor.buses[bus].name.clone(), kv)
            })
            .collect()
    }

    fn buses(&self) -> impl Iterator<Item = BusIndex> {
        (0..self.corridor.buses.len()).filter(|bus| self.case.live[*bus])
    }
}
