//! What a configuration says, as an engineer would read it back.

use std::fmt;

use super::table::Table;
use crate::{
    alarm::{Definition, Suppression},
    config::Config,
    grid::{
        Bus, Circuit, CombinedOutage, Corridor, FROM, Fault, FaultKind, Line, LineTotals, Load, Side, TO,
        three_phase_mva,
    },
};

/// A configuration as it was understood.
pub struct Understood<'a>(pub &'a Config);

impl fmt::Display for Understood<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Config { grid, time_zone, measurement, feed, channel_names, alarms, screen, .. } = self.0;
        let Config { learning, journal, recording, state_file, .. } = self.0;
        writeln!(f, "{} at {} Hz", counted(grid.corridors.len(), "corridor"), grid.frequency_hz)?;
        for (corridor, alarms) in grid.corridors.iter().zip(alarms) {
            write!(f, "\n{}", UnderstoodCorridor(corridor))?;
            write!(f, "\n  alarms\n{}", alarms_table(alarms))?;
        }
        let inputs =
            if feed.inputs.is_empty() { "named on the command line".to_owned() } else { feed.inputs.join(", ") };
        writeln!(f, "\nfor all corridors")?;
        writeln!(f, "    inputs: {inputs}; a value stands for {} s", feed.max_age_s)?;
        writeln!(f, "    channels with another name in the feed: {}", channel_names.len())?;
        writeln!(
            f,
            "    standard deviations: kV {} %, angles {}°, MW and Mvar {} % of thermal MVA",
            measurement.kv_sigma_pct, measurement.angle_sigma_deg, measurement.power_sigma_pct
        )?;
        writeln!(f, "    journal: entries are kept for {} days", journal.keep_days)?;
        if let Some(folder) = &recording.folder {
            let most = [
                recording.keep_days.map(|days| format!("{days} days")),
                recording.keep_gb.map(|gb| format!("{gb} GB")),
            ];
            let most: Vec<_> = most.into_iter().flatten().collect();
            let most =
                if most.is_empty() { "without a limit".to_owned() } else { format!("up to {}", most.join(" and ")) };
            writeln!(f, "    frames are recorded in {}, {most}", folder.display())?;
        }
        let bell: Vec<_> = screen.bell.iter().map(|priority| priority.word()).collect();
        let bell =
            if bell.is_empty() { "no alarm".to_owned() } else { format!("alarms of priority {}", bell.join(", ")) };
        writeln!(
            f,
            "    screen: the bell rings for {bell}; {}",
            if screen.blink { "new alarms blink" } else { "nothing blinks" }
        )?;
        let applied = if screen.apply_changes { "applied at once" } else { "shown first, and applied by a key" };
        writeln!(f, "    a change of this file while watching is {applied}")?;
        if learning.enabled {
            let kept = state_file.as_deref().unwrap_or("a file beside the configuration");
            writeln!(f, "    sources: learned from steps; watch keeps them in {kept}")?;
        } else {
            writeln!(f, "    sources: as configured")?;
        }
        writeln!(f, "    times shown in {}", time_zone.name())
    }
}

struct UnderstoodCorridor<'a>(&'a Corridor);

impl fmt::Display for UnderstoodCorridor<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let corridor = self.0;
        let Corridor { name, buses, require, reclose, thin_mw, state_spreads, fault, .. } = corridor;
        write!(f, "{name}: from {} to {}, thin below {thin_mw} MW", buses[FROM].name, buses[TO].name)?;
        if *state_spreads > 0.0 {
            write!(f, ", judged {state_spreads} spreads below the headroom")?;
        }
        writeln!(f)?;
        write!(f, "\n  buses\n{}", buses_table(corridor))?;
        write!(f, "\n  circuits\n{}", circuits_table(corridor))?;
        if corridor.banks().next().is_some() {
            write!(f, "\n  series capacitors\n{}", banks_table(corridor))?;
        }
        write!(f, "\n  sources, without the load at the terminal\n{}", sources_table(corridor))?;
        write!(f, "\n  outages to judge, {}\n{}", before(fault.as_ref()), outages_table(corridor))?;
        writeln!(f, "\n  required")?;
        let separation = if require.accept_separation { "accepted" } else { "not accepted" };
        writeln!(
            f,
            "    after an outage: angle margin {}°, area margin {}, separation {separation}",
            require.angle_margin_deg, require.area_margin
        )?;
        writeln!(f, "    intact: angle margin {}°", require.intact_angle_margin_deg)?;
        writeln!(f, "    to close a circuit: at most {}° and {} %", reclose.max_angle_deg, reclose.max_voltage_pct)?;
        let notes = notes(corridor);
        if !notes.is_empty() {
            writeln!(f, "\n  to know")?;
            notes.iter().try_for_each(|note| writeln!(f, "    - {note}"))?;
        }
        Ok(())
    }
}

fn alarms_table(alarms: &[Definition]) -> Table<7> {
    let row = |alarm: &Definition| {
        let Definition { name, kind, priority, setpoint, deadband, on_delay, off_delay, suppress_while, .. } = alarm;
        let Suppression { circuits_out, transfer_below_mw } = suppress_while;
        let out = circuits_out.iter().map(|circuit| format!("{circuit} is out"));
        let below = transfer_below_mw.iter().map(|mw| format!("less than {mw} MW"));
        [
            name.to_string(),
            priority.to_string(),
            kind.to_string(),
            figure(*setpoint),
            figure(*deadband),
            format!("{} / {} s", on_delay.as_seconds_f64(), off_delay.as_seconds_f64()),
            out.chain(below).collect::<Vec<_>>().join(" or "),
        ]
    };
    let heading = ["", "priority", "on", "setpoint", "deadband", "delays", "suppressed while"];
    Table::new(heading, alarms.iter().map(row))
}

fn buses_table(corridor: &Corridor) -> Table<4> {
    let row = |bus: &Bus| {
        let load = |Load { mw, mvar }| format!("{mw} MW, {mvar} Mvar");
        let floor = bus.min_kv.map(|kv| kv.to_string());
        let load = bus.load.map(load);
        [bus.name.to_string(), bus.nominal_kv.to_string(), or_dash(floor), or_dash(load)]
    };
    Table::new(["", "nominal kV", "floor kV", "load"], corridor.buses.iter().map(row))
}

fn circuits_table(corridor: &Corridor) -> Table<8> {
    let row = |circuit: &Circuit| {
        let [first, second] = circuit.between.map(|bus| &corridor.buses[bus]);
        let LineTotals { r_ohm, x_ohm, b_us } = circuit.line.totals();
        let length_km = match circuit.line {
            Line::PerKm { length_km, .. } => length_km.to_string(),
            Line::Totals { .. } => String::new(),
        };
        let mva = |rating_a: Option<f64>| or_dash(rating_a.map(|a| figure(three_phase_mva(first.nominal_kv, a))));
        [
            circuit.name.to_string(),
            format!("{} to {}", first.name, second.name),
            length_km,
            impedance(r_ohm, x_ohm),
            figure(b_us),
            or_dash(circuit.line.surge_impedance_loading_mw(first.nominal_kv).map(figure)),
            mva(circuit.rating_a),
            mva(circuit.short_time_rating_a),
        ]
    };
    let heading = ["", "", "km", "R + jX ohm", "B µS", "SIL MW", "thermal MVA", "short-time MVA"];
    Table::new(heading, corridor.circuits.iter().map(row))
}

fn banks_table(corridor: &Corridor) -> Table<5> {
    let rows = corridor.banks().map(|(index, bank)| {
        let circuit = &corridor.circuits[index.circuit];
        [
            bank.name.to_string(),
            circuit.name.to_string(),
            format!("-j{}", figure(bank.x_ohm)),
            format!("{} % from {}", percent(bank.at), corridor.buses[circuit.between[0]].name),
            percent(bank.x_ohm / circuit.line.totals().x_ohm),
        ]
    });
    Table::new(["", "in", "ohm", "at", "% of the circuit's X"], rows)
}

fn sources_table(corridor: &Corridor) -> Table<6> {
    let row = |(bus, side): (&Bus, &Side)| {
        let source = side.source;
        [
            bus.name.to_string(),
            source.short_circuit_mva(bus.nominal_kv).map_or_else(|| "stiff".to_owned(), figure),
            impedance(source.r_ohm, source.x_ohm),
            if source.x_sd_ohm() > 0.0 { format!("± {}", figure(source.x_sd_ohm())) } else { "pinned".to_owned() },
            format!("+ {}", figure(source.swing_x_ohm)),
            side.stored_energy_mws.map_or_else(|| "infinite".to_owned(), figure),
        ]
    };
    let heading = ["", "short-circuit MVA", "R + jX ohm", "spread of X", "X in the swing", "stored energy MW·s"];
    Table::new(heading, corridor.buses.iter().zip(&corridor.sides).map(row))
}

fn outages_table(corridor: &Corridor) -> Table<3> {
    let trip = if corridor.fault.is_some() { "fault, then trip" } else { "trip" };
    let circuits = corridor.circuits.iter().map(|circuit| [circuit.name.to_string(), String::new(), trip.to_owned()]);
    let banks = corridor.banks().map(|(_, bank)| [bank.name.to_string(), String::new(), "bypass".to_owned()]);
    let combined = corridor.outages.iter().map(|outage| {
        let what = match (outage.circuits.len(), corridor.fault) {
            (0, _) => "bypass",
            (1, _) | (_, None) => trip,
            (_, Some(_)) => "fault on the first in service, then trip",
        };
        [outage.name.to_string(), lost(corridor, outage), what.to_owned()]
    });
    Table::new(["", "lost", "how"], circuits.chain(banks).chain(combined))
}

fn lost(corridor: &Corridor, outage: &CombinedOutage) -> String {
    let circuits = outage.circuits.iter().map(|circuit| &*corridor.circuits[*circuit].name);
    let banks = outage.banks.iter().map(|index| &*corridor.circuits[index.circuit].banks[index.bank].name);
    circuits.chain(banks).collect::<Vec<_>>().join(", ")
}

fn before(fault: Option<&Fault>) -> String {
    let Some(Fault { kind, at, clear_ms }) = fault else { return "without a fault".to_owned() };
    let kind = match kind {
        FaultKind::ThreePhase => "three-phase",
        FaultKind::PhaseEarth { .. } => "phase-earth",
        FaultKind::PhasePhase { .. } => "phase-phase",
        FaultKind::PhasePhaseEarth { .. } => "phase-phase-earth",
    };
    format!("{kind} fault at {} % from the exporting end, cleared in {clear_ms} ms", percent(*at))
}

/// What is no error, but an engineer would want to know.
fn notes(corridor: &Corridor) -> Vec<String> {
    let names = |names: Vec<&str>| (!names.is_empty()).then(|| names.join(", "));
    let terminals = corridor.buses[..=TO].iter().filter(|bus| bus.load.is_none());
    let unloaded = names(terminals.map(|bus| &*bus.name).collect());
    let unrated = names(corridor.circuits.iter().filter(|c| c.rating_a.is_none()).map(|c| &*c.name).collect());
    let without_floor = names(corridor.buses.iter().filter(|bus| bus.min_kv.is_none()).map(|bus| &*bus.name).collect());
    let is_infinite = corridor.sides.iter().all(|side| side.stored_energy_mws.is_none());
    let infinite = "no stored energy on either side: both count as infinite and equal";
    [
        unloaded.map(|buses| {
            format!("no load at {buses}: 0 MW unless a channel brings one, and area margins depend on it")
        }),
        unrated.map(|circuits| format!("no rating of {circuits}: loading is not judged there")),
        without_floor.map(|buses| format!("no floor at {buses}: voltage is not judged there")),
        is_infinite.then(|| infinite.to_owned()),
    ]
    .into_iter()
    .flatten()
    .collect()
}

fn counted(count: usize, what: &str) -> String {
    format!("{count} {what}{}", if count == 1 { "" } else { "s" })
}

fn or_dash(text: Option<String>) -> String {
    text.unwrap_or_else(|| "-".to_owned())
}

fn impedance(r_ohm: f64, x_ohm: f64) -> String {
    format!("{} + j{}", figure(r_ohm), figure(x_ohm))
}

/// To a tenth.
fn percent(fraction: f64) -> String {
    ((1000.0 * fraction).round() / 10.0).to_string()
}

/// To four significant digits, without an exponent.
fn figure(number: f64) -> String {
    let (mut decimals, mut scaled) = (0, number.abs());
    while scaled < 1000.0 && decimals < 9 {
        (decimals, scaled) = (decimals + 1, 10.0 * scaled);
    }
    if number == 0.0 { "0".to_owned() } else { format!("{number:.decimals$}") }
}
