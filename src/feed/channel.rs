use std::{collections::HashMap, sync::Arc};

use crate::{
    config::Config,
    grid::{BankIndex, BusIndex, Corridor},
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

/// An end of a circuit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// At the circuit's first bus.
    From,
    /// At its second.
    To,
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

/// The channels that a configuration knows, by slot.
#[derive(Debug, Clone)]
pub struct Channels {
    names: Vec<Arc<str>>,
    is_status: Vec<bool>,
    by_feed_name: HashMap<Arc<str>, Slot>,
    by_name: HashMap<Arc<str>, Slot>,
}

impl Channels {
    /// All channels of all corridors; a bus that two corridors share has one set.
    pub fn new(config: &Config) -> Self {
        let mut channels =
            Self { names: Vec::new(), is_status: Vec::new(), by_feed_name: HashMap::new(), by_name: HashMap::new() };
        for corridor in &config.grid.corridors {
            for point in Point::of(corridor) {
                let name: Arc<str> = point.name(corridor).into();
                if channels.by_name.contains_key(&name) {
                    continue;
                }
                let slot = channels.names.len();
                let feed_name = config.channel_names.get(&*name).map_or_else(|| name.clone(), |n| n.as_str().into());
                channels.by_feed_name.insert(feed_name, slot);
                channels.by_name.insert(name.clone(), slot);
                channels.is_status.push(matches!(point, Point::Closed(_) | Point::Inserted(_)));
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

    /// Whether the channel is a status, which has no age.
    pub fn is_status(&self, slot: Slot) -> bool {
        self.is_status[slot]
    }
}
