//! What a drill plays: the truth behind each corridor, what happens when, and how it is metered.

use chrono::{DateTime, Utc};

use super::Shape;
use crate::{
    feed::Point,
    grid::{BankIndex, Fault, Load},
};

/// A whole drill. All times are seconds from the start.
#[derive(Debug, Clone, PartialEq)]
pub struct Scenario {
    /// Time of the first frame.
    pub start: DateTime<Utc>,
    /// How long it lasts, s.
    pub duration_s: f64,
    /// From one frame to the next, s.
    pub interval_s: f64,
    /// Of everything random.
    pub seed: u64,
    /// How all channels are metered.
    pub metering: Metering,
    /// The corridors that frames are made of.
    pub corridors: Vec<CorridorTruth>,
}

/// How channels are metered, by what they measure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Metering {
    /// Standard deviation of the noise.
    pub noise: PerKind,
    /// A value is reported anew when it has moved by at least this much.
    pub deadband: PerKind,
    /// Smallest step of a reported value, a decimal fraction.
    pub resolution: PerKind,
    /// Largest age of a value in its frame, s: each channel has its own, between 0 and this.
    pub skew_s: f64,
}

/// One number for each kind of measurement.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PerKind {
    /// Voltages, kV.
    pub kv: f64,
    /// Angles, degrees.
    pub deg: f64,
    /// Active power, MW.
    pub mw: f64,
    /// Reactive power, Mvar.
    pub mvar: f64,
}

impl PerKind {
    /// The same number for all.
    pub const fn all(value: f64) -> Self {
        Self { kv: value, deg: value, mw: value, mvar: value }
    }
}

impl Default for Metering {
    fn default() -> Self {
        Self { noise: PerKind::all(0.0), deadband: PerKind::all(0.0), resolution: PerKind::all(0.001), skew_s: 0.0 }
    }
}

/// The truth behind one corridor.
#[derive(Debug, Clone, PartialEq)]
pub struct CorridorTruth {
    /// Index into the grid's corridors.
    pub corridor: usize,
    /// Whether the angles of all buses are reported.
    pub reports_angles: bool,
    /// Whether both sides' stored energies are reported.
    pub reports_stored_energy: bool,
    /// What the machines are told to deliver.
    pub dispatch: Dispatch,
    /// Wander of what they deliver, MW.
    pub wander: Option<Wander>,
    /// Time in which a swing fades to 1/e, s.
    pub swing_decay_s: f64,
    /// Behind the `from` and the `to` bus.
    pub sides: [SideTruth; 2],
    /// By bus.
    pub loads: Vec<Option<LoadTruth>>,
    /// Steps of both sides at once.
    pub coincident_steps: Option<RandomSteps>,
    /// In order of time.
    pub events: Vec<Event>,
    /// Meters that say something else.
    pub false_meters: Vec<FalseMeter>,
    /// Channels that say nothing.
    pub gaps: Vec<Gap>,
}

/// What the machines are told to deliver: their power is what the undisturbed corridor, complete and with
/// its sources as planned, would need.
#[derive(Debug, Clone, PartialEq)]
pub enum Dispatch {
    /// For this transfer from the `from` terminal into the circuits, MW.
    Transfer(Shape),
    /// For this internal angle, `from` minus `to`, rad.
    Angle(Shape),
}

/// A bounded random walk (Ornstein-Uhlenbeck).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wander {
    /// Standard deviation in the long run.
    pub sd: f64,
    /// Time after which it has forgotten where it was, s.
    pub memory_s: f64,
}

/// One side as it really is.
#[derive(Debug, Clone, PartialEq)]
pub struct SideTruth {
    /// Voltage behind the impedance as planned, kV line-to-line.
    pub e_kv: Shape,
    /// Resistance, ohm.
    pub r_ohm: f64,
    /// Reactance, ohm.
    pub x_ohm: f64,
    /// Stored kinetic energy, MW·s; `None`: an infinite bus.
    pub stored_energy_mws: Option<f64>,
    /// Wander of the voltage, kV.
    pub wander: Option<Wander>,
    /// Steps of the voltage.
    pub steps: Option<RandomSteps>,
}

/// Steps at random times, up or down.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RandomSteps {
    /// How many an hour on average.
    pub per_hour: f64,
    /// Smallest and largest, kV.
    pub kv: [f64; 2],
}

/// A load as it really is.
#[derive(Debug, Clone, PartialEq)]
pub struct LoadTruth {
    /// At nominal voltage; a constant admittance.
    pub nominal: Load,
    /// Factor on it.
    pub shape: Shape,
}

/// Something that happens.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Event {
    /// When, s.
    pub at_s: f64,
    /// What.
    pub action: Action,
}

/// What can happen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Action {
    /// A side's voltage moves for good: a tap, a shunt, a unit.
    Step {
        /// 0: `from`, 1: `to`.
        side: usize,
        /// By how much.
        change: Change,
    },
    /// A side's impedance changes, the voltage behind it stays.
    Impedance {
        /// 0: `from`, 1: `to`.
        side: usize,
        /// New resistance, ohm.
        r_ohm: f64,
        /// New reactance, ohm.
        x_ohm: f64,
    },
    /// A circuit opens.
    Trip(usize),
    /// A circuit closes, unless the corridor's synchronism check refuses it.
    Return(usize),
    /// A fault on a circuit, cleared by opening it.
    Fault {
        /// The circuit.
        circuit: usize,
        /// Kind, place and clearing time.
        fault: Fault,
    },
    /// A series capacitor is bypassed.
    Bypass(BankIndex),
    /// It is inserted again.
    Insert(BankIndex),
}

/// A change of a voltage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Change {
    /// By kV.
    Kv(f64),
    /// By % of what it is.
    Percent(f64),
}

/// From a time up to another, s.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Span {
    /// First instant.
    pub from_s: f64,
    /// First instant after it.
    pub until_s: f64,
}

impl Span {
    /// Whether a time lies in it.
    pub fn holds(&self, time_s: f64) -> bool {
        self.from_s <= time_s && time_s < self.until_s
    }
}

/// A meter that says `offset + scale · truth`: a wrong scale, a wrong sign, or with `scale` 0 a value that stands still.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FalseMeter {
    /// Which.
    pub point: Point,
    /// When.
    pub span: Span,
    /// Factor on the truth.
    pub scale: f64,
    /// Added to it.
    pub offset: f64,
}

/// Channels that are missing for a while.
#[derive(Debug, Clone, PartialEq)]
pub struct Gap {
    /// Which; `None`: all of the corridor.
    pub points: Option<Vec<Point>>,
    /// When.
    pub span: Span,
}
