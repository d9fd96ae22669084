//! Corridors and assessments made up for tests.

use chrono::{DateTime, TimeDelta, Utc};
use tautline::{
    alarm::{AlarmId, Board, Transition},
    config::Config,
    desk::{Assessment, Basis, FitRecord, SourceRecord, State},
    margin::{Intact, IntactLimits, OutageLimits, OutageRecord, Reclose},
};

/// Two corridors; `{all}` and `{first}` are where tables of alarms for all and for the first go.
const CONFIG: &str = r#"
[grid]
frequency_hz = 50
{all}
[[corridor]]
name = "Skarn-Velm"
thin_mw = 200
from = { bus = "Skarn", nominal_kv = 400, stored_energy_mws = 60000, source = { x_ohm = 20, spread = 0.5 } }
to = { bus = "Velm", nominal_kv = 400, source = { x_ohm = 10, spread = 0.5 } }
fault = { kind = "three-phase", at = 0.1, clear_ms = 100 }
circuit = [{ name = "SV1", r_ohm = 3, x_ohm = 60, b_us = 400 }, { name = "SV2", r_ohm = 3, x_ohm = 60, b_us = 400 }]
{first}
[[corridor]]
name = "Velm-Oster"
from = { bus = "Velm", nominal_kv = 400, source = { x_ohm = 10 } }
to = { bus = "Oster", nominal_kv = 400, source = { x_ohm = 0 } }
circuit = [{ name = "VO1", r_ohm = 3.1, x_ohm = 35.0, b_us = 420 }]
"#;

/// The text of a configuration with these alarms for all, and for the first corridor.
pub fn text(all: &str, first: &str) -> String {
    CONFIG.replace("{all}", all).replace("{first}", first)
}

/// A configuration with these alarms for all, and for the first corridor.
pub fn config(all: &str, first: &str) -> Config {
    Config::parse(&text(all, first), "bed.toml").unwrap_or_else(|errors| panic!("{errors}"))
}

pub fn at(seconds: i64) -> DateTime<Utc> {
    "2031-03-14T05:00:00Z".parse::<DateTime<Utc>>().unwrap() + TimeDelta::seconds(seconds)
}

/// A healthy corridor at a time.
pub fn healthy(seconds: i64) -> Assessment {
    let source = |bus: &str, x_ohm: f64| SourceRecord {
        bus: bus.into(),
        e_kv: Some(420.0),
        angle_deg: Some(10.0),
        r_ohm: 0.0,
        x_ohm,
        r_sd: 0.5,
        x_sd: 0.5 * x_ohm,
        basis: Basis::Configured,
        steps: 0,
    };
    Assessment {
        time: at(seconds),
        corridor: "Skarn-Velm".into(),
        state: State::Ample,
        exporter: Some("Skarn".into()),
        transfer_mw: Some(1000.0),
        bus_angle_deg: Some(10.0),
        internal_angle_deg: Some(20.0),
        swing_angle_deg: Some(22.0),
        sources: [source("Skarn", 20.0), source("Velm", 10.0)],
        fit: FitRecord {
            chi2: Some(5.0),
            dof: 9,
            limit: Some(20.0),
            suspects: Vec::new(),
            missing: Vec::new(),
            assumed: Vec::new(),
        },
        intact: Some(Intact {
            peak_mw: 3000.0,
            angle_margin_deg: 60.0,
            loading_pct: Some(50.0),
            loaded_circuit: Some("SV1".into()),
            limit_mw: IntactLimits::default(),
        }),
        outages: vec![OutageRecord {
            name: "SV1".into(),
            separates: false,
            peak_mw: Some(2000.0),
            angle_deg: Some(30.0),
            angle_margin_deg: Some(50.0),
            swing_peak_deg: Some(60.0),
            area_margin: Some(0.6),
            critical_ms: Some(300.0),
            loading_pct: Some(70.0),
            loaded_circuit: Some("SV2".into()),
            kv: None,
            limit_mw: OutageLimits::default(),
            picture: None,
        }],
        headroom_mw: Some(1000.0),
        headroom_sd_mw: Some(10.0),
        binding: None,
        actions: Vec::new(),
        reclose: Vec::new(),
        minutes_to_thin: None,
        minutes_to_spent: None,
        thin_mw: 200.0,
        switches: [].into(),
        step: None,
        detail: None,
    }
}

/// The same with a headroom.
pub fn headroom(seconds: i64, headroom_mw: f64) -> Assessment {
    Assessment { headroom_mw: Some(headroom_mw), ..healthy(seconds) }
}

/// The same without a state.
pub fn blind(seconds: i64) -> Assessment {
    Assessment { state: State::Blind, transfer_mw: None, headroom_mw: None, outages: Vec::new(), ..healthy(seconds) }
}

/// An open circuit with an angle across it.
pub fn open(circuit: &str, angle_deg: f64) -> Reclose {
    Reclose {
        circuit: circuit.into(),
        angle_deg: Some(angle_deg),
        voltage_pct: Some(1.0),
        allowed: Some(angle_deg < 30.0),
        transfer_to_fit_mw: None,
    }
}

/// An alarm of the first corridor.
pub fn id(board: &Board, name: &str) -> AlarmId {
    let found = board.alarms().find(|(id, alarm)| id.corridor == 0 && *alarm.definition.name == *name);
    found.unwrap_or_else(|| panic!("no alarm {name}")).0
}

/// What happened, in short: seconds, event, state reached.
pub fn short(transitions: &[Transition]) -> Vec<(i64, String, &'static str, &'static str)> {
    let short = |t: &Transition| ((t.time - at(0)).num_seconds(), t.alarm.to_string(), t.event.word(), t.to.word());
    transitions.iter().map(short).collect()
}
