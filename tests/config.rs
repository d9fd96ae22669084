//! The configuration as people write it, right and wrong.

use std::fs;

use assert_cmd::cargo::cargo_bin_cmd;
use nalgebra::Complex;
use proptest::prelude::*;
use tautline::{
    config::{
        Config, ConfigErrors, FeedSettings, LearningSettings, MeasurementSettings, RecordingSettings, ScreenSettings,
    },
    grid::{
        BankIndex, CombinedOutage, ConfiguredSource, FROM, Fault, FaultKind, Line, Load, Requirements, Side,
        SynchronismCheck, TO,
    },
};
use toml_edit::{Document, Table};

const VALID: &str = include_str!("config/valid.toml");

#[test]
fn every_case_parses() {
    let folders =
        ["tests/cases", "tests/feeds"].into_iter().flat_map(|folder| fs::read_dir(folder).expect("it is there"));
    let mut count = 0;
    for folder in folders {
        let path = folder.expect("readable").path().join("config.toml");
        let config = Config::load(&path).unwrap_or_else(|errors| panic!("{errors}"));
        assert_eq!(config.grid.corridors.len(), 1, "{}", path.display());
        count += 1;
    }
    assert_eq!(count, 12);
}

/// Line, key and message of each error, as the scenarios write them.
fn found(errors: &ConfigErrors) -> Vec<String> {
    errors.errors.iter().map(|e| format!("{} {}: {}", e.line.unwrap_or(0), e.key, e.message)).collect()
}

fn broken_text(case: &Table) -> String {
    if let Some(text) = case.get("text") {
        return text.as_str().expect("a text").to_owned();
    }
    let edits = case["edits"].as_array().expect("edits or a text");
    edits.iter().fold(VALID.to_owned(), |text, edit| {
        let part = |n: usize| edit.as_array().and_then(|edit| edit.get(n)?.as_str()).expect("two texts");
        assert!(text.contains(part(0)), "nothing to replace: {}", part(0));
        text.replacen(part(0), part(1), 1)
    })
}

#[test]
fn broken_configurations_say_all_that_is_wrong() {
    let cases = Document::parse(include_str!("config/broken.toml")).expect("well-formed scenarios");
    for case in cases["case"].as_array_of_tables().expect("[[case]]") {
        let name = case["name"].as_str().expect("a name");
        let Err(errors) = Config::parse(&broken_text(case), "broken.toml") else { panic!("{name}: it was accepted") };
        let found = found(&errors);
        let expected: Vec<_> =
            case["errors"].as_array().expect("errors").iter().map(|error| error.as_str().expect("a text")).collect();
        let agree = found.len() == expected.len()
            && found.iter().zip(&expected).all(|(found, expected)| found.starts_with(expected));
        assert!(agree, "{name}\n  expected {expected:#?}\n  found {found:#?}");
        assert!(!errors.to_string().contains(|c: char| c.is_control() && c != '\n'), "{name}: {errors}");
    }
}

/// The bundled configurations are right, and the reference says the defaults that the program has.
#[test]
fn bundled_configurations_are_read() {
    let reference = Config::load("config/reference.toml".as_ref()).unwrap_or_else(|errors| panic!("{errors}"));
    assert_eq!(reference.measurement, MeasurementSettings::default());
    assert_eq!(reference.learning, LearningSettings::default());
    assert_eq!(reference.screen, ScreenSettings::default());
    assert_eq!(reference.recording.flush_s.to_bits(), RecordingSettings::default().flush_s.to_bits());
    assert_eq!(reference.feed, FeedSettings { inputs: reference.feed.inputs.clone(), ..FeedSettings::default() });
    Config::load("config/demo.toml".as_ref()).unwrap_or_else(|errors| panic!("{errors}"));
}

#[test]
fn live_inputs_have_their_patience() {
    let text = VALID.replace("max_age_s = 4", "max_age_s = 4\nhold_s = 0.5\nmax_ahead_s = 900");
    let feed = Config::parse(&text, "valid.toml").unwrap_or_else(|errors| panic!("{errors}")).feed;
    assert_eq!((feed.hold_s, feed.max_ahead_s), (0.5, 900.0));
}

#[test]
fn every_key_is_read() {
    let config = Config::parse(VALID, "valid.toml").unwrap_or_else(|errors| panic!("{errors}"));
    assert_eq!((config.grid.frequency_hz, config.time_zone), (50.0, chrono_tz::Europe::Oslo));
    assert_eq!(
        config.measurement,
        MeasurementSettings { kv_sigma_pct: 0.2, angle_sigma_deg: 0.2, power_sigma_pct: 0.5 }
    );
    assert_eq!(
        config.feed,
        FeedSettings {
            inputs: vec!["tcp://127.0.0.1:7001".to_owned()],
            max_age_s: 4.0,
            hold_s: 0.2,
            max_ahead_s: 3600.0
        }
    );
    let names = [("SV1.from.mw", "RTU7/P"), ("Skarn.kv", "RTU7/U")].map(|(a, b)| (a.to_owned(), b.to_owned()));
    assert_eq!(config.channel_names, names.into());
    let learning = LearningSettings {
        enabled: false,
        window_s: 12.0,
        gap_s: 4.0,
        step_threshold: 6.0,
        background_s: 3600.0,
        aging_ohm_per_sqrt_day: 0.5,
    };
    assert_eq!(config.learning, learning);
    assert_eq!(config.state_file.as_deref(), Some("kept/grid.json"));
    let (folder, keep_days, keep_gb) = (Some("days".into()), Some(30.0), Some(2.5));
    assert_eq!(config.recording, RecordingSettings { folder, flush_s: 5.0, keep_days, keep_gb });

    let corridor = &config.grid.corridors[0];
    assert_eq!((&*corridor.name, corridor.thin_mw), ("Skarn-Velm", 150.0));
    assert_eq!([0, 1].map(|index| config.grid.corridors[index].state_spreads.to_string()), ["0", "2"]);
    let buses: Vec<_> = corridor.buses.iter().map(|bus| (&*bus.name, bus.nominal_kv, bus.min_kv, bus.load)).collect();
    let load = Load { mw: 800.0, mvar: 120.0 };
    let expected = [("Skarn", 400.0, Some(370.0), Some(load)), ("Velm", 400.0, None, None), ("Mid", 400.0, None, None)];
    assert_eq!(buses, expected);
    let skarn = ConfiguredSource { r_ohm: 1.5, x_ohm: 22.0, spread: 0.4, swing_x_ohm: 9.0 };
    // 400² / 8000 = 20 ohm, a twentieth of it resistance; spread and swing by default.
    let velm = ConfiguredSource { r_ohm: 1.0, x_ohm: 20.0, spread: 0.3, swing_x_ohm: 0.0 };
    assert_eq!(corridor.sides[FROM], Side { stored_energy_mws: Some(60000.0), source: skarn });
    assert_eq!(corridor.sides[TO], Side { stored_energy_mws: None, source: velm });

    let [sv1, sm, mv] = &corridor.circuits[..] else { panic!("three circuits") };
    assert_eq!((sv1.between, sm.between, mv.between), ([0, 1], [0, 2], [2, 1]));
    let per_km = Line::PerKm { length_km: 240.0, r_ohm_per_km: 0.028, x_ohm_per_km: 0.31, b_us_per_km: 3.7 };
    assert_eq!((sv1.line, sm.line), (per_km, Line::Totals { r_ohm: 3.1, x_ohm: 35.0, b_us: 420.0 }));
    assert_eq!((sv1.rating_a, sv1.short_time_rating_a), (Some(1900.0), Some(2300.0)));
    assert_eq!((sm.rating_a, sm.short_time_rating_a), (Some(2000.0), Some(2000.0)), "short-time as continuous");
    assert_eq!((mv.rating_a, mv.short_time_rating_a), (None, None));
    assert_eq!((&*sv1.banks[0].name, sv1.banks[0].x_ohm, sv1.banks[0].at), ("SV1-SC", 26.0, 0.5));

    let tower = CombinedOutage { name: "SV1+SM tower".into(), circuits: vec![0, 1], banks: vec![] };
    assert_eq!(corridor.outages, [tower]);
    let kind = FaultKind::PhaseEarth { z2: Complex::new(1.0, 12.0), z0: Complex::new(2.0, 20.0) };
    assert_eq!(corridor.fault, Some(Fault { kind, at: 0.1, clear_ms: 100.0 }));
    let require = Requirements {
        angle_margin_deg: 30.0,
        area_margin: 0.2,
        intact_angle_margin_deg: 40.0,
        accept_separation: true,
    };
    assert_eq!(corridor.require, require);
    assert_eq!(corridor.reclose, SynchronismCheck { max_angle_deg: 25.0, max_voltage_pct: 8.0 });
}

#[test]
fn what_is_left_out_has_its_default() {
    let config = Config::parse(VALID, "valid.toml").unwrap_or_else(|errors| panic!("{errors}"));
    let corridor = &config.grid.corridors[1];
    assert_eq!((corridor.thin_mw, corridor.fault), (100.0, None));
    assert_eq!((corridor.require, corridor.reclose), (Requirements::default(), SynchronismCheck::default()));
    assert_eq!(corridor.circuits[0].between, [FROM, TO]);
    assert_eq!(
        corridor.sides[FROM].source,
        ConfiguredSource { r_ohm: 0.0, x_ohm: 10.0, spread: 0.3, swing_x_ohm: 0.0 }
    );

    let text = fs::read_to_string("tests/cases/corridor-01/config.toml").expect("it is there");
    let config = Config::parse(&text, "corridor-01").unwrap_or_else(|errors| panic!("{errors}"));
    assert_eq!(config.time_zone, chrono_tz::UTC);
    assert_eq!((config.measurement, config.learning), Default::default());
    assert_eq!(config.feed, FeedSettings::default());
}

#[test]
fn banks_stand_in_the_order_of_their_places() {
    let banks = r#"[ { name = "B", x_ohm = 9, at = 1 }, { name = "A", x_ohm = 8, at = 0 } ]"#;
    let text = VALID.replace(r#"[ { name = "SV1-SC", x_ohm = 26.0, at = 0.5 } ]"#, banks);
    let text = text.replace("banks = []", r#"banks = ["B"]"#);
    let config = Config::parse(&text, "banks.toml").unwrap_or_else(|errors| panic!("{errors}"));
    let corridor = &config.grid.corridors[0];
    let names: Vec<_> = corridor.banks().map(|(_, bank)| &*bank.name).collect();
    assert_eq!(names, ["A", "B"]);
    assert_eq!(corridor.outages[0].banks, [BankIndex { circuit: 0, bank: 1 }]);
}

#[test]
fn files_that_cannot_be_read_say_why() {
    let folder = tempfile::tempdir().expect("a folder");
    let file = |name: &str, bytes: &[u8]| {
        let path = folder.path().join(name);
        fs::write(&path, bytes).expect("written");
        path
    };
    let cases = [
        (folder.path().join("missing.toml"), None, "cannot be read: "),
        (folder.path().to_owned(), None, "is a directory"),
        (file("latin.toml", b"[grid]\n# caf\xe9\n"), Some(2), "is not UTF-8"),
        (file("huge.toml", &vec![b'\n'; (4 << 20) + 1]), None, "is larger than 4 MiB"),
        (file("esc\u{1b}ape.toml", b"[grid"), Some(1), "not valid TOML"),
    ];
    for (path, line, message) in cases {
        let errors = Config::load(&path).expect_err("unreadable");
        assert_eq!((errors.errors.len(), errors.errors[0].line), (1, line), "{errors}");
        assert!(errors.errors[0].message.starts_with(message), "{errors}");
        assert!(!errors.to_string().contains('\u{1b}'), "{errors}");
    }
}

#[test]
fn a_flood_of_errors_is_cut_short() {
    let unknown = (0..50_000).map(|n| format!("key_{n} = {n}\n")).collect::<Vec<_>>().concat();
    let errors = Config::parse(&format!("{unknown}{VALID}"), "flood.toml").expect_err("unknown keys");
    assert_eq!(errors.errors.len() + errors.unlisted, 50_000);
    assert!(errors.to_string().len() < 100_000);
}

#[test]
fn a_crowd_of_circuits_is_refused() {
    let circuit = |n| format!("[[corridor.circuit]]\nname = \"C{n}\"\nx_ohm = 1\nr_ohm = 0\nb_us = 0\n");
    let circuits = (0..200).map(circuit).collect::<Vec<_>>().concat();
    let text = fs::read_to_string("tests/cases/corridor-08/config.toml").expect("it is there") + &circuits;
    let errors = Config::parse(&text, "crowd.toml").expect_err("too many");
    assert_eq!(found(&errors), ["26 corridor[0].circuit: has 203 entries; at most 200 are possible"]);
}

/// Valid configurations with a few stretches of them replaced by something else.
fn mutated() -> impl Strategy<Value = String> {
    let piece = prop_oneof![
        Just(String::new()),
        "\\PC{0,8}",
        "[\\[\\]{}=,.\"'0-9a-z_\\n -]{0,12}",
        (0..VALID.len(), 0..60_usize).prop_map(|(start, length)| VALID.chars().skip(start).take(length).collect()),
    ];
    prop::collection::vec((0..VALID.len(), 0..40_usize, piece), 1..5).prop_map(|edits| {
        let mut text: Vec<char> = VALID.chars().collect();
        for (start, length, piece) in edits {
            let start = start.min(text.len());
            let end = (start + length).min(text.len());
            text.splice(start..end, piece.chars());
        }
        text.into_iter().collect()
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(500))]

    #[test]
    fn any_text_is_read_or_refused(text in ".{0,200}") {
        let _ = Config::parse(&text, "any.toml");
    }

    #[test]
    fn any_change_is_read_or_refused_in_its_place(text in mutated()) {
        if let Err(errors) = Config::parse(&text, "any.toml") {
            let lines = text.split('\n').count();
            prop_assert!(!errors.errors.is_empty());
            for error in &errors.errors {
                prop_assert!(error.line.is_some_and(|line| (1..=lines).contains(&line)), "{error:?}");
            }
        }
    }
}

#[test]
fn check_prints_what_it_understood() {
    let run = cargo_bin_cmd!("tautline").args(["check", "--config", "tests/config/valid.toml"]).assert().success();
    insta::assert_snapshot!("check_valid", String::from_utf8_lossy(&run.get_output().stdout));
    assert!(run.get_output().stderr.is_empty());
}

#[test]
fn check_prints_every_error() {
    let run = cargo_bin_cmd!("tautline").args(["check", "--config", "tests/config/wrong.toml"]).assert().code(2);
    insta::assert_snapshot!("check_wrong", String::from_utf8_lossy(&run.get_output().stderr));
    assert!(run.get_output().stdout.is_empty());
}
