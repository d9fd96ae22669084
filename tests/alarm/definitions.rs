//! Alarms as people configure them, right and wrong.

use chrono::TimeDelta;
use tautline::{
    alarm::{BUILT_IN, Definition, Kind, Priority, Suppression},
    config::Config,
};

use super::bed::{config, text};

fn named<'a>(config: &'a Config, corridor: usize, name: &str) -> &'a Definition {
    config.alarms[corridor].iter().find(|alarm| *alarm.name == *name).unwrap_or_else(|| panic!("no alarm {name}"))
}

#[test]
fn a_configuration_that_says_nothing_has_the_built_in_alarms() {
    let config = config("", "");
    for alarms in &config.alarms {
        let found: Vec<_> = alarms.iter().map(|alarm| (&*alarm.name, alarm.kind)).collect();
        assert_eq!(found, BUILT_IN);
        assert!(alarms.iter().all(|alarm| !alarm.message.is_empty() && !alarm.action.is_empty()));
        assert!(alarms.iter().all(|a| a.setpoint == 0.0 || a.deadband <= a.setpoint.abs()), "as for anybody else");
    }
    let thin = [0, 1].map(|corridor| Some(named(&config, corridor, "headroom thin").setpoint));
    assert_eq!(thin, [Some(200.0), Some(100.0)], "the corridor's own thin threshold");
}

#[test]
fn each_layer_changes_what_it_names() {
    let all = r#"
        [[alarm]]
        name = "headroom thin"
        setpoint = 300
        on_delay_s = 20
        [[alarm]]
        name = "source moved"
        enabled = false
        [[alarm]]
        name = "angle"
        on = "angle_margin_deg"
        priority = "urgent"
        setpoint = 20
        deadband = 3
        on_delay_s = 1.5
        off_delay_s = 0
        message = "Too little angle"
        action = "Take off some load"
        suppress_while = { circuits_out = ["VO1"], transfer_below_mw = 50 }
    "#;
    let first = r#"
        [[corridor.alarm]]
        name = "headroom thin"
        setpoint = 400
        [[corridor.alarm]]
        name = "source moved"
        enabled = true
        priority = "high"
        [[corridor.alarm]]
        name = "angle"
        enabled = false
    "#;
    let config = config(all, first);
    let thin = [0, 1].map(|corridor| named(&config, corridor, "headroom thin"));
    assert_eq!(thin.map(|alarm| (alarm.setpoint, alarm.deadband)), [(400.0, 20.0), (300.0, 10.0)]);
    assert_eq!(thin.map(|alarm| (alarm.on_delay, alarm.priority)), [(TimeDelta::seconds(20), Priority::High); 2]);
    let has = |corridor: usize, name: &str| config.alarms[corridor].iter().any(|alarm| *alarm.name == *name);
    assert!(!has(1, "source moved") && !has(0, "angle"));
    let again = named(&config, 0, "source moved");
    assert_eq!((again.kind, again.setpoint, again.priority), (Kind::SourceMoved, 50.0, Priority::High));
    let expected = Definition {
        name: "angle".into(),
        kind: Kind::AngleMargin,
        priority: Priority::Urgent,
        setpoint: 20.0,
        deadband: 3.0,
        on_delay: TimeDelta::milliseconds(1500),
        off_delay: TimeDelta::zero(),
        message: "Too little angle".into(),
        action: "Take off some load".into(),
        suppress_while: Suppression { circuits_out: vec!["VO1".into()], transfer_below_mw: Some(50.0) },
    };
    assert_eq!(*named(&config, 1, "angle"), expected);
}

#[test]
fn every_kind_can_be_configured() {
    for kind in Kind::ALL {
        let [_, high] = kind.setpoints();
        let table = format!("[[alarm]]\nname = \"mine\"\non = \"{kind}\"\nsetpoint = {high}\n");
        assert_eq!(named(&config(&table, ""), 0, "mine").kind, kind);
    }
}

#[test]
fn broken_alarms_are_all_reported_with_line_and_key() {
    // The first table begins in line 4.
    let all = r#"[[alarm]]
name = "headroom thin"
setpoint = 100
deadband = 150
[[alarm]]
name = "hedroom thin"
[[alarm]]
name = "mine"
on = "hedroom_mw"
setpoint = 3
[[alarm]]
name = "yours"
on = "headroom_mw"
priority = "hihg"
on_delay_s = -1
deadline = 4
suppress_while = { circuits_out = ["SV3"], transfer_below = 4 }
[[alarm]]
name = "headroom spent"
on = "blind"
[[alarm]]
name = "yours"
[[alarm]]
name = "area"
on = "area_margin"
setpoint = 1.5
"#;
    let first =
        "[[corridor.alarm]]\nname = \"time short\"\ndeadband = 60\nsuppress_while = { circuits_out = [\"VO1\"] }";
    let Err(errors) = Config::parse(&text(all, first), "bed.toml") else { panic!("it was accepted") };
    let found: Vec<String> =
        errors.errors.iter().map(|e| format!("{} {}: {}", e.line.unwrap_or(0), e.key, e.message)).collect();
    let expected = [
        "7 alarm[0].deadband: the deadband (150) is larger than the setpoint (100)",
        "8 alarm[1].on: say what a new alarm is on, or name one that is there: did you mean \"headroom thin\"?",
        "12 alarm[2].on: no \"hedroom_mw\" is possible here; did you mean \"headroom_mw\"?",
        "14 alarm[3].setpoint: is missing",
        "17 alarm[3].priority: no \"hihg\" is possible here; did you mean \"high\"?",
        "18 alarm[3].on_delay_s: must be a number at least 0",
        "19 alarm[3].deadline: unknown key",
        "20 alarm[3].suppress_while.transfer_below: unknown key",
        "20 alarm[3].suppress_while.circuits_out[0]: no circuit \"SV3\" here",
        "23 alarm[4].on: alarm \"headroom spent\" is on headroom_mw already; choose another name",
        "25 alarm[5].name: \"yours\" is taken by another alarm (line 15)",
        "29 alarm[6].setpoint: must be a number at least -1 and at most 1, not 1.5",
        "40 corridor[0].alarm[0].deadband: the deadband (60) is larger than the setpoint (20)",
        "41 corridor[0].alarm[0].suppress_while.circuits_out[0]: no circuit \"VO1\" here",
    ];
    let said = |expected: &&str| {
        let (place, what) = expected.split_once(": ").expect("a place");
        found.iter().any(|found| found.starts_with(place) && found.contains(what))
    };
    let missing: Vec<_> = expected.iter().filter(|expected| !said(expected)).collect();
    assert!(missing.is_empty() && found.len() == expected.len(), "missing {missing:#?}\nfound {found:#?}");
}

#[test]
fn the_journal_is_where_it_is_said_to_be() {
    let path = std::path::Path::new("grids/north.toml");
    assert_eq!(config("", "").journal.path(path), std::path::Path::new("grids/north.journal.db"));
    let set = config("[journal]\nfile = \"kept/alarms.db\"\nkeep_days = 30", "").journal;
    assert_eq!(set.path(path), std::path::Path::new("grids/kept/alarms.db"));
    assert_eq!(set.keep(), TimeDelta::days(30));
}
