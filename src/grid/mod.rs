//! What a corridor is: buses, stations, circuits, banks, outages.
//!
//! Values are checked by [`crate::config`] before they get here: names are unique, references hold, impedances are possible.

use std::sync::Arc;

use nalgebra::Complex;

/// Index into [`Corridor::buses`]: [`FROM`], [`TO`], then the stations.
pub type BusIndex = usize;
/// The terminal bus that positive transfer leaves.
pub const FROM: BusIndex = 0;
/// The terminal bus that positive transfer reaches.
pub const TO: BusIndex = 1;

/// All corridors under watch, and the frequency they share.
#[derive(Debug, Clone, PartialEq)]
pub struct Grid {
    /// Nominal frequency, Hz.
    pub frequency_hz: f64,
    /// The corridors, in the order of the configuration.
    pub corridors: Vec<Corridor>,
}

/// Two terminal buses and the circuits between them.
#[derive(Debug, Clone, PartialEq)]
pub struct Corridor {
    /// Unique in the grid.
    pub name: Arc<str>,
    /// [`FROM`], [`TO`], then any stations.
    pub buses: Vec<Bus>,
    /// What stands behind the `from` and the `to` bus.
    pub sides: [Side; 2],
    /// At least one.
    pub circuits: Vec<Circuit>,
    /// Outages to judge besides each circuit and each bank alone.
    pub outages: Vec<CombinedOutage>,
    /// The fault that precedes every circuit outage; `None`: plain trips.
    pub fault: Option<Fault>,
    /// What must be left after every outage.
    pub require: Requirements,
    /// When an open circuit may be closed.
    pub reclose: SynchronismCheck,
    /// Headroom below which the corridor is thin, MW.
    pub thin_mw: f64,
    /// How many of its spreads are taken off the headroom before the corridor's state is judged by it.
    pub state_spreads: f64,
}

/// A terminal bus or a station.
#[derive(Debug, Clone, PartialEq)]
pub struct Bus {
    /// Unique in the corridor; two corridors may share a bus.
    pub name: Arc<str>,
    /// Line-to-line.
    pub nominal_kv: f64,
    /// Post-outage floor; `None`: not judged.
    pub min_kv: Option<f64>,
    /// Load at nominal voltage, used while no channel brings one.
    pub load: Option<Load>,
}

/// A load, shunt compensation included.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Load {
    /// Active power drawn, MW.
    pub mw: f64,
    /// Reactive power drawn, Mvar.
    pub mvar: f64,
}

/// One side of the corridor: the grid behind a terminal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Side {
    /// Stored kinetic energy, MW·s; `None`: an infinite bus.
    pub stored_energy_mws: Option<f64>,
    /// Its configured Thevenin equivalent, without the terminal's load.
    pub source: ConfiguredSource,
}

/// A Thevenin impedance as a study gives it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ConfiguredSource {
    /// Resistance, ohm; at least 0.
    pub r_ohm: f64,
    /// Reactance, ohm; at least 0, where 0 is a stiff bus.
    pub x_ohm: f64,
    /// Standard deviation of the reactance relative to it; 0 pins the source.
    pub spread: f64,
    /// Reactance added for the first swing, ohm.
    pub swing_x_ohm: f64,
}

impl ConfiguredSource {
    /// The source of a short-circuit power: X = U²/S_k (IEC 60909), pinned, nothing added for the swing.
    pub fn from_short_circuit(nominal_kv: f64, short_circuit_mva: f64, x_over_r: f64) -> Self {
        let x_ohm = nominal_kv * nominal_kv / short_circuit_mva;
        Self { r_ohm: x_ohm / x_over_r, x_ohm, spread: 0.0, swing_x_ohm: 0.0 }
    }

    /// Short-circuit power, MVA: S_k = U²/X (IEC 60909); `None`: a stiff bus.
    pub fn short_circuit_mva(&self, nominal_kv: f64) -> Option<f64> {
        (self.x_ohm > 0.0).then(|| nominal_kv * nominal_kv / self.x_ohm)
    }

    /// Standard deviation of the reactance, ohm.
    pub fn x_sd_ohm(&self) -> f64 {
        self.spread * self.x_ohm
    }

    /// Standard deviation of the resistance, ohm: the same spread, of the resistance or of a tenth of the
    /// reactance, whichever is larger (common practice: R is known far worse than X).
    pub fn r_sd_ohm(&self) -> f64 {
        self.spread * self.r_ohm.max(0.1 * self.x_ohm)
    }
}

/// A circuit between two buses of the corridor.
#[derive(Debug, Clone, PartialEq)]
pub struct Circuit {
    /// Unique in the grid.
    pub name: Arc<str>,
    /// Its first and second bus.
    pub between: [BusIndex; 2],
    /// Its series and shunt parameters.
    pub line: Line,
    /// Continuous rating, A; `None`: not judged.
    pub rating_a: Option<f64>,
    /// Short-time rating, A; `None`: not judged.
    pub short_time_rating_a: Option<f64>,
    /// Its series capacitors, in ascending order of place.
    pub banks: Vec<Bank>,
}

/// An end of a circuit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// At the circuit's first bus.
    From,
    /// At its second.
    To,
}

/// How a circuit's parameters are given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Line {
    /// Uniform line: the exact long-line equations.
    PerKm {
        /// Length, km.
        length_km: f64,
        /// Series resistance, ohm/km.
        r_ohm_per_km: f64,
        /// Series reactance, ohm/km.
        x_ohm_per_km: f64,
        /// Shunt susceptance, µS/km.
        b_us_per_km: f64,
    },
    /// Totals: the nominal π, but a uniform line where it is cut.
    Totals {
        /// Series resistance, ohm.
        r_ohm: f64,
        /// Series reactance, ohm.
        x_ohm: f64,
        /// Shunt susceptance, µS.
        b_us: f64,
    },
}

/// Series and shunt parameters of a whole circuit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LineTotals {
    /// Series resistance, ohm.
    pub r_ohm: f64,
    /// Series reactance, ohm, series capacitors not counted.
    pub x_ohm: f64,
    /// Shunt susceptance, µS.
    pub b_us: f64,
}

impl Line {
    /// The parameters times the length, without long-line correction.
    pub fn totals(self) -> LineTotals {
        match self {
            Self::PerKm { length_km, r_ohm_per_km, x_ohm_per_km, b_us_per_km } => LineTotals {
                r_ohm: r_ohm_per_km * length_km,
                x_ohm: x_ohm_per_km * length_km,
                b_us: b_us_per_km * length_km,
            },
            Self::Totals { r_ohm, x_ohm, b_us } => LineTotals { r_ohm, x_ohm, b_us },
        }
    }

    /// Surge impedance of the line without losses, ohm: √(x/b) (Kundur 1994, section 6.1); `None` without susceptance.
    pub fn surge_impedance_ohm(self) -> Option<f64> {
        let LineTotals { x_ohm, b_us, .. } = self.totals();
        (b_us > 0.0).then(|| (x_ohm / (b_us * 1e-6)).sqrt())
    }

    /// Surge impedance loading, MW: U²/√(x/b) (Kundur 1994, section 6.1); `None` without susceptance.
    pub fn surge_impedance_loading_mw(self, nominal_kv: f64) -> Option<f64> {
        self.surge_impedance_ohm().map(|ohm| nominal_kv * nominal_kv / ohm)
    }
}

/// Apparent power of a current, MVA: √3·U·I.
pub fn three_phase_mva(kv: f64, current_a: f64) -> f64 {
    3.0_f64.sqrt() * kv * current_a * 1e-3
}

/// A series capacitor.
#[derive(Debug, Clone, PartialEq)]
pub struct Bank {
    /// Unique in the grid.
    pub name: Arc<str>,
    /// Capacitive reactance, ohm, positive.
    pub x_ohm: f64,
    /// Place as a fraction of the circuit from its first bus, 0 to 1.
    pub at: f64,
}

/// Points at one bank of one circuit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BankIndex {
    /// Index into [`Corridor::circuits`].
    pub circuit: usize,
    /// Index into [`Circuit::banks`].
    pub bank: usize,
}

/// Several circuits and banks lost at once.
#[derive(Debug, Clone, PartialEq)]
pub struct CombinedOutage {
    /// Unique in the corridor, also against circuits and banks.
    pub name: Arc<str>,
    /// Indices of the circuits lost, in the order given.
    pub circuits: Vec<usize>,
    /// The banks bypassed.
    pub banks: Vec<BankIndex>,
}

/// The fault before a circuit outage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fault {
    /// What touches what.
    pub kind: FaultKind,
    /// Fraction of the circuit counted from the exporting end, 0 to 1.
    pub at: f64,
    /// Clearing time, ms.
    pub clear_ms: f64,
}

/// Fault kinds, with the negative- and zero-sequence impedances (ohm) seen at the fault.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FaultKind {
    /// All three phases, bolted.
    ThreePhase,
    /// One phase to earth.
    PhaseEarth {
        /// Negative-sequence impedance, ohm.
        z2: Complex<f64>,
        /// Zero-sequence impedance, ohm.
        z0: Complex<f64>,
    },
    /// Two phases.
    PhasePhase {
        /// Negative-sequence impedance, ohm.
        z2: Complex<f64>,
    },
    /// Two phases to earth.
    PhasePhaseEarth {
        /// Negative-sequence impedance, ohm.
        z2: Complex<f64>,
        /// Zero-sequence impedance, ohm.
        z0: Complex<f64>,
    },
}

/// What must be left after every outage.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Requirements {
    /// Angle margin after an outage, degrees.
    pub angle_margin_deg: f64,
    /// Area margin after an outage, 0 up to 1.
    pub area_margin: f64,
    /// Angle margin of the intact corridor, degrees.
    pub intact_angle_margin_deg: f64,
    /// Whether an outage may part the two sides.
    pub accept_separation: bool,
}

impl Default for Requirements {
    fn default() -> Self {
        Self { angle_margin_deg: 0.0, area_margin: 0.0, intact_angle_margin_deg: 0.0, accept_separation: false }
    }
}

/// Synchronism-check setting of the corridor's circuits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SynchronismCheck {
    /// Largest angle across the open circuit, degrees.
    pub max_angle_deg: f64,
    /// Largest voltage difference across it, % of nominal.
    pub max_voltage_pct: f64,
}

impl Default for SynchronismCheck {
    fn default() -> Self {
        Self { max_angle_deg: 30.0, max_voltage_pct: 10.0 }
    }
}

impl Corridor {
    /// The corridor's banks, circuit by circuit.
    pub fn banks(&self) -> impl Iterator<Item = (BankIndex, &Bank)> {
        banks_of(&self.circuits)
    }
}

/// The banks of circuits, circuit by circuit.
pub fn banks_of(circuits: &[Circuit]) -> impl Iterator<Item = (BankIndex, &Bank)> {
    circuits
        .iter()
        .enumerate()
        .flat_map(|(circuit, c)| c.banks.iter().enumerate().map(move |(bank, b)| (BankIndex { circuit, bank }, b)))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Kundur 1994, table 6.1, typical overhead lines: values from memory of the book, recomputed.
    #[test]
    fn surge_impedance_loading_of_typical_lines() {
        for (kv, r_ohm_per_km, x_ohm_per_km, b_us_per_km, sil_mw) in [
            (345.0, 0.037, 0.367, 4.518, 420.0),
            (500.0, 0.028, 0.325, 5.200, 1000.0),
            (765.0, 0.012, 0.329, 4.978, 2280.0),
        ] {
            let line = Line::PerKm { length_km: 100.0, r_ohm_per_km, x_ohm_per_km, b_us_per_km };
            let computed_mw = line.surge_impedance_loading_mw(kv).expect("it has susceptance");
            assert!((computed_mw / sil_mw - 1.0).abs() < 0.01, "{kv} kV: {computed_mw} MW");
        }
    }

    #[test]
    fn a_line_without_susceptance_has_no_surge_impedance() {
        assert_eq!(Line::Totals { r_ohm: 0.0, x_ohm: 0.4, b_us: 0.0 }.surge_impedance_ohm(), None);
    }

    #[test]
    fn short_circuit_power_and_reactance_are_each_other() {
        let source = ConfiguredSource::from_short_circuit(400.0, 8000.0, 20.0);
        assert_eq!((source.r_ohm, source.x_ohm), (1.0, 20.0));
        assert_eq!(source.short_circuit_mva(400.0), Some(8000.0));
    }

    #[test]
    fn thermal_power() {
        assert!((three_phase_mva(400.0, 1000.0) - 692.82).abs() < 0.01);
    }
}
