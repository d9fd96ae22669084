//! The assessment record: what is known of one corridor at one frame, as every other program gets it.

use std::sync::Arc;

use chrono::{DateTime, SecondsFormat, Utc};
use serde::{Deserialize, Serialize, Serializer};

use crate::{
    margin::{Action, Binding, Intact, OutageRecord, Picture, Reclose},
    source::{SpreadPoint, Step},
};

/// One corridor at one frame. `None` stands where a value does not exist.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Assessment {
    /// The frame's time.
    #[serde(serialize_with = "rfc3339")]
    pub time: DateTime<Utc>,
    /// The corridor's name.
    pub corridor: Arc<str>,
    /// The verdict.
    pub state: State,
    /// The bus whose terminal sends MW into the circuits.
    pub exporter: Option<Arc<str>>,
    /// MW from the exporter's terminal into the circuits.
    pub transfer_mw: Option<f64>,
    /// Exporter minus importer, between the terminal buses.
    pub bus_angle_deg: Option<f64>,
    /// Exporter minus importer, between the settled sources.
    pub internal_angle_deg: Option<f64>,
    /// Exporter minus importer, between the sources of the first swing.
    pub swing_angle_deg: Option<f64>,
    /// What stands behind the terminals: `from`, then `to`.
    #[serde(serialize_with = "by_name")]
    pub sources: [SourceRecord; 2],
    /// How well the frame agrees with itself.
    pub fit: FitRecord,
    /// The corridor as it is.
    pub intact: Option<Intact>,
    /// Every outage judged.
    pub outages: Vec<OutageRecord>,
    /// The smallest limit minus the transfer, MW; negative: MW to take off now.
    pub headroom_mw: Option<f64>,
    /// Its standard deviation from the spread of the sources, MW.
    pub headroom_sd_mw: Option<f64>,
    /// What sets the headroom.
    pub binding: Option<Binding>,
    /// The headroom after each single action at hand.
    pub actions: Vec<Action>,
    /// For each open circuit, whether it may be closed now.
    pub reclose: Vec<Reclose>,
    /// Minutes until the headroom falls to the thin threshold, where it falls significantly.
    pub minutes_to_thin: Option<f64>,
    /// Minutes until it falls to zero, likewise.
    pub minutes_to_spent: Option<f64>,
    /// The thin threshold in force, MW.
    pub thin_mw: f64,
    /// Every circuit and bank as it stands, flows having won over flags: not part of the record.
    #[serde(skip)]
    pub switches: Arc<[Switch]>,
    /// The sudden step that was found at this frame: not part of the record.
    #[serde(skip)]
    pub step: Option<Step>,
    /// What a screen draws besides: not part of the record.
    #[serde(skip)]
    pub detail: Option<Arc<Detail>>,
}

/// Something that can be switched.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Switch {
    /// Name of the circuit or the bank.
    pub name: Arc<str>,
    /// Which of the two.
    pub kind: SwitchKind,
    /// Closed, or inserted.
    pub on: bool,
}

/// What can be switched.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SwitchKind {
    /// A circuit, in service or open.
    Circuit,
    /// A series capacitor bank, inserted or bypassed.
    Bank,
}

/// A corridor's state.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum State {
    /// Headroom above the thin threshold.
    Ample,
    /// Below it.
    Thin,
    /// At or below zero.
    Spent,
    /// Too little is measured to say.
    Blind,
}

impl State {
    /// From the best to the worst.
    pub const ALL: [Self; 4] = [Self::Ample, Self::Thin, Self::Blind, Self::Spent];

    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Ample => "ample",
            Self::Thin => "thin",
            Self::Spent => "spent",
            Self::Blind => "blind",
        }
    }

    /// How bad it is; larger is worse.
    pub fn severity(self) -> u8 {
        match self {
            Self::Ample => 0,
            Self::Thin => 1,
            Self::Blind => 2,
            Self::Spent => 3,
        }
    }
}

/// The Thevenin equivalent behind one terminal.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SourceRecord {
    /// The terminal bus.
    #[serde(skip)]
    pub bus: Arc<str>,
    /// Magnitude of the settled voltage behind the impedance, kV line-to-line.
    pub e_kv: Option<f64>,
    /// Its angle against the `to` bus, degrees.
    pub angle_deg: Option<f64>,
    /// Resistance, ohm.
    pub r_ohm: f64,
    /// Reactance, ohm.
    pub x_ohm: f64,
    /// Standard deviation of the resistance, ohm.
    pub r_sd: f64,
    /// Standard deviation of the reactance, ohm.
    pub x_sd: f64,
    /// Where the impedance comes from.
    pub basis: Basis,
    /// Steps it was learned from.
    pub steps: u64,
}

/// Where a source's impedance comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Basis {
    /// The configuration.
    Configured,
    /// Steps seen on the running system.
    Learned,
}

impl Basis {
    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Configured => "configured",
            Self::Learned => "learned",
        }
    }
}

/// The state fit in brief.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FitRecord {
    /// Sum of squared normalised residuals.
    pub chi2: Option<f64>,
    /// Degrees of freedom.
    pub dof: usize,
    /// The 99 % quantile for these degrees of freedom; `None` without any.
    pub limit: Option<f64>,
    /// Channels set aside, worst first.
    pub suspects: Vec<Arc<str>>,
    /// Channels that bring no usable value: MW, Mvar and kV of what is in service.
    pub missing: Vec<Arc<str>>,
    /// Loads that no channel brings, as assumed: `"Velm: no load given, 0 MW"`.
    pub assumed: Vec<Arc<str>>,
}

/// What a screen shows of the state and the curves.
#[derive(Debug, Clone, PartialEq)]
pub struct Detail {
    /// Fitted voltage of each bus that is in service: name, kV, degrees against `to`.
    pub buses: Vec<BusDetail>,
    /// Each circuit as it stands.
    pub circuits: Vec<CircuitDetail>,
    /// The power-angle curve of the present network, swing sources.
    pub picture: Picture,
    /// The course of learning.
    pub learned: Arc<Learned>,
}

/// How the sources were learned.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Learned {
    /// The recent steps, oldest first.
    pub steps: Vec<Step>,
    /// The spread over the last day, oldest first.
    pub history: Vec<SpreadPoint>,
}

/// A bus as fitted.
#[derive(Debug, Clone, PartialEq)]
pub struct BusDetail {
    /// Its name.
    pub name: Arc<str>,
    /// Fitted voltage, kV.
    pub kv: f64,
    /// Fitted angle against `to`, degrees.
    pub deg: f64,
    /// Load as used, MW.
    pub load_mw: f64,
    /// Load as used, Mvar.
    pub load_mvar: f64,
}

/// A circuit as it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct CircuitDetail {
    /// Its name.
    pub name: Arc<str>,
    /// In service.
    pub closed: bool,
    /// MW into it at its first bus, fitted.
    pub from_mw: f64,
    /// Larger end current against the continuous rating, %.
    pub loading_pct: Option<f64>,
    /// Its banks: name and whether inserted.
    pub banks: Vec<(Arc<str>, bool)>,
}

fn rfc3339<S: Serializer>(time: &DateTime<Utc>, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(&time.to_rfc3339_opts(SecondsFormat::AutoSi, true))
}

fn by_name<S: Serializer>(sources: &[SourceRecord; 2], serializer: S) -> Result<S::Ok, S::Error> {
    serializer.collect_map(sources.iter().map(|source| (&source.bus, source)))
}
