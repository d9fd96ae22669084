use std::{collections::HashMap, ops::RangeInclusive, sync::Arc};

use crate::{
    config::Config,
    grid::{BankIndex, BusIndex, Corridor, End},
};

/// Index of a channel in [`Channels`], and of its reading in a [`super::Snapshot`].
pub type Slot = usize;

/// What a channel measures, within one corridor.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Point {
    /// Voltage magnitude of a bus, kV.
    Kv(BusIndex),
    /// Voltage angle of a bus, degrees.
    Deg(BusIndex),
    /// Load drawn at a bus.
    Load(BusIndex, Quantity),
    /// Stored kinetic energy of a side, MW·s.
    StoredEnergy(BusIndex),
    /// Power from a bus into a circuit.
    Flow(usize, End, Quantity),
    /// Whether a circuit is closed.
    Closed(usize),
    /// Whether a bank is inserted.
    Inserted(BankIndex),
}

/// Active or reactive.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantity {
    /// MW.
    Active,
    /// Mvar.
    Reactive,
}

impl Point {
    /// Every point of a corridor that a channel may bring.
    pub fn of(corridor: &Corridor) -> Vec<Self> {
        use Quantity::{Active, Reactive};
        let mut points = Vec::new();
        for bus in 0..corridor.buses.len() {
            points.extend([Self::Kv(bus), Self::Deg(bus), Self::Load(bus, Active), Self::Load(bus, Reactive)]);
        }
        points.extend([0, 1].map(Self::StoredEnergy));
        for circuit in 0..corridor.circuits.len() {
            for end in [End::From, End::To] {
                points.extend([Active, Reactive].map(|quantity| Self::Flow(circuit, end, quantity)));
            }
            points.push(Self::Closed(circuit));
        }
        points.extend(corridor.banks().map(|(index, _)| Self::Inserted(index)));
        points
    }

    /// The default channel name.
    pub fn name(self, corridor: &Corridor) -> String {
        let unit = |quantity| match quantity {
            Quantity::Active => "mw",
            Quantity::Reactive => "mvar",
        };
        match self {
            Self::Kv(bus) => format!("{}.kv", corridor.buses[bus].name),
            Self::Deg(bus) => format!("{}.deg", corridor.buses[bus].name),
            Self::Load(bus, quantity) => format!("{}.{}", corridor.buses[bus].name, unit(quantity)),
            Self::StoredEnergy(bus) => format!("{}.stored_energy_mws", corridor.buses[bus].name),
            Self::Flow(circuit, end, quantity) => {
                let end = match end {
                    End::From => "from",
                    End::To => "to",
                };
                format!("{}.{end}.{}", corridor.circuits[circuit].name, unit(quantity))
            }
            Self::Closed(circuit) => format!("{}.closed", corridor.circuits[circuit].name),
            Self::Inserted(BankIndex { circuit, bank }) => {
                format!("{}.inserted", corridor.circuits[circuit].banks[bank].name)
            }
        }
    }
}

/// Power beyond this many times what could ever flow is no measurement.
const ABSURD_POWER: f64 = 10.0;

impl Point {
    /// The values that a point can have; what lies outside is a broken measurement.
    ///
    /// - kV: above 5 % of nominal and below three times nominal;
    /// - degrees: ten turns either way;
    /// - MW and Mvar of a circuit: ten times U²/X, the peak of its own power-angle curve at nominal voltage;
    /// - a load: ten times the sum of U²/X over all that meets at its bus, the source of a side included;
    /// - stored energy: a millisecond of the U²/X of a circuit at its bus, and more.
    pub fn plausible(self, corridor: &Corridor) -> RangeInclusive<f64> {
        let nominal_kv = |bus: BusIndex| corridor.buses[bus].nominal_kv;
        let up_to = |limit: f64| -limit.min(f64::MAX)..=limit.min(f64::MAX);
        let peak_mw = |bus, x_ohm: f64| nominal_kv(bus).powi(2) / x_ohm;
        match self {
            Self::Kv(bus) => (0.05 * nominal_kv(bus)).next_up()..=(3.0 * nominal_kv(bus)).next_down(),
            Self::Deg(_) => up_to(3600.0),
            Self::Flow(circuit, end, _) => {
                let circuit = &corridor.circuits[circuit];
                up_to(ABSURD_POWER * peak_mw(circuit.between[end as usize], circuit.line.totals().x_ohm))
            }
            Self::Load(bus, _) => {
                let circuits = corridor.circuits.iter().filter(|circuit| circuit.between.contains(&bus));
                let source_x_ohm = corridor.sides.get(bus).map_or(f64::INFINITY, |side| side.source.x_ohm);
                let sum: f64 = circuits.map(|circuit| peak_mw(bus, circuit.line.totals().x_ohm)).sum();
                up_to(ABSURD_POWER * (sum + peak_mw(bus, source_x_ohm)))
            }
            Self::StoredEnergy(bus) => {
                let circuits = corridor.circuits.iter().filter(|circuit| circuit.between.contains(&bus));
                let peaks = circuits.map(|circuit| peak_mw(bus, circuit.line.totals().x_ohm));
                (1e-3 * peaks.fold(f64::MAX, f64::min)).max(f64::MIN_POSITIVE)..=f64::MAX
            }
            Self::Closed(_) | Self::Inserted(_) => 0.0..=1.0,
        }
    }
}

/// The channels that a configuration knows, by slot.
#[derive(Debug, Clone)]
pub struct Channels {
    names: Vec<Arc<str>>,
    is_status: Vec<bool>,
    plausible: Vec<RangeInclusive<f64>>,
    by_feed_name: HashMap<Arc<str>, Slot>,
    by_name: HashMap<Arc<str>, Slot>,
}

impl Channels {
    /// All channels of all corridors; a bus that two corridors share has one set.
    pub fn new(config: &Config) -> Self {
        Self::none().extended(config)
    }

    /// No channels: frames have times, and nothing else.
    pub fn none() -> Self {
        Self {
            names: Vec::new(),
            is_status: Vec::new(),
            plausible: Vec::new(),
            by_feed_name: HashMap::new(),
            by_name: HashMap::new(),
        }
    }

    /// The channels of another configuration. Each slot keeps its meaning, so that frames under way stay right; those that
    /// the configuration no longer knows are read no more.
    #[must_use]
    pub fn extended(&self, config: &Config) -> Self {
        let mut channels = Self { by_feed_name: HashMap::new(), ..self.clone() };
        let mut told = vec![false; channels.names.len()];
        for corridor in &config.grid.corridors {
            for point in Point::of(corridor) {
                let name: Arc<str> = point.name(corridor).into();
                let plausible = point.plausible(corridor);
                let known = channels.by_name.get(&name).copied();
                if let Some(slot) = known.filter(|slot| told[*slot]) {
                    let known = &mut channels.plausible[slot];
                    *known = known.start().min(*plausible.start())..=known.end().max(*plausible.end());
                    continue;
                }
                let slot = known.unwrap_or(channels.names.len());
                let feed_name = config.channel_names.get(&*name).map_or_else(|| name.clone(), |n| n.as_str().into());
                channels.by_feed_name.insert(feed_name, slot);
                if known.is_some() {
                    told[slot] = true;
                    channels.plausible[slot] = plausible;
                    continue;
                }
                told.push(true);
                channels.by_name.insert(name.clone(), slot);
                channels.is_status.push(matches!(point, Point::Closed(_) | Point::Inserted(_)));
                channels.plausible.push(plausible);
                channels.names.push(name);
            }
        }
        channels
    }

    /// Number of channels.
    pub fn len(&self) -> usize {
        self.names.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.names.is_empty()
    }

    /// The slot of a channel under the name it has in the feed.
    pub fn in_feed(&self, feed_name: &str) -> Option<Slot> {
        self.by_feed_name.get(feed_name).copied()
    }

    /// The slot of a point.
    ///
    /// # Panics
    /// When the corridor is not of the configuration these channels were made from.
    pub fn slot(&self, corridor: &Corridor, point: Point) -> Slot {
        self.by_name[&*point.name(corridor)]
    }

    /// The default name of a channel.
    pub fn name(&self, slot: Slot) -> &Arc<str> {
        &self.names[slot]
    }

    /// Whether a channel can have this value: finite, and not absurd by [`Point::plausible`].
    pub fn is_plausible(&self, slot: Slot, value: f64) -> bool {
        self.plausible[slot].contains(&value) && (!self.is_status[slot] || [0.0, 1.0].contains(&value))
    }

    /// Whether the channel is a status, which has no age.
    pub fn is_status(&self, slot: Slot) -> bool {
        self.is_status[slot]
    }
}
