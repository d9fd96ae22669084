//! No snapshot and no corridor makes it panic, hang or return what is not a number.

use chrono::DateTime;
use proptest::prelude::*;
use tautline::{
    config::MeasurementSettings,
    feed::{Channels, Quality, Reading, Snapshot},
    fit::{Fit, Fitter, Standing},
    grid::{Bank, Circuit, Corridor, Line, Load},
    network::C64,
};

use crate::world::{circuit, config, corridor};

fn value() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => -2000.0..2000.0,
        3 => 380.0..420.0,
        1 => Just(0.0),
        1 => Just(1.0),
        1 => -1e300..1e300,
        1 => Just(f64::NAN),
        1 => Just(f64::INFINITY),
        1 => Just(f64::MIN_POSITIVE),
    ]
}

fn reading() -> impl Strategy<Value = Option<Reading>> {
    let quality = prop_oneof![5 => Just(Quality::Good), 1 => Just(Quality::Questionable), 1 => Just(Quality::Invalid)];
    prop::option::weighted(0.8, (value(), quality).prop_map(|(value, quality)| Reading { value, quality }))
}

fn any_line() -> impl Strategy<Value = Line> {
    let x = prop_oneof![4 => 1.0..200.0, 1 => 1e-9..1e-3, 1 => 0.01..1.0];
    let b = prop_oneof![3 => 0.0..2000.0, 1 => Just(0.0)];
    (0.0..10.0, x, b, any::<bool>()).prop_map(|(r, x, b, per_km)| {
        if per_km {
            Line::PerKm { length_km: 50.0, r_ohm_per_km: r / 50.0, x_ohm_per_km: x / 50.0, b_us_per_km: b / 50.0 }
        } else {
            Line::Totals { r_ohm: r, x_ohm: x, b_us: b }
        }
    })
}

fn any_circuit(index: usize, buses: usize) -> impl Strategy<Value = Circuit> {
    let rating = prop::option::of(100.0..4000.0);
    let banks = prop::collection::vec((1e-3..300.0, 0.0..=1.0), 0..3);
    (0..buses, 1..buses, any_line(), rating, banks).prop_map(move |(first, hop, line, rating_a, banks)| {
        let mut made = circuit(&format!("L{index}"), [first, (first + hop) % buses], 50.0);
        (made.line, made.rating_a) = (line, rating_a);
        let bank = |(n, (x_ohm, at))| Bank { name: format!("L{index}-{n}").into(), x_ohm, at };
        made.banks = banks.into_iter().enumerate().map(bank).collect();
        made
    })
}

fn any_corridor() -> impl Strategy<Value = Corridor> {
    (0..=5usize, 1..=6usize, prop_oneof![Just(400.0), Just(1.0)], any::<bool>())
        .prop_flat_map(|(stations, circuits, kv, load)| {
            let circuits: Vec<_> = (0..circuits).map(|index| any_circuit(index, 2 + stations)).collect();
            (Just((stations, kv, load)), circuits)
        })
        .prop_map(|((stations, kv, load), circuits)| {
            let names = ["S0", "S1", "S2", "S3", "S4"];
            let mut made = corridor(&names[..stations], circuits);
            for bus in &mut made.buses {
                bus.nominal_kv = kv;
                bus.load = load.then_some(Load { mw: 100.0, mvar: -20.0 });
            }
            made
        })
}

fn assert_sane(fit: &Fit) {
    let (Standing::Joined(state) | Standing::Parted { state, .. }) = &fit.standing else {
        assert_eq!((fit.chi2, fit.dof), (None, 0));
        return;
    };
    let finite = |c: &C64| c.re.is_finite() && c.im.is_finite();
    assert!(state.voltage.iter().chain(&state.load).all(finite));
    assert!(fit.chi2.is_some_and(|chi2| chi2.is_finite() && chi2 >= 0.0));
    for (voltage, live) in state.voltage.iter().zip(&state.live) {
        assert!(*live || *voltage == C64::new(0.0, 0.0));
    }
    assert_eq!(fit.limit.is_some(), fit.dof > 0);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, ..ProptestConfig::default() })]

    #[test]
    fn any_snapshot_of_any_corridor_is_survived(
        corridor in any_corridor(),
        readings in prop::collection::vec(reading(), 120),
        truncate in prop::option::weighted(0.1, 0..100usize),
    ) {
        let channels = Channels::new(&config(&corridor));
        let mut readings = readings;
        readings.resize(channels.len(), None);
        readings.truncate(truncate.unwrap_or(usize::MAX));
        let snapshot = Snapshot { time: DateTime::UNIX_EPOCH, readings, aside: None };
        let mut fitter = Fitter::new(corridor.into(), &channels, &MeasurementSettings::default());
        let fit = fitter.fit(&snapshot);
        assert_sane(&fit);
        prop_assert_eq!(fit, fitter.fit(&snapshot));
    }
}
