use std::sync::Arc;

use chrono::TimeDelta;

use super::{Definition, Kind, Priority, Suppression};
use crate::grid::Corridor;

/// Deadband of the headroom as a part of the thin threshold.
const HEADROOM_DEADBAND: f64 = 0.1;

/// Name and kind of the alarms that every corridor has unless the configuration changes them.
pub const BUILT_IN: [(&str, Kind); 11] = [
    ("headroom thin", Kind::HeadroomMw),
    ("headroom spent", Kind::HeadroomMw),
    ("time short", Kind::MinutesLeft),
    ("clearing reserve", Kind::ClearingReserve),
    ("standing angle", Kind::StandingAngle),
    ("overload", Kind::Loading),
    ("data silent", Kind::DataAge),
    ("blind", Kind::Blind),
    ("suspect meter", Kind::Suspects),
    ("source widened", Kind::SourceWidened),
    ("source moved", Kind::SourceMoved),
];

/// The built-in definitions for a corridor, in the order of [`BUILT_IN`].
///
/// Angle and area margins have none: what is required of them is in the headroom already.
pub fn built_in(corridor: &Corridor) -> Vec<Definition> {
    use Priority::{High, Low, Medium, Urgent};
    let thin_mw = corridor.thin_mw;
    let max_angle_deg = corridor.reclose.max_angle_deg;
    let headroom_deadband = HEADROOM_DEADBAND * thin_mw;
    // Priority, setpoint, deadband, on-delay and off-delay in seconds.
    let values = [
        (High, thin_mw, headroom_deadband, 15, 120),
        (Urgent, 0.0, headroom_deadband, 5, 120),
        (Medium, 20.0, 20.0, 60, 600),
        (Medium, 10.0, 5.0, 15, 120),
        (Low, max_angle_deg, 0.1 * max_angle_deg, 30, 300),
        (High, 100.0, 3.0, 15, 120),
        (High, 60.0, 0.0, 0, 30),
        (High, 1.0, 0.0, 10, 60),
        (Low, 1.0, 0.0, 60, 300),
        (Low, 90.0, 20.0, 0, 600),
        (Low, 50.0, 10.0, 60, 600),
    ];
    let define = |((name, kind), (priority, setpoint, deadband, on_s, off_s)): (&(&str, Kind), _)| Definition {
        name: (*name).into(),
        kind: *kind,
        priority,
        setpoint,
        deadband,
        on_delay: TimeDelta::seconds(on_s),
        off_delay: TimeDelta::seconds(off_s),
        message: message(name, *kind),
        action: kind.usual_action().into(),
        suppress_while: Suppression::default(),
    };
    BUILT_IN.iter().zip(values).map(define).collect()
}

fn message(name: &str, kind: Kind) -> Arc<str> {
    match name {
        "headroom spent" => "The next outage would not be survived".into(),
        _ => kind.usual_message().into(),
    }
}
