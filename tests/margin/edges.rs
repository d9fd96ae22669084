//! Corridors at the edge of what a configuration allows.

use tautline::{
    desk::{Assessment, State},
    network::C64,
};

use super::bench::{Values, assess, outage};

/// Two circuits without losses, the first with half of its reactance compensated in the middle of it.
fn half_compensated(fault_at: f64, stored_energy: f64) -> Assessment {
    let config = format!(
        r#"
        [grid]
        frequency_hz = 60
        [[corridor]]
        name = "Edge"
        [corridor.from]
        bus = "A"
        nominal_kv = 1
        stored_energy_mws = {stored_energy}
        source = {{ r_ohm = 0, x_ohm = 0.3 }}
        [corridor.to]
        bus = "B"
        nominal_kv = 1
        source = {{ r_ohm = 0, x_ohm = 0.1 }}
        [[corridor.circuit]]
        name = "1"
        r_ohm = 0
        x_ohm = 0.4
        b_us = 0
        series_capacitors = [{{ name = "C", x_ohm = 0.2, at = 0.5 }}]
        [[corridor.circuit]]
        name = "2"
        r_ohm = 0
        x_ohm = 0.4
        b_us = 0
        [corridor.fault]
        kind = "three-phase"
        at = {fault_at}
        clear_ms = 50
        "#
    );
    let bus = [C64::from_polar(1.0, 0.1), C64::new(1.0, 0.0)];
    let mut values = Values::from([("A.kv".into(), 1.0), ("B.kv".into(), 1.0)]);
    for (name, x) in [("1", 0.2), ("2", 0.4)] {
        let current = (bus[0] - bus[1]) / C64::new(0.0, x);
        for (end, power) in [("from", bus[0] * current.conj()), ("to", -bus[1] * current.conj())] {
            values.insert(format!("{name}.{end}.mw"), power.re);
            values.insert(format!("{name}.{end}.mvar"), power.im);
        }
    }
    assess(&config, &values)
}

/// Between the fault and the far bus, bank and line cancel each other: that bus is shorted.
#[test]
fn a_fault_shorts_the_bus_that_a_bank_brings_to_it() {
    let [middle, end] = [0.5, 1.0].map(|at| half_compensated(at, 5.0));
    let [middle, end] = [&middle, &end].map(|assessment| outage(assessment, "1"));
    let close = |a: Option<f64>, b: Option<f64>| a.zip(b).is_some_and(|(a, b)| (a - b).abs() < 1e-9 * b.abs());
    assert!(close(middle.area_margin, end.area_margin), "{middle:?}");
    assert!(close(middle.critical_ms, end.critical_ms), "{middle:?}");
    assert!(close(middle.limit_mw.area, end.limit_mw.area), "{middle:?}");
}

/// However light a machine is, judging it ends, and never well.
#[test]
fn a_swing_too_quick_to_be_followed_is_not_survived() {
    for stored_energy in [1e-6, 1e-9, 1e-100, 1e-300] {
        let assessment = half_compensated(0.0, stored_energy);
        assert_eq!(assessment.state, State::Spent, "{stored_energy}");
        assert_eq!(outage(&assessment, "1").area_margin, Some(-1.0), "{stored_energy}");
    }
}
