//! Corridors whose true state is known, and what their meters would show.

use std::sync::Arc;

use chrono::DateTime;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};
use tautline::{
    config::{Config, MeasurementSettings},
    feed::{Channels, End, Point, Quality, Quantity, Reading, Snapshot},
    fit::{Fit, Fitter},
    grid::{Bank, Bus, Circuit, ConfiguredSource, Corridor, FROM, Line, Requirements, Side, SynchronismCheck, TO},
    network::{Admittance, Branch, C64, Reduced, Topology},
};

pub const NOMINAL_KV: f64 = 400.0;

/// A corridor in a known state.
pub struct World {
    pub corridor: Arc<Corridor>,
    pub channels: Channels,
    pub topology: Topology,
    pub voltage: Vec<C64>,
    /// By bus, S.
    pub load: Vec<C64>,
}

pub fn bus(name: &str) -> Bus {
    Bus { name: name.into(), nominal_kv: NOMINAL_KV, min_kv: None, load: None }
}

/// A line of a common 400 kV kind.
pub fn circuit(name: &str, between: [usize; 2], length_km: f64) -> Circuit {
    Circuit {
        name: name.into(),
        between,
        line: Line::PerKm { length_km, r_ohm_per_km: 0.028, x_ohm_per_km: 0.31, b_us_per_km: 3.7 },
        rating_a: Some(1900.0),
        short_time_rating_a: None,
        banks: Vec::new(),
    }
}

pub fn corridor(stations: &[&str], circuits: Vec<Circuit>) -> Corridor {
    let source = ConfiguredSource { r_ohm: 1.0, x_ohm: 20.0, spread: 0.3, swing_x_ohm: 0.0 };
    Corridor {
        name: "Skarn-Velm".into(),
        buses: ["Skarn", "Velm"].iter().chain(stations).map(|name| bus(name)).collect(),
        sides: [Side { stored_energy_mws: Some(60000.0), source }; 2],
        circuits,
        outages: Vec::new(),
        fault: None,
        require: Requirements::default(),
        reclose: SynchronismCheck::default(),
        thin_mw: 0.0,
        state_spreads: 0.0,
    }
}

/// Three circuits, one with a series capacitor.
pub fn three_circuits() -> Corridor {
    let mut circuits: Vec<_> = [240.0, 255.0, 230.0]
        .iter()
        .zip(["SV1", "SV2", "SV3"])
        .map(|(km, name)| circuit(name, [FROM, TO], *km))
        .collect();
    circuits[0].banks.push(Bank { name: "SV1-SC".into(), x_ohm: 26.0, at: 0.5 });
    corridor(&[], circuits)
}

/// Three circuits of any length and kind at any transfer, or with stations in between.
pub fn random_world(seed: usize, stations: usize) -> World {
    let mut rng = ChaCha8Rng::seed_from_u64(seed as u64);
    let names: Vec<String> = (0..stations).map(|s| format!("Mid{s}")).collect();
    let chain: Vec<usize> = [FROM].into_iter().chain(2..2 + stations).chain([TO]).collect();
    let mut circuits = Vec::new();
    for pair in chain.windows(2) {
        for _ in 0..if stations == 0 { 3 } else { rng.random_range(2..4) } {
            let between = if rng.random_bool(0.5) { [pair[0], pair[1]] } else { [pair[1], pair[0]] };
            let length_km = rng.random_range(120.0..350.0) / (1.0 + stations as f64);
            let mut made = circuit(&format!("L{}", circuits.len()), between, length_km);
            made.line = Line::PerKm {
                length_km,
                r_ohm_per_km: rng.random_range(0.01..0.05),
                x_ohm_per_km: rng.random_range(0.28..0.4),
                b_us_per_km: rng.random_range(2.8..5.0),
            };
            made.rating_a = rng.random_bool(0.7).then(|| rng.random_range(1500.0..3500.0));
            if rng.random_bool(0.3) {
                let x_ohm = length_km * rng.random_range(0.05..0.15);
                made.banks.push(Bank {
                    name: format!("C{}", circuits.len()).into(),
                    x_ohm,
                    at: rng.random_range(0.0..1.0),
                });
            }
            circuits.push(made);
        }
    }
    let corridor = corridor(&names.iter().map(String::as_str).collect::<Vec<_>>(), circuits);
    let mut topology = Topology::complete(&corridor);
    for bank in topology.inserted.iter_mut().flatten() {
        *bank = rng.random_bool(0.5);
    }
    let angle_deg = rng.random_range(6.0..28.0) * if rng.random_bool(0.5) { 1.0 } else { -1.0 };
    let terminals = [
        C64::from_polar(NOMINAL_KV * rng.random_range(0.95..1.05), f64::to_radians(angle_deg)),
        C64::from(NOMINAL_KV * rng.random_range(0.95..1.05)),
    ];
    let loads = (0..2 + stations)
        .map(|_| C64::new(rng.random_range(0.0..250.0), rng.random_range(-80.0..80.0)) / NOMINAL_KV.powi(2))
        .collect();
    World::new(corridor, topology, terminals, loads)
}

impl World {
    pub fn new(corridor: Corridor, topology: Topology, terminals: [C64; 2], load: Vec<C64>) -> Self {
        let mut y = Admittance::new(corridor.buses.len());
        for (index, circuit) in corridor.circuits.iter().enumerate().filter(|(index, _)| topology.closed[*index]) {
            y.add(circuit.between, Branch::of(circuit, &topology.inserted[index]));
        }
        load.iter().enumerate().for_each(|(bus, load)| y.add_shunt(bus, *load));
        let live = topology.live(&corridor);
        let mut reduced = Reduced::default();
        y.reduce_into(&live, &mut reduced);
        let voltage = (0..corridor.buses.len())
            .map(|bus| reduced.row(bus))
            .map(|[a, b]| a * terminals[0] + b * terminals[1])
            .collect();
        let corridor = Arc::new(corridor);
        let channels = Channels::new(&config(&corridor));
        Self { corridor, channels, topology, voltage, load }
    }

    pub fn fitter(&self) -> Fitter {
        Fitter::new(self.corridor.clone(), &self.channels, &MeasurementSettings::default())
    }

    pub fn fit(&self, snapshot: &Snapshot) -> Fit {
        self.fitter().fit(snapshot)
    }

    /// What a perfect meter shows.
    pub fn value(&self, point: Point) -> f64 {
        let part = |s: C64, quantity| if quantity == Quantity::Active { s.re } else { s.im };
        match point {
            Point::Kv(bus) => self.voltage[bus].norm(),
            Point::Deg(bus) => self.voltage[bus].arg().to_degrees() + 40.0,
            Point::Load(bus, quantity) => part(self.load[bus].conj() * self.voltage[bus].norm_sqr(), quantity),
            Point::StoredEnergy(_) => 50000.0,
            Point::Flow(circuit, end, quantity) => {
                let [first, second] = self.corridor.circuits[circuit].between;
                if !self.topology.closed[circuit] {
                    return 0.0;
                }
                let current = self.branch(circuit).current(end, self.voltage[first], self.voltage[second]);
                let at = if end == End::From { first } else { second };
                part(self.voltage[at] * current.conj(), quantity)
            }
            Point::Closed(circuit) => f64::from(self.topology.closed[circuit]),
            Point::Inserted(index) => f64::from(self.topology.inserted[index.circuit][index.bank]),
        }
    }

    pub fn points(&self) -> Vec<Point> {
        Point::of(&self.corridor)
    }

    /// All channels, exact.
    pub fn exact(&self) -> Snapshot {
        let mut snapshot =
            Snapshot { time: DateTime::UNIX_EPOCH, readings: vec![None; self.channels.len()], aside: None };
        for point in self.points() {
            self.set(&mut snapshot, point, self.value(point));
        }
        snapshot
    }

    /// All channels with Gaussian noise of the default classes.
    pub fn noisy(&self, rng: &mut ChaCha8Rng) -> Snapshot {
        let mut snapshot = self.exact();
        for point in self.points() {
            let noise: f64 = StandardNormal.sample(rng);
            self.set(&mut snapshot, point, self.value(point) + noise * self.sigma(point));
        }
        snapshot
    }

    /// Standard deviation of a rated circuit's and a bus's channels.
    pub fn sigma(&self, point: Point) -> f64 {
        let power = |circuit: usize| {
            0.003 * 3f64.sqrt() * NOMINAL_KV * self.corridor.circuits[circuit].rating_a.unwrap() * 1e-3
        };
        match point {
            Point::Kv(_) => 0.0015 * NOMINAL_KV,
            Point::Deg(_) => 0.1,
            Point::Flow(circuit, ..) => power(circuit),
            Point::Load(bus, _) => (0..self.corridor.circuits.len())
                .filter(|c| self.corridor.circuits[*c].between.contains(&bus))
                .map(power)
                .fold(0.0, f64::max),
            Point::StoredEnergy(_) | Point::Closed(_) | Point::Inserted(_) => 0.0,
        }
    }

    pub fn set(&self, snapshot: &mut Snapshot, point: Point, value: f64) {
        let reading = Reading { value, quality: Quality::Good };
        snapshot.readings[self.slot(point)] = Some(reading);
    }

    pub fn drop(&self, snapshot: &mut Snapshot, mut gone: impl FnMut(Point) -> bool) {
        for point in self.points().into_iter().filter(|point| gone(*point)) {
            snapshot.readings[self.slot(point)] = None;
        }
    }

    pub fn slot(&self, point: Point) -> usize {
        self.channels.slot(&self.corridor, point)
    }

    pub fn branch(&self, circuit: usize) -> Branch {
        Branch::of(&self.corridor.circuits[circuit], &self.topology.inserted[circuit])
    }

    pub fn names(&self, slots: &[usize]) -> Vec<&str> {
        slots.iter().map(|slot| &**self.channels.name(*slot)).collect()
    }
}

/// The three circuits of [`three_circuits`] at about 1300 MW.
pub fn loaded_world() -> World {
    let corridor = three_circuits();
    let topology = Topology::complete(&corridor);
    let terminals = [C64::from_polar(408.0, 0.2), C64::from(402.0)];
    World::new(corridor, topology, terminals, vec![C64::new(0.005, -0.0007), C64::new(0.003, 0.0)])
}

/// A configuration of nothing but this corridor.
pub fn config(corridor: &Corridor) -> Config {
    let mut config = Config::parse(include_str!("../cases/corridor-01/config.toml"), "config.toml").unwrap();
    config.grid.corridors = vec![corridor.clone()];
    config
}
