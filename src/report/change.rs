//! What differs between two configurations, in words.

use std::{
    collections::{BTreeMap, BTreeSet},
    fmt::Display,
};

use nalgebra::Complex;

use crate::{
    alarm::Definition,
    config::Config,
    grid::{BankIndex, Circuit, Corridor, FROM, Fault, FaultKind, Line, TO},
};

/// Things of a configuration, and what is said of each.
type Facts = BTreeMap<String, BTreeMap<&'static str, String>>;

/// Says what another configuration changes: a line each, none where they say the same.
pub fn lines(before: &Config, after: &Config) -> Vec<String> {
    let (was, is) = (facts(before), facts(after));
    let mut lines = Vec::new();
    for thing in was.keys().chain(is.keys()).collect::<BTreeSet<_>>() {
        match (was.get(thing), is.get(thing)) {
            (Some(was), Some(is)) => lines.extend(differences(thing, was, is)),
            (Some(_), None) => lines.push(format!("{thing}: gone")),
            _ => lines.push(format!("{thing}: new")),
        }
    }
    lines
}

fn differences<'a>(
    thing: &'a str,
    was: &'a BTreeMap<&'static str, String>,
    is: &'a BTreeMap<&'static str, String>,
) -> impl Iterator<Item = String> + 'a {
    let changed = is.iter().filter(|(what, value)| was.get(*what) != Some(value));
    changed.map(move |(what, value)| format!("{thing}: {what} {} → {value}", was.get(what).map_or("–", |was| was)))
}

fn facts(config: &Config) -> Facts {
    let mut facts = Facts::new();
    let mut say = |thing: String, what: &'static str, value: String| {
        facts.entry(thing).or_default().insert(what, value);
    };
    for (corridor, alarms) in config.grid.corridors.iter().zip(&config.alarms) {
        of_corridor(corridor, &mut say);
        for circuit in &corridor.circuits {
            of_circuit(corridor, circuit, &mut say);
        }
        for alarm in alarms {
            of_alarm(&corridor.name, alarm, &mut say);
        }
    }
    of_settings(config, &mut say);
    facts
}

fn or_none(value: Option<impl Display>) -> String {
    value.map_or("none".into(), |value| value.to_string())
}

fn of_corridor(corridor: &Corridor, say: &mut impl FnMut(String, &'static str, String)) {
    let Corridor { name, buses, sides, outages, fault, require, reclose, thin_mw, state_spreads, .. } = corridor;
    let mut here = |what, value| say(format!("{name}"), what, value);
    here("terminals", format!("{} and {}", buses[FROM].name, buses[TO].name));
    here("thin threshold, MW", thin_mw.to_string());
    here("state judged below the headroom by, spreads", state_spreads.to_string());
    here("required angle margin, °", require.angle_margin_deg.to_string());
    here("required area margin", require.area_margin.to_string());
    here("required intact angle margin, °", require.intact_angle_margin_deg.to_string());
    here("separation accepted", require.accept_separation.to_string());
    here("closing angle, °", reclose.max_angle_deg.to_string());
    here("closing voltage difference, %", reclose.max_voltage_pct.to_string());
    here("fault", fault.as_ref().map_or("none".into(), kind_of));
    here("fault at", or_none(fault.as_ref().map(|fault| fault.at)));
    here("clearing time, ms", or_none(fault.as_ref().map(|fault| fault.clear_ms)));
    for (index, bus) in buses.iter().enumerate() {
        let thing = format!("{name}, bus {}", bus.name);
        say(thing.clone(), "nominal, kV", bus.nominal_kv.to_string());
        say(thing.clone(), "floor, kV", or_none(bus.min_kv));
        say(thing.clone(), "load, MW", or_none(bus.load.map(|load| load.mw)));
        say(thing.clone(), "load, Mvar", or_none(bus.load.map(|load| load.mvar)));
        if let Some(side) = sides.get(index) {
            say(thing.clone(), "source R, ohm", side.source.r_ohm.to_string());
            say(thing.clone(), "source X, ohm", side.source.x_ohm.to_string());
            say(thing.clone(), "spread of the source", side.source.spread.to_string());
            say(thing.clone(), "X added in the swing, ohm", side.source.swing_x_ohm.to_string());
            say(thing, "stored energy, MW·s", or_none(side.stored_energy_mws));
        }
    }
    for outage in outages {
        let circuits = outage.circuits.iter().map(|index| &*corridor.circuits[*index].name);
        let bank = |index: &BankIndex| &*corridor.circuits[index.circuit].banks[index.bank].name;
        let elements: Vec<_> = circuits.chain(outage.banks.iter().map(bank)).collect();
        say(format!("{name}, outage {}", outage.name), "elements", elements.join(", "));
    }
}

fn kind_of(fault: &Fault) -> String {
    let impedances = |z_ohm: &[Complex<f64>]| {
        z_ohm.iter().map(|z| format!("{} + j{} ohm", z.re, z.im)).collect::<Vec<_>>().join(", ")
    };
    match fault.kind {
        FaultKind::ThreePhase => "three-phase".into(),
        FaultKind::PhaseEarth { z2, z0 } => format!("phase-earth, {}", impedances(&[z2, z0])),
        FaultKind::PhasePhase { z2 } => format!("phase-phase, {}", impedances(&[z2])),
        FaultKind::PhasePhaseEarth { z2, z0 } => format!("phase-phase-earth, {}", impedances(&[z2, z0])),
    }
}

fn of_circuit(corridor: &Corridor, circuit: &Circuit, say: &mut impl FnMut(String, &'static str, String)) {
    let thing = format!("{}, circuit {}", corridor.name, circuit.name);
    let mut here = |what, value| say(thing.clone(), what, value);
    let [one, other] = circuit.between.map(|bus| &corridor.buses[bus].name);
    here("between", format!("{one} and {other}"));
    here(
        "length, km",
        match circuit.line {
            Line::PerKm { length_km, .. } => length_km.to_string(),
            Line::Totals { .. } => "none".into(),
        },
    );
    let totals = circuit.line.totals();
    here("R, ohm", totals.r_ohm.to_string());
    here("X, ohm", totals.x_ohm.to_string());
    here("B, µS", totals.b_us.to_string());
    here("rating, A", or_none(circuit.rating_a));
    here("short-time rating, A", or_none(circuit.short_time_rating_a));
    for bank in &circuit.banks {
        let thing = format!("{}, series capacitor {}", corridor.name, bank.name);
        say(thing.clone(), "X, ohm", bank.x_ohm.to_string());
        say(thing, "at", format!("{} of {}", bank.at, circuit.name));
    }
}

fn of_alarm(corridor: &str, alarm: &Definition, say: &mut impl FnMut(String, &'static str, String)) {
    let Definition { name, kind, priority, setpoint, deadband, on_delay, off_delay, message, action, suppress_while } =
        alarm;
    let mut here = |what, value| say(format!("{corridor}, alarm {name}"), what, value);
    here("on", kind.to_string());
    here("priority", priority.to_string());
    here("setpoint", format!("{setpoint} {}", kind.unit()).trim_end().into());
    here("deadband", format!("{deadband} {}", kind.unit()).trim_end().into());
    here("on-delay, s", on_delay.as_seconds_f64().to_string());
    here("off-delay, s", off_delay.as_seconds_f64().to_string());
    here("message", message.to_string());
    here("action", action.to_string());
    here("suppressed while out", suppress_while.circuits_out.join(", "));
    here("suppressed below, MW", or_none(suppress_while.transfer_below_mw));
}

fn of_settings(config: &Config, say: &mut impl FnMut(String, &'static str, String)) {
    let Config {
        grid,
        time_zone,
        measurement,
        feed,
        channel_names,
        learning,
        journal,
        recording,
        screen,
        state_file,
        ..
    } = config;
    say("grid".into(), "frequency, Hz", grid.frequency_hz.to_string());
    say("grid".into(), "time zone", time_zone.name().into());
    say("measurement".into(), "kV σ, %", measurement.kv_sigma_pct.to_string());
    say("measurement".into(), "angle σ, °", measurement.angle_sigma_deg.to_string());
    say("measurement".into(), "power σ, %", measurement.power_sigma_pct.to_string());
    say("feed".into(), "inputs (at the next start)", feed.inputs.join(", "));
    say("feed".into(), "a value stands for, s", feed.max_age_s.to_string());
    say("feed".into(), "a frame is ahead of the clock at most, s (at the next start)", feed.max_ahead_s.to_string());
    say("feed".into(), "inputs wait for each other for, s (at the next start)", feed.hold_s.to_string());
    for (channel, name) in channel_names {
        say(format!("channel {channel}"), "name in the feed", name.clone());
    }
    say("learning".into(), "on", learning.enabled.to_string());
    say("learning".into(), "window, s", learning.window_s.to_string());
    say("learning".into(), "gap, s", learning.gap_s.to_string());
    say("learning".into(), "threshold", learning.step_threshold.to_string());
    say("learning".into(), "background, s", learning.background_s.to_string());
    say("learning".into(), "aging, ohm per root of a day", learning.aging_ohm_per_sqrt_day.to_string());
    say("learning".into(), "kept in (at the next start)", or_none(state_file.as_ref()));
    say("journal".into(), "file (at the next start)", or_none(journal.file.as_ref().map(|file| file.display())));
    say("journal".into(), "kept for, days (at the next start)", journal.keep_days.to_string());
    let folder = or_none(recording.folder.as_ref().map(|folder| folder.display()));
    say("recording".into(), "folder (at the next start)", folder);
    say("recording".into(), "flushed every, s (at the next start)", recording.flush_s.to_string());
    say("recording".into(), "kept for, days (at the next start)", or_none(recording.keep_days));
    say("recording".into(), "kept up to, GB (at the next start)", or_none(recording.keep_gb));
    say("screen".into(), "blink", screen.blink.to_string());
    let bell: Vec<_> = screen.bell.iter().map(|priority| priority.word()).collect();
    say("screen".into(), "bell", bell.join(", "));
    say("screen".into(), "changes are applied at once", screen.apply_changes.to_string());
}

#[cfg(test)]
mod tests {
    use super::*;

    const VALID: &str = include_str!("../../tests/config/valid.toml");

    fn told(change: impl Fn(&str) -> String) -> Vec<String> {
        let [before, after] = [VALID.to_owned(), change(VALID)].map(|text| Config::parse(&text, "test.toml").unwrap());
        lines(&before, &after)
    }

    #[test]
    fn the_same_in_other_words_is_no_change() {
        assert_eq!(told(|text| format!("# another remark\n{text}")), Vec::<String>::new());
    }

    #[test]
    fn each_difference_is_told_by_its_meaning() {
        let alarm = "[[alarm]]\nname = \"busy\"\non = \"headroom_mw\"\nsetpoint = 300\n";
        let other = alarm.replace("300", "350");
        let new = told(|text| format!("{text}\n{alarm}"));
        assert!(new.iter().all(|line| line.ends_with(", alarm busy: new")) && !new.is_empty(), "{new:?}");
        let [one, another] = [alarm, &other].map(|alarm| Config::parse(&format!("{VALID}\n{alarm}"), "t").unwrap());
        let changed = lines(&one, &another);
        assert!(changed.iter().any(|line| line == "Skarn-Velm, alarm busy: setpoint 300 MW → 350 MW"), "{changed:?}");
        let gone = lines(&one, &Config::parse(VALID, "t").unwrap());
        assert!(gone.iter().all(|line| line.ends_with(", alarm busy: gone")) && gone.len() == new.len(), "{gone:?}");
    }
}
