// Invented assessments whose numbers fit each other: a lossless corridor of three circuits between two sources.
use std::{f64::consts::PI, sync::Arc};

use chrono::{DateTime, TimeDelta, Utc};
use tautline::{
    desk::{
        Action, Assessment, Basis, Binding, BusDetail, CircuitDetail, Criterion, Detail, FitRecord, Intact,
        IntactLimits, Learned, OutageLimits, OutageRecord, Reclose, SourceRecord, State, Switch, SwitchKind,
    },
    grid::{
        Bank, Bus, Circuit, ConfiguredSource, Corridor, Fault, FaultKind, Grid, Line, Requirements, Side,
        SynchronismCheck,
    },
    margin::{OutagePicture, Picture, PowerAngle},
    source::{Moved, SpreadPoint, Step},
};

const CIRCUITS: [&str; 3] = ["SV1", "SV2", "SV3"];
const PEAK_MW: f64 = 3600.0;
const M_MW_S2: f64 = 120.0;
const CLEAR_S: f64 = 0.1;

/// So many seconds into the sample day.
pub fn time(second: i64) -> DateTime<Utc> {
    "2031-03-14T05:00:00Z".parse::<DateTime<Utc>>().unwrap() + TimeDelta::seconds(second)
}

/// The corridors by these names, all alike.
pub fn grid(names: &[&str]) -> Arc<Grid> {
    let bus = |name: &str, min_kv| Bus { name: name.into(), nominal_kv: 400.0, min_kv, load: None };
    let side = Side {
        stored_energy_mws: Some(60_000.0),
        source: ConfiguredSource { r_ohm: 1.5, x_ohm: 22.0, spread: 0.3, swing_x_ohm: 9.0 },
    };
    let circuit = |name: &&str| Circuit {
        name: (*name).into(),
        between: [0, 1],
        line: Line::PerKm { length_km: 240.0, r_ohm_per_km: 0.028, x_ohm_per_km: 0.31, b_us_per_km: 3.7 },
        rating_a: Some(1900.0),
        short_time_rating_a: Some(2300.0),
        banks: if *name == "SV2" { vec![Bank { name: "SV2-SC".into(), x_ohm: 26.0, at: 0.5 }] } else { Vec::new() },
    };
    let corridors = names.iter().map(|name| Corridor {
        name: (*name).into(),
        buses: vec![bus("Skarn", Some(370.0)), bus("Velm", None)],
        sides: [side, side],
        circuits: CIRCUITS.iter().map(circuit).collect(),
        outages: Vec::new(),
        fault: Some(Fault { kind: FaultKind::ThreePhase, at: 0.1, clear_ms: CLEAR_S * 1000.0 }),
        require: Requirements { angle_margin_deg: 30.0, area_margin: 0.2, ..Requirements::default() },
        reclose: SynchronismCheck::default(),
        thin_mw: 100.0,
        state_spreads: 0.0,
    });
    Arc::new(Grid { frequency_hz: 50.0, corridors: corridors.collect() })
}

/// A corridor that carries so many MW.
pub fn carrying(name: &str, transfer_mw: f64) -> Assessment {
    let curve = PowerAngle { mean_mw: 0.0, amplitude_mw: PEAK_MW, shift_rad: 0.0 };
    let angle_rad = (transfer_mw / PEAK_MW).asin();
    let picture = Picture { curve, p_m_mw: transfer_mw, angle_rad };
    let outages: Vec<_> = [("SV1", 2750.0), ("SV2", 2600.0), ("SV3", 2750.0), ("SV2-SC", 3300.0)]
        .map(|(outage, peak_mw)| judged(outage, peak_mw, &picture))
        .into();
    let (binding, limit_mw) = outages
        .iter()
        .flat_map(|outage| {
            let limits = outage.limit_mw;
            [(Criterion::Angle, limits.angle), (Criterion::Area, limits.area), (Criterion::Loading, limits.loading)]
                .map(|(criterion, limit)| {
                    let binding = Binding { outage: Some(outage.name.clone()), criterion };
                    (binding, limit.unwrap_or(f64::INFINITY))
                })
        })
        .min_by(|one, other| one.1.total_cmp(&other.1))
        .unwrap();
    let headroom = limit_mw - transfer_mw;
    Assessment {
        time: time(0),
        corridor: name.into(),
        state: state_of(headroom),
        exporter: Some("Skarn".into()),
        transfer_mw: Some(transfer_mw),
        bus_angle_deg: Some(0.45 * angle_rad.to_degrees()),
        internal_angle_deg: Some(0.9 * angle_rad.to_degrees()),
        swing_angle_deg: Some(angle_rad.to_degrees()),
        sources: [source("Skarn", 22.0, Basis::Learned, 17), source("Velm", 14.0, Basis::Configured, 0)],
        fit: FitRecord {
            chi2: Some(3.12),
            dof: 9,
            limit: Some(21.67),
            suspects: Vec::new(),
            missing: Vec::new(),
            assumed: vec!["Velm: no load given, 0 MW".into()],
        },
        intact: Some(Intact {
            peak_mw: PEAK_MW,
            angle_margin_deg: 90.0 - 0.9 * angle_rad.to_degrees(),
            loading_pct: Some(transfer_mw / 40.0),
            loaded_circuit: Some("SV2".into()),
            limit_mw: IntactLimits { angle: Some(3117.7), loading: Some(3900.0), voltage: None },
        }),
        outages,
        headroom_mw: Some(headroom),
        headroom_sd_mw: Some(35.4),
        binding: Some(binding),
        actions: vec![Action { action: "close SV3".into(), headroom_mw: Some(headroom + 178.0) }],
        reclose: Vec::new(),
        minutes_to_thin: None,
        minutes_to_spent: None,
        thin_mw: 100.0,
        switches: switches(),
        step: None,
        detail: Some(Arc::new(detail(transfer_mw, picture))),
    }
}

fn switches() -> Arc<[Switch]> {
    let switch = |name: &str, kind| Switch { name: name.into(), kind, on: true };
    let circuit = |name| switch(name, SwitchKind::Circuit);
    [circuit("SV1"), circuit("SV2"), switch("SV2-SC", SwitchKind::Bank), circuit("SV3")].into()
}

/// The same corridor with a headroom set by hand.
pub fn at(second: i64, headroom_mw: f64) -> Assessment {
    let mut assessment = carrying("Skarn-Velm", 1284.2);
    assessment.time = time(second);
    assessment.headroom_mw = Some(headroom_mw);
    assessment.state = state_of(headroom_mw);
    assessment
}

/// Room for plenty.
pub fn ample() -> Assessment {
    carrying("Skarn-Velm", 1284.2)
}

/// A circuit open, little room left, and less by the minute.
pub fn thin() -> Assessment {
    let mut assessment = carrying("Skarn-Velm", 1870.0);
    assessment.minutes_to_thin = Some(0.0);
    assessment.minutes_to_spent = Some(12.4);
    assessment.reclose = vec![Reclose {
        circuit: "SV3".into(),
        angle_deg: Some(34.6),
        voltage_pct: Some(1.4),
        allowed: Some(false),
        transfer_to_fit_mw: Some(1640.0),
    }];
    assessment.fit.suspects = vec!["SV1.to.mw".into()];
    let detail = Arc::make_mut(assessment.detail.as_mut().unwrap());
    detail.circuits[2].closed = false;
    detail.circuits[1].banks[0].1 = false;
    assessment
}

/// More than the next outage allows.
pub fn spent() -> Assessment {
    carrying("Orrin-Tesk", 2290.0)
}

/// Too little measured.
pub fn blind() -> Assessment {
    let mut assessment = carrying("Hald-Brenn", 900.0);
    assessment.state = State::Blind;
    assessment.exporter = None;
    assessment.transfer_mw = None;
    assessment.bus_angle_deg = None;
    assessment.internal_angle_deg = None;
    assessment.swing_angle_deg = None;
    for source in &mut assessment.sources {
        (source.e_kv, source.angle_deg) = (None, None);
    }
    assessment.fit = FitRecord {
        chi2: None,
        dof: 0,
        limit: None,
        suspects: Vec::new(),
        missing: vec!["Velm.kv".into(), "SV1.to.mw".into(), "SV1.to.mvar".into()],
        assumed: Vec::new(),
    };
    (assessment.intact, assessment.detail, assessment.binding) = (None, None, None);
    (assessment.headroom_mw, assessment.headroom_sd_mw) = (None, None);
    assessment.outages.clear();
    assessment.actions.clear();
    assessment
}

fn state_of(headroom_mw: f64) -> State {
    if headroom_mw <= 0.0 {
        State::Spent
    } else if headroom_mw < 100.0 {
        State::Thin
    } else {
        State::Ample
    }
}

fn judged(name: &str, peak_mw: f64, before: &Picture) -> OutageRecord {
    let curve = PowerAngle { mean_mw: 0.0, amplitude_mw: peak_mw, shift_rad: 0.0 };
    let fault = (!name.ends_with("SC")).then_some(PowerAngle { amplitude_mw: 0.3 * PEAK_MW, ..curve });
    let p_m = before.p_m_mw;
    let equilibrium = (p_m < peak_mw).then(|| (p_m / peak_mw).asin());
    let acceleration = fault.map_or(0.0, |fault| (p_m - fault.at(before.angle_rad)) / M_MW_S2);
    let cleared = before.angle_rad + 0.5 * acceleration * CLEAR_S.powi(2) * 2.0;
    let potential = |from: f64, to: f64| peak_mw * (from.cos() - to.cos()) - p_m * (to - from);
    let swing = equilibrium.map(|equilibrium| {
        let tipping = PI - equilibrium;
        let kinetic = fault.map_or(0.0, |fault| {
            p_m * (cleared - before.angle_rad) - fault.amplitude_mw * (before.angle_rad.cos() - cleared.cos())
        });
        let energy = kinetic + potential(equilibrium, cleared);
        let critical = potential(equilibrium, tipping);
        let peak = (energy < critical).then(|| {
            let (mut low, mut high) = (cleared.max(equilibrium), tipping);
            for _ in 0..60 {
                let middle = 0.5 * (low + high);
                if potential(equilibrium, middle) < energy { low = middle } else { high = middle }
            }
            low
        });
        (tipping, peak, (critical - energy) / critical.max(energy))
    });
    let margin = equilibrium.map(|angle| 90.0 - 0.9 * angle.to_degrees());
    OutageRecord {
        name: name.into(),
        separates: false,
        peak_mw: Some(peak_mw),
        angle_deg: equilibrium.map(|angle| 0.9 * angle.to_degrees()),
        angle_margin_deg: margin,
        swing_peak_deg: swing.and_then(|(_, peak, _)| peak).map(f64::to_degrees),
        area_margin: Some(swing.map_or(-1.0, |(_, _, area)| area)),
        critical_ms: fault.map(|_| (120.0 + 0.4 * (peak_mw - p_m)).max(0.0)),
        loading_pct: equilibrium.map(|_| p_m / 28.0),
        loaded_circuit: equilibrium.map(|_| if name == "SV2" { "SV1" } else { "SV2" }.into()),
        kv: equilibrium.map(|_| vec![("Skarn".into(), 398.1), ("Velm".into(), 391.4)]),
        limit_mw: OutageLimits {
            angle: Some(0.745 * peak_mw),
            area: Some(0.795 * peak_mw),
            loading: Some(2583.6),
            voltage: (peak_mw < 2700.0).then_some(2769.4),
            separation: None,
        },
        picture: Some(OutagePicture {
            curve,
            fault,
            cleared_rad: cleared,
            equilibrium_rad: equilibrium,
            tipping_rad: swing.map(|(tipping, ..)| tipping),
            swing_peak_rad: swing.and_then(|(_, peak, _)| peak),
        }),
    }
}

fn source(bus: &str, x_ohm: f64, basis: Basis, steps: u64) -> SourceRecord {
    SourceRecord {
        bus: bus.into(),
        e_kv: Some(431.02),
        angle_deg: Some(20.14),
        r_ohm: 1.5,
        x_ohm,
        r_sd: 0.71,
        x_sd: 0.3 * x_ohm,
        basis,
        steps,
    }
}

/// An hour of learning, in which both sides moved and a circuit was switched.
fn learned() -> Learned {
    let step = |second, moved, de_kv, probability| Step {
        time: time(second),
        moved,
        probability,
        de_kv,
        topology_changed: moved == Moved::Neither,
        explained: moved != Moved::Both,
        widened: false,
    };
    Learned {
        steps: vec![
            step(-60_000, Moved::From, [2.1, 0.1], 0.97),
            step(1200, Moved::To, [0.0, -12.41], 0.994),
            step(2400, Moved::Neither, [0.1, 0.0], 0.88),
            step(3480, Moved::Both, [1.5, 2.26], 0.61),
        ],
        history: (0..12)
            .map(|five| SpreadPoint {
                time: time(300 * five),
                x_ohm: [22.0, 14.0],
                x_sd_ohm: [6.6 / (1.0 + 0.3 * five as f64), 4.2],
            })
            .collect(),
    }
}

fn detail(transfer_mw: f64, picture: Picture) -> Detail {
    let bus = |name: &str, kv, deg| BusDetail { name: name.into(), kv, deg, load_mw: 800.0, load_mvar: 120.0 };
    let circuit = |name: &&str| CircuitDetail {
        name: (*name).into(),
        closed: true,
        from_mw: transfer_mw / 3.0,
        loading_pct: Some(transfer_mw / 40.0),
        banks: if *name == "SV2" { vec![("SV2-SC".into(), true)] } else { Vec::new() },
    };
    Detail {
        buses: vec![bus("Skarn", 408.02, 14.1), bus("Velm", 402.4, 0.0)],
        circuits: CIRCUITS.iter().map(circuit).collect(),
        picture,
        learned: Arc::new(learned()),
    }
}
