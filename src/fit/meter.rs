//! What is measured of a corridor, in which unit, how well; and where its channels are.

use crate::{
    config::MeasurementSettings,
    feed::{Channels, End, Point, Quality, Quantity, Reading, Slot, Snapshot},
    grid::{BankIndex, BusIndex, Circuit, Corridor, three_phase_mva},
};

/// Four per bus, then four per circuit: position in every list of measurements.
pub(super) type Meter = usize;

/// What questionable readings and assumed loads have in standard deviations of a good one.
const WIDER: f64 = 3.0;

/// A corridor's measurements and channels.
#[derive(Debug, Clone)]
pub(super) struct Meters {
    buses: usize,
    pub slots: Vec<Slot>,
    /// Reading in one internal unit: nominal kV, degrees in a radian, 1 for powers.
    unit: Vec<f64>,
    /// Standard deviation, internal units.
    sigma: Vec<f64>,
    pub closed: Vec<Slot>,
    pub inserted: Vec<Vec<Slot>>,
    pub stored_energy: [Slot; 2],
}

/// The usable reading of a channel, whatever the snapshot holds.
pub(super) fn usable(snapshot: &Snapshot, slot: Slot) -> Option<Reading> {
    let reading = snapshot.readings.get(slot).copied().flatten()?;
    (reading.quality != Quality::Invalid && reading.value.is_finite()).then_some(reading)
}

/// Size against which a circuit's power is metered, MVA: thermal; without a rating its surge impedance loading; without
/// charging a tenth of what it carries at 90°.
fn rated_mva(circuit: &Circuit, nominal_kv: f64) -> f64 {
    match circuit.rating_a {
        Some(rating_a) => three_phase_mva(nominal_kv, rating_a),
        None => circuit
            .line
            .surge_impedance_loading_mw(nominal_kv)
            .unwrap_or_else(|| 0.1 * nominal_kv * nominal_kv / circuit.line.totals().x_ohm),
    }
}

impl Meters {
    pub fn new(corridor: &Corridor, channels: &Channels, settings: &MeasurementSettings) -> Self {
        use Quantity::{Active, Reactive};
        let buses = corridor.buses.len();
        let slot = |point| channels.slot(corridor, point);
        let (mut slots, mut unit, mut sigma) = (Vec::new(), Vec::new(), Vec::new());
        let power_sigma = |circuit: &Circuit| {
            0.01 * settings.power_sigma_pct * rated_mva(circuit, corridor.buses[circuit.between[0]].nominal_kv)
        };
        for (index, bus) in corridor.buses.iter().enumerate() {
            let points =
                [Point::Kv(index), Point::Deg(index), Point::Load(index, Active), Point::Load(index, Reactive)];
            slots.extend(points.map(slot));
            unit.extend([bus.nominal_kv, 1f64.to_degrees(), 1.0, 1.0]);
            let circuits = corridor.circuits.iter().filter(|c| c.between.contains(&index));
            let load_sigma = circuits.map(power_sigma).fold(f64::MIN_POSITIVE, f64::max);
            let angle_sigma = settings.angle_sigma_deg.to_radians();
            sigma.extend([0.01 * settings.kv_sigma_pct, angle_sigma, load_sigma, load_sigma]);
        }
        for (index, circuit) in corridor.circuits.iter().enumerate() {
            for end in [End::From, End::To] {
                slots.extend([Active, Reactive].map(|quantity| slot(Point::Flow(index, end, quantity))));
            }
            unit.extend([1.0; 4]);
            sigma.extend([power_sigma(circuit); 4]);
        }
        let circuits = 0..corridor.circuits.len();
        let banks = |circuit: usize| 0..corridor.circuits[circuit].banks.len();
        let inserted =
            |circuit| banks(circuit).map(|bank| slot(Point::Inserted(BankIndex { circuit, bank }))).collect();
        Self {
            buses,
            slots,
            unit,
            sigma,
            closed: circuits.clone().map(|circuit| slot(Point::Closed(circuit))).collect(),
            inserted: circuits.map(inserted).collect(),
            stored_energy: [0, 1].map(|side| slot(Point::StoredEnergy(side))),
        }
    }

    pub fn len(&self) -> usize {
        self.slots.len()
    }

    pub fn kv(bus: BusIndex) -> Meter {
        4 * bus
    }

    pub fn deg(bus: BusIndex) -> Meter {
        4 * bus + 1
    }

    /// MW, then Mvar drawn.
    pub fn load(bus: BusIndex) -> [Meter; 2] {
        [4 * bus + 2, 4 * bus + 3]
    }

    /// MW and Mvar at the first bus, MW and Mvar at the second.
    pub fn flow(&self, circuit: usize) -> [Meter; 4] {
        [0, 1, 2, 3].map(|k| 4 * (self.buses + circuit) + k)
    }

    /// Values in internal units, and one over their standard deviations: 0 where there is no usable value.
    pub fn read(&self, snapshot: &Snapshot, z: &mut Vec<f64>, w: &mut Vec<f64>) {
        z.clear();
        w.clear();
        for ((&slot, unit), sigma) in self.slots.iter().zip(&self.unit).zip(&self.sigma) {
            let (value, weight) = usable(snapshot, slot).map_or((0.0, 0.0), |reading| {
                let wider = if reading.quality == Quality::Questionable { WIDER } else { 1.0 };
                (reading.value / unit, 1.0 / (wider * sigma))
            });
            z.push(value);
            w.push(weight);
        }
    }

    /// Standard deviation of a measurement in its channel's unit.
    pub fn sigma(&self, meter: Meter) -> f64 {
        self.sigma[meter] * self.unit[meter]
    }

    /// Weight of a load that is assumed, not measured.
    pub fn assumed_weight(&self, load: Meter) -> f64 {
        1.0 / (WIDER * self.sigma[load])
    }
}
