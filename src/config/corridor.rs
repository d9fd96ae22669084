//! One `[[corridor]]` of the configuration.

use nalgebra::Complex;

use super::{
    check::{self, GridNames},
    findings::Findings,
    given::Placed,
    limits::{ANY, FRACTION, Limits, NOT_NEGATIVE, POSITIVE},
    names::Names,
    section::Section,
    wording::quoted,
};
use crate::grid::{
    self, Bank, Bus, Circuit, CombinedOutage, ConfiguredSource, Corridor, FROM, Fault, FaultKind, Line, Load,
    Requirements, Side, SynchronismCheck, TO,
};

// More would not be a corridor, and the work grows with their third power.
const MOST_STATIONS: usize = 60;
const MOST_CIRCUITS: usize = 200;
const MOST_BANKS: usize = 20;
const MOST_OUTAGES: usize = 1000;

/// Headroom below which a corridor is thin when it does not say, MW.
const DEFAULT_THIN_MW: f64 = 100.0;
/// Spread of a source whose study does not say.
const DEFAULT_SPREAD: f64 = 0.3;
/// X/R of a transmission grid seen from a strong bus (common practice).
const DEFAULT_X_OVER_R: f64 = 15.0;
const FAULT_KINDS: [&str; 4] = ["three-phase", "phase-earth", "phase-phase", "phase-phase-earth"];
/// Longest fault-on time that is followed, ms.
const LONGEST_CLEARING_MS: f64 = 2000.0;

const PER_KM: [(&str, Limits); 4] = [
    ("length_km", POSITIVE),
    ("r_ohm_per_km", NOT_NEGATIVE),
    ("x_ohm_per_km", POSITIVE),
    ("b_us_per_km", NOT_NEGATIVE),
];
const TOTALS: [(&str, Limits); 3] = [("r_ohm", NOT_NEGATIVE), ("x_ohm", POSITIVE), ("b_us", NOT_NEGATIVE)];

/// Reads a corridor, checking it in itself and against the names of the others.
pub(super) fn read<'a>(mut section: Section<'a>, names: &mut GridNames<'a>) -> Corridor {
    let name = section.required_text("name", "name the corridor");
    names.corridors.claim(&name, "corridor", &section.place("name"));
    let thin_mw = section.number("thin_mw", NOT_NEGATIVE).unwrap_or(DEFAULT_THIN_MW);
    let state_spreads = section.number("state_spreads", NOT_NEGATIVE.up_to(10.0)).unwrap_or(0.0);

    let mut buses = Buses { list: Vec::new(), names: Names::new(section.findings()), distinct: true };
    let from = section.required_section("from", "describe the terminal that positive transfer leaves");
    let to = section.required_section("to", "describe the terminal that positive transfer reaches");
    let sides = [from, to].map(|terminal| side(terminal, &mut buses, names));
    for mut station in section.sections("station", MOST_STATIONS) {
        buses.read(&mut station, names);
    }

    let circuits = section.required_sections("circuit", MOST_CIRCUITS);
    let placed: Vec<_> = circuits.into_iter().map(|section| circuit(section, &buses, names)).collect();
    let joined = placed.iter().all(|(_, joined)| *joined);
    let circuits: Vec<Circuit> = placed.into_iter().map(|(circuit, _)| circuit).collect();
    if buses.distinct && joined && !circuits.is_empty() {
        check::reachable(&section, &buses.list, &circuits);
    }

    let outage_sections = section.sections("outage", MOST_OUTAGES);
    let outages = outages(outage_sections, &circuits, section.findings());
    let fault = fault(section.section("fault"));
    if fault.is_some() && sides.iter().all(|side| side.stored_energy_mws.is_none()) {
        let advice = "give stored_energy_mws of a terminal, or leave the fault out to judge plain trips";
        section.wrong("fault", format!("needs the stored energy of at least one side; {advice}"));
    }
    Corridor {
        name: name.into(),
        buses: buses.list,
        sides,
        circuits,
        outages,
        fault,
        require: requirements(section.section("require")),
        reclose: synchronism_check(section.section("reclose")),
        thin_mw,
        state_spreads,
    }
}

/// The buses of a corridor as they are read.
struct Buses<'a> {
    list: Vec<Bus>,
    names: Names<'a>,
    distinct: bool,
}

impl<'a> Buses<'a> {
    /// Reads what a terminal and a station have in common.
    fn read(&mut self, section: &mut Section<'a>, names: &mut GridNames<'a>) -> &Bus {
        let name = section.required_text("bus", "name the bus");
        let place = section.place("bus");
        self.distinct &= !name.is_empty() && self.names.claim(&name, "bus", &place);
        let nominal_kv = section.required_number("nominal_kv", POSITIVE);
        names.bus(&name, nominal_kv, section);
        let min_kv = section.number("min_kv", POSITIVE);
        if min_kv.is_some_and(|min_kv| min_kv > nominal_kv) {
            section.wrong("min_kv", format!("is above nominal_kv ({nominal_kv}); a floor lies below it"));
        }
        let load = load(section.section("load"));
        self.list.push(Bus { name: name.into(), nominal_kv, min_kv, load });
        &self.list[self.list.len() - 1]
    }

    /// The bus of that name; `None`, and reported, where there is none.
    fn find(&self, wanted: &Placed, section: &Section<'_>) -> Option<usize> {
        let found = self.list.iter().position(|bus| *bus.name == *wanted.text);
        if found.is_none() && self.distinct && !wanted.text.is_empty() {
            let advice = section.findings().advice(&wanted.text, self.list.iter().map(|bus| &*bus.name));
            section
                .findings()
                .report(&wanted.place, format!("no bus {} in this corridor; {advice}", quoted(&wanted.text)));
        }
        found
    }
}

fn load(mut section: Section<'_>) -> Option<Load> {
    section
        .is_present()
        .then(|| Load { mw: section.required_number("mw", ANY), mvar: section.number("mvar", ANY).unwrap_or(0.0) })
}

fn side<'a>(mut section: Section<'a>, buses: &mut Buses<'a>, names: &mut GridNames<'a>) -> Side {
    let nominal_kv = buses.read(&mut section, names).nominal_kv;
    let stored_energy_mws = section.number("stored_energy_mws", POSITIVE);
    let advice = "give { r_ohm, x_ohm } or { short_circuit_mva } of the grid behind the terminal";
    Side { stored_energy_mws, source: source(section.required_section("source", advice), nominal_kv) }
}

fn source(mut section: Section<'_>, nominal_kv: f64) -> ConfiguredSource {
    let r_ohm = section.number("r_ohm", NOT_NEGATIVE);
    let x_ohm = section.number("x_ohm", NOT_NEGATIVE);
    let short_circuit_mva = section.number("short_circuit_mva", POSITIVE);
    let x_over_r = section.number("x_over_r", POSITIVE);
    let spread = section.number("spread", NOT_NEGATIVE).unwrap_or(DEFAULT_SPREAD);
    let swing_x_ohm = section.number("swing_x_ohm", NOT_NEGATIVE).unwrap_or(0.0);
    let in_ohm = r_ohm.or(x_ohm).is_some();
    let in_mva = short_circuit_mva.or(x_over_r).is_some();
    if in_ohm && in_mva {
        let key = if short_circuit_mva.is_some() { "short_circuit_mva" } else { "x_over_r" };
        section.wrong(key, "the source is given twice over; keep r_ohm and x_ohm, or short_circuit_mva and x_over_r");
    } else if in_mva {
        section.needed("short_circuit_mva", short_circuit_mva, "give the short-circuit power, or r_ohm and x_ohm");
    } else {
        section.needed("x_ohm", x_ohm, "give r_ohm and x_ohm, or short_circuit_mva");
    }
    match short_circuit_mva {
        Some(mva) => {
            let x_over_r = x_over_r.unwrap_or(DEFAULT_X_OVER_R);
            ConfiguredSource { spread, swing_x_ohm, ..ConfiguredSource::from_short_circuit(nominal_kv, mva, x_over_r) }
        }
        None => ConfiguredSource { r_ohm: r_ohm.unwrap_or(0.0), x_ohm: x_ohm.unwrap_or(f64::NAN), spread, swing_x_ohm },
    }
}

/// The circuit, and whether it joins two buses of the corridor.
fn circuit<'a>(mut section: Section<'a>, buses: &Buses<'a>, names: &mut GridNames<'a>) -> (Circuit, bool) {
    let name = section.required_text("name", "name the circuit");
    names.elements.claim(&name, "circuit", &section.place("name"));
    let between = between(&mut section, buses);
    let line = line(&mut section);
    let rating_a = section.number("rating_a", POSITIVE);
    let short_time_rating_a = section.number("short_time_rating_a", POSITIVE).or(rating_a);
    if let (Some(rating_a), Some(short_time_rating_a)) = (rating_a, short_time_rating_a)
        && short_time_rating_a < rating_a
    {
        section.wrong(
            "short_time_rating_a",
            format!("is below rating_a ({rating_a}); a circuit carries more for a short time"),
        );
    }
    let banks = banks(&mut section, line, names);
    let joined = between.is_some();
    let between = between.unwrap_or([FROM, TO]);
    (Circuit { name: name.into(), between, line, rating_a, short_time_rating_a, banks }, joined)
}

fn between(section: &mut Section<'_>, buses: &Buses<'_>) -> Option<[usize; 2]> {
    let Some(named) = section.texts("between") else { return Some([FROM, TO]) };
    let [first, second] = &named[..] else {
        if named.iter().all(|placed| !placed.text.is_empty()) {
            section.wrong("between", "must name two buses of the corridor");
        }
        return None;
    };
    let (first, second) = (buses.find(first, section), buses.find(second, section));
    let between = [first?, second?];
    if between[0] == between[1] {
        section.wrong("between", "joins a bus to itself; name two different buses");
        return None;
    }
    check::same_level(section, between.map(|bus| &buses.list[bus]));
    Some(between)
}

fn line(section: &mut Section<'_>) -> Line {
    let per_km = PER_KM.map(|(key, limits)| (key, section.number(key, limits)));
    let totals = TOTALS.map(|(key, limits)| (key, section.number(key, limits)));
    let first_total = totals.iter().find(|(_, value)| value.is_some());
    let is_per_km = per_km.iter().any(|(_, value)| value.is_some());
    let needed = |(key, value)| section.needed(key, value, "a circuit needs it");
    let line = match first_total {
        None if is_per_km => {
            let [length_km, r_ohm_per_km, x_ohm_per_km, b_us_per_km] = per_km.map(needed);
            Line::PerKm { length_km, r_ohm_per_km, x_ohm_per_km, b_us_per_km }
        }
        Some(_) if !is_per_km => {
            let [r_ohm, x_ohm, b_us] = totals.map(needed);
            Line::Totals { r_ohm, x_ohm, b_us }
        }
        both_or_neither => {
            let advice = "give length_km, r_ohm_per_km, x_ohm_per_km and b_us_per_km, or r_ohm, x_ohm and b_us";
            match both_or_neither {
                Some((total, _)) => section.wrong(total, format!("the circuit is given twice over; {advice}")),
                None => section.missed("x_ohm_per_km", advice),
            }
            Line::Totals { r_ohm: f64::NAN, x_ohm: f64::NAN, b_us: f64::NAN }
        }
    };
    check::electrical_length(section, line);
    line
}

fn banks<'a>(circuit: &mut Section<'a>, line: Line, names: &mut GridNames<'a>) -> Vec<Bank> {
    let read = |mut section: Section<'a>| {
        let name = section.required_text("name", "name the bank");
        names.elements.claim(&name, "series capacitor", &section.place("name"));
        let x_ohm = section.required_number("x_ohm", POSITIVE);
        Bank { name: name.into(), x_ohm, at: section.required_number("at", FRACTION) }
    };
    let mut banks: Vec<_> = circuit.sections("series_capacitors", MOST_BANKS).into_iter().map(read).collect();
    banks.sort_by(|a, b| a.at.total_cmp(&b.at));
    let (bank_ohm, line_ohm) = (banks.iter().map(|bank| bank.x_ohm).sum::<f64>(), line.totals().x_ohm);
    if bank_ohm >= line_ohm {
        let advice = "lower x_ohm so that the circuit stays inductive";
        circuit.wrong(
            "series_capacitors",
            format!("{bank_ohm} ohm in all against {line_ohm} ohm of the circuit; {advice}"),
        );
    }
    banks
}

fn outages<'a>(sections: Vec<Section<'a>>, circuits: &[Circuit], findings: &'a Findings) -> Vec<CombinedOutage> {
    let named_circuits: Vec<_> = circuits.iter().enumerate().map(|(index, circuit)| (&*circuit.name, index)).collect();
    let named_banks: Vec<_> = grid::banks_of(circuits).map(|(index, bank)| (&*bank.name, index)).collect();
    let mut names = Names::new(findings);
    let read = |mut section: Section<'a>| {
        let name = section.required_text("name", "name the outage");
        names.claim(&name, "outage", &section.place("name"));
        let mut singles = named_circuits.iter().map(|(name, _)| name).chain(named_banks.iter().map(|(name, _)| name));
        if !name.is_empty() && singles.any(|single| **single == *name) {
            let advice = "that is judged alone anyway; choose another name";
            section.wrong("name", format!("{} names a circuit or bank, and {advice}", quoted(&name)));
        }
        let circuits = section.texts("circuits").unwrap_or_default();
        let banks = section.texts("banks").unwrap_or_default();
        if circuits.is_empty() && banks.is_empty() && section.is_present() {
            section.wrong("circuits", "nothing is lost; name circuits or banks");
        }
        CombinedOutage {
            name: name.into(),
            circuits: lost("circuit", &circuits, &named_circuits, findings),
            banks: lost("series capacitor", &banks, &named_banks, findings),
        }
    };
    sections.into_iter().map(read).collect()
}

/// What the names stand for, each once.
fn lost<I: Copy + PartialEq>(what: &str, wanted: &[Placed], named: &[(&str, I)], findings: &Findings) -> Vec<I> {
    let mut lost = Vec::new();
    for Placed { text, place } in wanted.iter().filter(|placed| !placed.text.is_empty()) {
        match named.iter().find(|(name, _)| name == text) {
            None => {
                let advice = findings.advice(text, named.iter().map(|(name, _)| *name));
                findings.report(place, format!("no {what} {} in this corridor; {advice}", quoted(text)));
            }
            Some((_, index)) if lost.contains(index) => {
                findings.report(place, format!("{} is listed twice; keep one", quoted(text)));
            }
            Some((_, index)) => lost.push(*index),
        }
    }
    lost
}

fn fault(mut section: Section<'_>) -> Option<Fault> {
    if !section.is_present() {
        return None;
    }
    let kind = section.required_text("kind", "say what touches what, such as three-phase");
    let z2 = impedance(&mut section, "z2_ohm", FAULT_KINDS[1..].contains(&&*kind));
    let z0 = impedance(&mut section, "z0_ohm", kind.ends_with("-earth"));
    let kind = match &*kind {
        "three-phase" => FaultKind::ThreePhase,
        "phase-earth" => FaultKind::PhaseEarth { z2, z0 },
        "phase-phase" => FaultKind::PhasePhase { z2 },
        "phase-phase-earth" => FaultKind::PhasePhaseEarth { z2, z0 },
        other => {
            if !other.is_empty() {
                let advice = section.findings().advice(other, FAULT_KINDS);
                section.wrong("kind", format!("no fault is called {}; {advice}", quoted(other)));
            }
            FaultKind::ThreePhase
        }
    };
    let at = section.required_number("at", FRACTION);
    Some(Fault { kind, at, clear_ms: section.required_number("clear_ms", POSITIVE.up_to(LONGEST_CLEARING_MS)) })
}

fn impedance(section: &mut Section<'_>, key: &'static str, is_needed: bool) -> Complex<f64> {
    let given = section.numbers(key, [NOT_NEGATIVE, POSITIVE]);
    if is_needed && given.is_none() {
        section.missed(key, "this kind of fault needs it, as [r, x]");
    }
    let [r, x] = given.unwrap_or([f64::NAN; 2]);
    Complex::new(r, x)
}

fn requirements(mut section: Section<'_>) -> Requirements {
    let default = Requirements::default();
    let angle = NOT_NEGATIVE.below(90.0);
    Requirements {
        angle_margin_deg: section.number("angle_margin_deg", angle).unwrap_or(default.angle_margin_deg),
        area_margin: section.number("area_margin", NOT_NEGATIVE.below(1.0)).unwrap_or(default.area_margin),
        intact_angle_margin_deg: section
            .number("intact_angle_margin_deg", angle)
            .unwrap_or(default.intact_angle_margin_deg),
        accept_separation: section.flag("accept_separation").unwrap_or(default.accept_separation),
    }
}

fn synchronism_check(mut section: Section<'_>) -> SynchronismCheck {
    let default = SynchronismCheck::default();
    SynchronismCheck {
        max_angle_deg: section.number("max_angle_deg", POSITIVE.up_to(90.0)).unwrap_or(default.max_angle_deg),
        max_voltage_pct: section.number("max_voltage_pct", POSITIVE.up_to(100.0)).unwrap_or(default.max_voltage_pct),
    }
}
