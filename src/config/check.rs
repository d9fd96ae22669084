//! What no single value shows: names against each other, and values that are impossible together.

use std::{collections::HashMap, f64::consts::PI};

use super::{
    findings::{Findings, Place},
    names::Names,
    section::Section,
    wording::quoted,
};
use crate::grid::{Bus, Circuit, FROM, Line, LineTotals, TO};

/// Nominal voltages that a circuit may join without a transformer, as a ratio: 330 and 345 kV, 380 and 420 kV.
const SAME_LEVEL: f64 = 1.2;

/// Names of the whole grid: channels carry nothing but these.
pub(super) struct GridNames<'a> {
    pub corridors: Names<'a>,
    /// Circuits and series capacitors.
    pub elements: Names<'a>,
    /// Nominal kV of each bus, and where it is first named.
    buses: HashMap<String, (f64, Place)>,
}

impl<'a> GridNames<'a> {
    pub fn new(findings: &'a Findings) -> Self {
        Self { corridors: Names::new(findings), elements: Names::new(findings), buses: HashMap::new() }
    }

    /// Notes a bus, which corridors may share where they agree on its voltage.
    pub fn bus(&mut self, name: &str, nominal_kv: f64, section: &Section<'_>) {
        let (first_kv, first) = self.buses.entry(name.to_owned()).or_insert((nominal_kv, section.place("bus")));
        if (*first_kv - nominal_kv).abs() > 0.0 && !name.is_empty() {
            let what = format!("bus {} is at {first_kv} kV in line {}", quoted(name), first.line);
            section.wrong("nominal_kv", format!("{what}; a bus that two corridors share has one voltage"));
        }
    }

    /// Where a bus is first named.
    pub fn bus_place(&self, name: &str) -> Option<&Place> {
        self.buses.get(name).map(|(_, place)| place)
    }
}

/// Every bus is reached from the first terminal.
pub(super) fn reachable(corridor: &Section<'_>, buses: &[Bus], circuits: &[Circuit]) {
    let mut reached = vec![false; buses.len()];
    reached[FROM] = true;
    // A path visits each bus once, so so many rounds reach everything.
    for _ in buses {
        for [a, b] in circuits.iter().map(|circuit| circuit.between) {
            let either = reached[a] || reached[b];
            (reached[a], reached[b]) = (either, either);
        }
    }
    let name = |bus: usize| quoted(&buses[bus].name);
    if !reached[TO] {
        corridor.wrong("circuit", format!("no path of circuits joins the terminals {} and {}", name(FROM), name(TO)));
    }
    for station in (TO + 1..buses.len()).filter(|station| !reached[*station]) {
        let advice = "join it with a circuit, or take it out";
        corridor.wrong("station", format!("no path of circuits joins {} to {}; {advice}", name(station), name(FROM)));
    }
}

/// A circuit has no transformer in it.
pub(super) fn same_level(circuit: &Section<'_>, [a, b]: [&Bus; 2]) {
    if a.nominal_kv.max(b.nominal_kv) > SAME_LEVEL * a.nominal_kv.min(b.nominal_kv) {
        let levels = format!("a bus of {} kV and one of {} kV", a.nominal_kv, b.nominal_kv);
        circuit.wrong("between", format!("joins {levels}; a circuit stays on one voltage level"));
    }
}

/// A line shorter than half a wave, |γl| < π: beyond it no transfer has a meaning, and a wrong unit is the likely reason.
pub(super) fn electrical_length(circuit: &Section<'_>, line: Line) {
    let LineTotals { r_ohm, x_ohm, b_us } = line.totals();
    if r_ohm.hypot(x_ohm) * b_us * 1e-6 >= PI * PI {
        let key = match line {
            Line::PerKm { .. } => "length_km",
            Line::Totals { .. } => "b_us",
        };
        circuit.wrong(key, "the circuit would be longer than half a wave; check the units of its impedance, µS and km");
    }
}
