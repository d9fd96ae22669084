//! A corridor with a change: against the independent program, against frames measured in the changed state, and what
//! must hold for any change.

use std::fs;

use proptest::prelude::*;
use serde_json::Value;
use tautline::{
    config::Config,
    desk::{Alternative, Assessment, Criterion, State},
    feed::Snapshot,
    grid::Corridor,
    network::{Branch, C64},
};

use super::{
    bench::{self, Values, outage},
    properties::{Invented, invented, three_circuits},
};

fn owned(texts: &[impl AsRef<str>]) -> Vec<String> {
    texts.iter().map(|text| text.as_ref().to_owned()).collect()
}

/// What the first corridor is at the last frame of JSON Lines, and what it would be.
fn what_if(config: &str, lines: &str, with: &[impl AsRef<str>], without: &[&str]) -> (Assessment, Assessment) {
    let (config, mut desk, snapshots) = bench::desk(config, lines.as_bytes());
    let alternatives = Alternative::parse(&owned(with), &owned(without), &config.grid).expect("right changes");
    let mut alternative = alternatives.into_iter().next().flatten().expect("the first corridor is changed");
    let assess = |snapshot: &Snapshot| desk.corridors[0].assess_with(snapshot, &mut alternative);
    snapshots.iter().map(assess).last().expect("at least one frame")
}

/// A frame measured in the state that an assessment found, whole and exact.
fn measured(corridor: &Corridor, found: &Assessment) -> Values {
    let detail = found.detail.as_ref().expect("a detailed state");
    let mut values = Values::new();
    for bus in &detail.buses {
        let of = [("kv", bus.kv), ("deg", bus.deg), ("mw", bus.load_mw), ("mvar", bus.load_mvar)];
        values.extend(of.map(|(channel, value)| (format!("{}.{channel}", bus.name), value)));
    }
    let voltage = |bus: usize| {
        let bus = detail.buses.iter().find(|found| found.name == corridor.buses[bus].name);
        bus.map_or(C64::default(), |bus| C64::from_polar(bus.kv, bus.deg.to_radians()))
    };
    for (circuit, found) in corridor.circuits.iter().zip(&detail.circuits) {
        values.insert(format!("{}.closed", circuit.name), f64::from(u8::from(found.closed)));
        for (bank, inserted) in &found.banks {
            values.insert(format!("{bank}.inserted"), f64::from(u8::from(*inserted)));
        }
        if found.closed {
            let inserted: Vec<_> = found.banks.iter().map(|(_, inserted)| *inserted).collect();
            let (branch, [first, second]) = (Branch::of(circuit, &inserted), circuit.between.map(voltage));
            for (end, name, own) in
                [(tautline::grid::End::From, "from", first), (tautline::grid::End::To, "to", second)]
            {
                let power = own * branch.current(end, first, second).conj();
                values.insert(format!("{}.{name}.mw", circuit.name), power.re);
                values.insert(format!("{}.{name}.mvar", circuit.name), power.im);
            }
        }
    }
    values
}

fn near(a: Option<f64>, b: Option<f64>, tolerance: f64) -> bool {
    match (a, b) {
        (Some(a), Some(b)) => (a - b).abs() <= tolerance * a.abs().max(1.0),
        (a, b) => a.is_none() && b.is_none(),
    }
}

/// Two records are the same but for how well their frames were measured.
fn same(path: &str, a: &Value, b: &Value) {
    match (a, b) {
        (Value::Object(members), Value::Object(others)) => {
            assert_eq!(members.len(), others.len(), "{path}");
            for (key, value) in members.iter().filter(|(key, _)| !["fit", "time"].contains(&key.as_str())) {
                same(&format!("{path}.{key}"), value, &others[key]);
            }
        }
        (Value::Array(items), Value::Array(others)) => {
            assert_eq!(items.len(), others.len(), "{path}");
            items.iter().zip(others).enumerate().for_each(|(index, (a, b))| same(&format!("{path}[{index}]"), a, b));
        }
        (Value::Number(_), Value::Number(_)) => {
            // The spread is a difference of two limits.
            let tolerance = if path.contains("headroom_sd") { 1e-3 } else { 1e-6 };
            assert!(near(a.as_f64(), b.as_f64(), tolerance), "{path}: {a} and {b}");
        }
        _ => assert_eq!(a, b, "{path}"),
    }
}

/// The changed state, measured and assessed as any frame, gives the same record; its sources are those before.
fn holds_as_a_frame(config: &str, before: &Assessment, altered: &Assessment) {
    for (one, other) in before.sources.iter().zip(&altered.sources) {
        assert!(near(one.e_kv, other.e_kv, 1e-9), "{one:?} {other:?}");
    }
    let grid = Config::parse(config, "config.toml").expect("valid before").grid;
    let again = bench::assess(config, &measured(&grid.corridors[0], altered));
    same_records(altered, &again);
}

fn same_records(one: &Assessment, other: &Assessment) {
    let [mut records, mut others] = [one, other].map(|record| serde_json::to_value(record).expect("a record is JSON"));
    // Where nothing may be carried at all, several outages say so, and rounding chooses.
    if one.transfer_mw.zip(one.headroom_mw).is_some_and(|(transfer, headroom)| (transfer + headroom).abs() < 1.0) {
        for record in [&mut records, &mut others] {
            record["binding"] = Value::Null;
            record["headroom_sd_mw"] = Value::Null;
        }
    }
    same("record", &records, &others);
}

struct Case {
    folder: String,
    config: String,
    lines: String,
    expected: Value,
}

fn cases() -> Vec<Case> {
    let folders = fs::read_dir("tests/cases").expect("the cases are there");
    let case = |folder: std::path::PathBuf| {
        let read = |name: &str| fs::read_to_string(folder.join(name)).expect("part of the case");
        let expected: Vec<Value> = serde_json::from_str(&read("expected.json")).expect("JSON");
        Case {
            config: read("config.toml"),
            lines: read("frames.jsonl"),
            expected: expected.into_iter().next().expect("a record"),
            folder: folder.display().to_string(),
        }
    };
    folders.map(|folder| case(folder.expect("readable").path())).collect()
}

/// What the independent program found after an outage without a fault is what would be with the circuit open.
#[test]
fn opening_agrees_with_the_independent_program() {
    let (mut compared, mut parted, mut spent) = (0, 0, 0);
    for Case { folder, config, lines, expected } in cases() {
        let grid = Config::parse(&config, "config.toml").expect("valid").grid;
        let is_circuit = |name: &str| grid.corridors[0].circuits.iter().any(|circuit| &*circuit.name == name);
        let is_bank = |name: &str| grid.corridors[0].banks().any(|(_, bank)| &*bank.name == name);
        for after in expected["outages"].as_array().expect("outages") {
            let name = after["name"].as_str().expect("a name");
            let change = match () {
                () if is_circuit(name) => format!("open {name}"),
                () if is_bank(name) => format!("bypass {name}"),
                () => continue,
            };
            let (before, altered) = what_if(&config, &lines, &[&change], &[]);
            let agree = |what: &str, found: Option<f64>, expected: &Value| {
                assert!(near(expected.as_f64(), found, 1e-6), "{folder} {change} {what}: {found:?} not {expected}");
            };
            if after["separates"] == true {
                assert_eq!((altered.state, altered.headroom_mw), (State::Spent, Some(0.0)), "{folder} {change}");
                assert_eq!(altered.binding.expect("it binds").criterion, Criterion::Separation, "{folder} {change}");
                parted += 1;
            } else if after["angle_margin_deg"].is_null() {
                assert_eq!((altered.state, altered.headroom_mw), (State::Spent, None), "{folder} {change}");
                spent += 1;
            } else {
                let intact = altered.intact.as_ref().expect("a state");
                agree("peak", Some(intact.peak_mw), &after["peak_mw"]);
                agree("angle margin", Some(intact.angle_margin_deg), &after["angle_margin_deg"]);
                for bus in &altered.detail.as_ref().expect("a state").buses {
                    if let Some(kv) = after["kv"].get(&*bus.name) {
                        agree(&bus.name, Some(bus.kv), kv);
                        compared += 1;
                    }
                }
                holds_as_a_frame(&config, &before, &altered);
            }
        }
    }
    assert!(compared > 60 && parted > 0 && spent > 0, "{compared} {parted} {spent}");
}

/// The independent program's headroom, used up by a shift of the transfer, leaves none, and the same outage binds.
#[test]
fn shifting_agrees_with_the_independent_program() {
    let mut compared = 0;
    for Case { folder, config, lines, expected } in cases() {
        let [transfer, headroom, peak] =
            [&expected["transfer_mw"], &expected["headroom_mw"], &expected["intact"]["peak_mw"]]
                .map(|value| value.as_f64().expect("a number"));
        for share in [0.5, 1.0] {
            let shift = share * headroom;
            let change = format!("transfer {} {shift}", expected["corridor"].as_str().expect("a name"));
            let (before, altered) = what_if(&config, &lines, &[change], &[]);
            holds_as_a_frame(&config, &before, &altered);
            if altered.exporter != before.exporter {
                // Near zero transfer, both ends feed the stations between them.
                continue;
            }
            assert!(near(altered.transfer_mw, Some(transfer + shift), 1e-6), "{folder} {:?}", altered.transfer_mw);
            let left = altered.headroom_mw.expect("a state");
            assert!((left - (headroom - shift)).abs() < 5e-4 * peak, "{folder}: {left} of {headroom}");
            let binding = serde_json::to_value(&altered.binding).expect("a record is JSON");
            assert_eq!(binding, expected["binding"], "{folder}");
            compared += 1;
        }
    }
    assert!(compared > 18, "{compared}");
}

/// The record's own actions are what-ifs with one figure.
#[test]
fn every_action_is_a_what_if() {
    let mut compared = 0;
    for Case { folder, config, lines, .. } in cases() {
        let grid = Config::parse(&config, "config.toml").expect("valid").grid;
        let [corridor] = &grid.corridors[..] else { panic!("one corridor each") };
        let banks = corridor.banks().map(|(_, bank)| format!("bypass {}", bank.name));
        let circuits = corridor.circuits.iter().map(|circuit| format!("open {}", circuit.name));
        for change in banks.chain(circuits) {
            let (_, altered) = what_if(&config, &lines, &[&change], &[]);
            if altered.detail.is_none() {
                continue;
            }
            let line = bench::frame(0, &measured(corridor, &altered));
            for action in &altered.actions {
                let (_, after) = what_if(&config, &line, &[&action.action], &[]);
                assert!(near(action.headroom_mw, after.headroom_mw, 1e-9), "{folder} {change}, {action:?}");
                compared += 1;
            }
        }
    }
    assert!(compared > 40, "{compared}");
}

/// A day of ten minutes with a rising transfer; the first circuit is open in the middle of it.
fn falling() -> (Invented, String) {
    let invented = three_circuits();
    let config = Config::parse(&invented.config(false), "config.toml").expect("valid");
    let lines = (0..90).map(|index| {
        let mut rising = invented.clone();
        rising.angle_deg = 6.0 + 0.02 * f64::from(index);
        let mut values = rising.values(false);
        values.insert("L0.closed".into(), 1.0);
        if (40..50).contains(&index) {
            let (_, opened) = what_if(&rising.config(false), &bench::frame(0, &values), &["open L0"], &[]);
            values = measured(&config.grid.corridors[0], &opened);
        }
        bench::frame(10 * i64::from(index), &values)
    });
    (invented.clone(), lines.collect())
}

#[test]
fn what_is_so_already_changes_nothing_and_the_corridor_is_assessed_as_ever() {
    let (invented, lines) = falling();
    let (config, desk, snapshots) = bench::desk(&invented.config(false), lines.as_bytes());
    for (change, is_so) in [("insert L1-SC", true), ("close L1", true), ("open L2", false)] {
        let mut alternative =
            Alternative::parse(&owned(&[change]), &[], &config.grid).expect("right").remove(0).expect("one");
        let [mut alone, mut both] = [desk.clone(), desk.clone()];
        for snapshot in &snapshots {
            let (present, altered) = both.corridors[0].assess_with(snapshot, &mut alternative);
            assert_eq!(present, alone.corridors[0].assess(snapshot), "{change}");
            assert_eq!(present == altered, is_so, "{change}");
        }
    }
}

/// An alternative has a trend of its own: with less headroom it runs out earlier.
#[test]
fn minutes_left_are_those_of_the_alternative() {
    let (invented, lines) = falling();
    let (present, altered) = what_if(&invented.config(false), &lines, &["transfer Skarn-Velm 300"], &[]);
    let [now, then] = [&present, &altered].map(|record| record.minutes_to_spent.expect("it falls"));
    let slope = present.headroom_mw.unwrap() / now;
    assert!((now - then - 300.0 / slope).abs() < 0.05 * now, "{now} {then}");
}

/// Closed all the time, a circuit that is open for a while changes nothing: sources and machines stay.
#[test]
fn a_trip_that_did_not_happen_leaves_no_trace() {
    let (invented, lines) = falling();
    // Pinned sources, from which nothing is learned.
    let config = invented.config(false).replace("spread = 0.2", "spread = 0");
    let (config, mut desk, snapshots) = bench::desk(&config, lines.as_bytes());
    let mut alternative =
        Alternative::parse(&owned(&["close L0"]), &[], &config.grid).expect("right").remove(0).expect("one");
    let mut fallen = f64::INFINITY;
    for (index, snapshot) in snapshots.iter().enumerate() {
        let (present, altered) = desk.corridors[0].assess_with(snapshot, &mut alternative);
        let headroom = altered.headroom_mw.expect("a state");
        assert!(headroom < fallen && fallen - headroom < 10.0 || index == 0, "{fallen} {headroom}");
        fallen = headroom;
        assert_eq!(present.reclose.is_empty(), !(40..50).contains(&index));
        assert_eq!(altered.minutes_to_spent.is_some(), index > 10, "{index}");
        assert_eq!(present.minutes_to_spent.is_some(), (11..40).contains(&index) || index > 60, "{index}");
    }
}

#[test]
fn what_cannot_be_is_spent_without_headroom() {
    let invented = three_circuits();
    let line = bench::frame(0, &invented.values(false));
    for shift in ["1e5", "-1e5", "1e300"] {
        let change = format!("transfer Skarn-Velm {shift}");
        let (present, altered) = what_if(&invented.config(false), &line, &[change], &[]);
        assert_eq!((altered.state, altered.headroom_mw, altered.transfer_mw), (State::Spent, None, None), "{shift}");
        assert_eq!(altered.binding.expect("it binds").criterion, Criterion::Angle);
        assert_eq!(altered.fit, present.fit);
    }
}

#[test]
fn all_circuits_open_are_two_parts() {
    let invented = three_circuits();
    let line = bench::frame(0, &invented.values(false));
    let changes = ["open L0", "open L1", "open L2", "transfer Skarn-Velm 100"];
    let (_, altered) = what_if(&invented.config(false), &line, &changes, &[]);
    assert_eq!((altered.state, altered.transfer_mw, altered.headroom_mw), (State::Spent, Some(0.0), Some(0.0)));
    assert_eq!(altered.binding.as_ref().expect("it binds").criterion, Criterion::Separation);
    assert_eq!(altered.reclose.len(), 3);
    assert!(altered.reclose.iter().all(|reclose| reclose.angle_deg.is_none() && reclose.voltage_pct.is_some()));
}

#[test]
fn a_blind_or_parted_corridor_stays_what_it_is() {
    let invented = three_circuits();
    let mut parted = Values::from([("Skarn.kv".into(), 404.0), ("Velm.kv".into(), 401.0)]);
    parted.extend((0..3).map(|index| (format!("L{index}.closed"), 0.0)));
    let blind = Values::from([("Skarn.kv".into(), 404.0)]);
    for (values, state) in [(parted, State::Spent), (blind, State::Blind)] {
        let line = bench::frame(0, &values);
        let (present, altered) =
            what_if(&invented.config(false), &line, &["close L0", "transfer Skarn-Velm 100"], &["L1"]);
        assert_eq!(present.state, state);
        assert_eq!(present, altered);
    }
}

/// Past zero transfer the other side exports.
#[test]
fn a_shift_goes_on_through_zero_transfer() {
    let invented = three_circuits();
    let line = bench::frame(0, &invented.values(false));
    let transfer = invented_transfer(&line);
    let change = format!("transfer Skarn-Velm {}", -2.0 * transfer);
    let (before, altered) = what_if(&invented.config(false), &line, &[change], &[]);
    assert_eq!((before.exporter.as_deref(), altered.exporter.as_deref()), (Some("Skarn"), Some("Velm")));
    let reversed = altered.transfer_mw.expect("a state");
    assert!(reversed > transfer && reversed < 1.1 * transfer, "{transfer} at the one end, {reversed} at the other");
    holds_as_a_frame(&invented.config(false), &before, &altered);
}

fn invented_transfer(line: &str) -> f64 {
    let found = bench::assess_lines(&three_circuits().config(false), line.as_bytes()).remove(0);
    found.transfer_mw.expect("a state")
}

#[test]
fn an_outage_not_reckoned_with_is_not_judged() {
    for Case { folder, config, lines, expected } in cases() {
        let Some(binding) = expected["binding"]["outage"].as_str() else { continue };
        let (before, altered) = what_if(&config, &lines, &[] as &[&str], &[binding]);
        assert!(altered.outages.iter().all(|outage| &*outage.name != binding), "{folder}");
        assert_eq!(altered.outages.len() + 1, before.outages.len(), "{folder}");
        assert!(altered.outages.iter().all(|left| left == outage(&before, &left.name)), "{folder}");
        assert!(altered.headroom_mw >= before.headroom_mw, "{folder}");
        assert_ne!(altered.binding, before.binding, "{folder}");
    }
}

/// Changes at random for a corridor of circuits L0, L1 and perhaps L2.
fn changes() -> impl Strategy<Value = (Vec<(u8, u8)>, Option<f64>, Vec<u8>)> {
    let statuses = prop::collection::vec((0..4_u8, 0..3_u8), 0..4);
    (statuses, prop::option::of(-2500.0..2500.0), prop::collection::vec(0..3_u8, 0..3))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    /// Whatever is changed: the sources stay, and the changed state measured as a frame is that record.
    #[test]
    fn any_change_is_a_state_that_could_be_measured(
        invented in invented(), (statuses, shift, without) in changes(), out in 0..3_u8
    ) {
        let there = |circuit: u8| usize::from(circuit) < invented.circuits.len();
        let mut with: Vec<String> = Vec::new();
        let mut names: Vec<String> = Vec::new();
        for (verb, circuit) in statuses {
            let has_bank = there(circuit) && invented.circuits[usize::from(circuit)].1.is_some();
            let name = if verb < 2 { format!("L{circuit}") } else { format!("L{circuit}-SC") };
            if there(circuit) && (verb < 2 || has_bank) && !names.contains(&name) {
                with.push(format!("{} {name}", ["close", "open", "insert", "bypass"][usize::from(verb)]));
                names.push(name);
            }
        }
        with.extend(shift.map(|shift| format!("transfer Skarn-Velm {shift}")));
        let without: Vec<_> = without.into_iter().filter(|circuit| there(*circuit)).map(|circuit| format!("L{circuit}")).collect();
        prop_assume!(!with.is_empty() || !without.is_empty());
        let without: Vec<&str> = without.iter().map(String::as_str).collect();
        let config = invented.config(false);
        let mut line = bench::frame(0, &invented.values(false));
        // Often one is out to begin with.
        if there(out) {
            let (_, opened) = what_if(&config, &line, &[format!("open L{out}")], &[]);
            if opened.detail.is_some() {
                let grid = Config::parse(&config, "config.toml").expect("valid").grid;
                line = bench::frame(0, &measured(&grid.corridors[0], &opened));
            }
        }
        let (before, altered) = what_if(&config, &line, &with, &without);
        if altered.detail.is_some() && without.is_empty() {
            holds_as_a_frame(&config, &before, &altered);
        }
        let shifted_only = with.len() == 1 && shift.is_some() && without.is_empty();
        if let (true, Some(shift), Some(left)) = (shifted_only && altered.exporter == before.exporter, shift, altered.headroom_mw) {
            let expected = before.headroom_mw.expect("a state") - shift;
            prop_assert!((left - expected).abs() < 1e-3, "{left} not {expected}");
        }
    }

    /// A circuit opened and closed again leaves everything as it was.
    #[test]
    fn opening_and_closing_again_is_no_change(invented in invented(), bank in any::<bool>()) {
        let config = invented.config(false);
        let grid = Config::parse(&config, "config.toml").expect("valid").grid;
        let bank = grid.corridors[0].banks().next().filter(|_| bank).map(|(_, bank)| bank.name.clone());
        let [there, back] = match bank {
            Some(bank) => [format!("bypass {bank}"), format!("insert {bank}")],
            None => ["open L0".to_owned(), "close L0".to_owned()],
        };
        let (before, opened) = what_if(&config, &bench::frame(0, &invented.values(false)), &[there], &[]);
        // What settles anew does so on the rising side, and of what is right at the peak rounding makes degrees.
        let is_clear = |record: &Assessment| record.intact.as_ref().is_some_and(|intact| intact.angle_margin_deg > 0.5);
        prop_assume!(is_clear(&before) && is_clear(&opened) && opened.exporter == before.exporter);
        let line = bench::frame(0, &measured(&grid.corridors[0], &opened));
        let (_, closed) = what_if(&config, &line, &[back], &[]);
        same_records(&before, &closed);
    }
}
