//! Feeds that are rare, dense, broken, or mean.

use chrono::TimeDelta;
use nalgebra::{Complex, Matrix2};
use proptest::prelude::*;
use tautline::{
    config::LearningSettings,
    source::{Learner, Moved, Observation},
};

use crate::simulator::{Drill, Simulator};

fn learner(simulator: &Simulator) -> Learner {
    Learner::new(&simulator.configured, LearningSettings::default())
}

/// Errors of both reactances in their own spreads.
fn off(simulator: &Simulator, learner: &Learner) -> [f64; 2] {
    let (mean, sd) = (learner.estimate().mean, learner.estimate().sd());
    [0, 1].map(|side| (mean[2 * side + 1] - simulator.truth[side].im) / sd[2 * side + 1])
}

#[test]
fn any_frame_rate_learns() {
    for (frame_s, hours) in [(0.02, 2.0), (0.1, 6.0), (1.0, 24.0), (5.0, 24.0), (10.0, 24.0)] {
        let mut simulator = Simulator::new(Drill { hours, frame_s, ..Drill::day(3) });
        let mut learner = learner(&simulator);
        let before = learner.estimate().sd();
        for seen in simulator.by_ref() {
            learner.observe(&seen);
        }
        assert!(learner.estimate().steps.iter().all(|s| *s > 1), "{frame_s} s: {:?}", learner.estimate().steps);
        let after = learner.estimate().sd();
        assert!(after[1] < 0.8 * before[1] && after[3] < 0.8 * before[3], "{frame_s} s: {after}");
        assert!(off(&simulator, &learner).iter().all(|o| o.abs() < 3.0), "{frame_s} s");
    }
}

#[test]
fn gaps_bad_fits_and_nonsense_slow_learning_and_no_more() {
    for seed in 0..4 {
        let mut simulator = Simulator::new(Drill::day(seed));
        let mut learner = learner(&simulator);
        let mut frames = 0_usize;
        for mut seen in simulator.by_ref() {
            frames += 1;
            let in_gap = frames % 3600 < 100;
            match frames % 97 {
                0 => seen.fit_ok = false,
                31 => seen.kv[0] = f64::NAN,
                32 => seen.mw[1] = f64::INFINITY,
                33 => seen.y = Matrix2::zeros(),
                60 => seen.time -= TimeDelta::hours(1),
                _ => {}
            }
            if !in_gap {
                learner.observe(&seen);
            }
        }
        assert!(learner.estimate().steps.iter().all(|s| *s > 20), "{:?}", learner.estimate().steps);
        assert!(off(&simulator, &learner).iter().all(|o| o.abs() < 3.0), "seed {seed}");
    }
}

#[test]
fn coincident_steps_get_no_foothold() {
    for seed in 0..12 {
        let drill = Drill { steps_per_hour: 0.0, coincident_per_hour: 6.0, trip: false, ..Drill::day(seed) };
        let mut simulator = Simulator::new(drill);
        let mut learner = learner(&simulator);
        while let Some(seen) = simulator.next() {
            learner.observe(&seen);
            let (mean, sd) = (learner.estimate().mean, learner.estimate().sd());
            for side in 0..2 {
                let (x, sd, truth) = (mean[2 * side + 1], sd[2 * side + 1], simulator.truth[side].im);
                assert!(mean[2 * side] >= 0.0 && x > 0.0, "seed {seed}: {mean}");
                assert!(x > 0.4 * truth || sd > 0.3 * x, "seed {seed}, side {side}: {x:.1} ± {sd:.1} for {truth:.1}");
            }
        }
    }
}

#[test]
fn a_pinned_source_and_a_stiff_bus_stay_as_they_are() {
    let mut simulator = Simulator::new(Drill::day(5));
    simulator.configured[0].spread = 0.0;
    simulator.configured[1].x_ohm = 0.0;
    simulator.configured[1].r_ohm = 0.0;
    let mut learner = learner(&simulator);
    let before = *learner.estimate();
    for seen in simulator.by_ref() {
        learner.observe(&seen);
    }
    assert!(learner.steps().count() > 20);
    assert_eq!((learner.estimate().mean, learner.estimate().covariance), (before.mean, before.covariance));
}

#[test]
fn a_changed_grid_is_followed() {
    for (seed, factor) in [(1, 2.0), (2, 0.45), (3, 2.2)] {
        let mut simulator =
            Simulator::new(Drill { hours: 72.0, steps_per_hour: 10.0, trip: false, ..Drill::day(seed) });
        let mut learner = learner(&simulator);
        for seen in simulator.by_ref().take(43_200) {
            learner.observe(&seen);
        }
        let changed = simulator.truth[0] * factor;
        simulator.replace_source(0, changed);
        let mut widened = 0;
        for seen in simulator.by_ref() {
            widened += learner.observe(&seen).iter().filter(|step| step.widened).count();
        }
        let off = off(&simulator, &learner);
        println!("x {factor}: widened {widened} times, off by {off:.2?} spreads, {:.2}", learner.estimate().mean);
        assert!(off[0].abs() < 3.0, "seed {seed}: {off:?}");
    }
}

#[test]
fn disabled_learning_leaves_the_configuration() {
    let mut simulator = Simulator::new(Drill { hours: 3.0, ..Drill::day(1) });
    let mut learner =
        Learner::new(&simulator.configured, LearningSettings { enabled: false, ..LearningSettings::default() });
    let before = *learner.estimate();
    assert!(simulator.by_ref().all(|seen| learner.observe(&seen).is_none()));
    assert_eq!(*learner.estimate(), before);
}

#[test]
fn a_step_is_logged_with_its_size_and_side() {
    let mut simulator = Simulator::new(Drill { hours: 6.0, trip: false, ..Drill::day(9) });
    let mut learner = learner(&simulator);
    let steps: Vec<_> = simulator.by_ref().filter_map(|seen| learner.observe(&seen)).collect();
    let largest = simulator.steps.iter().filter(|s| s.time_s > 1800.0 && s.time_s < 21_000.0);
    let largest = largest
        .max_by(|a, b| a.de_kv[0].abs().max(a.de_kv[1].abs()).total_cmp(&b.de_kv[0].abs().max(b.de_kv[1].abs())));
    let largest = largest.unwrap();
    let at = |step: &tautline::source::Step| {
        let start: chrono::DateTime<chrono::Utc> = crate::simulator::START.parse().unwrap();
        (step.time - start).num_milliseconds() as f64 * 1e-3
    };
    let step = steps.iter().find(|step| (at(step) - largest.time_s).abs() < 5.0).unwrap();
    assert_eq!(step.moved, if largest.de_kv[0] == 0.0 { Moved::To } else { Moved::From });
    assert!((0..2).all(|k| (step.de_kv[k] - largest.de_kv[k]).abs() < 1.0), "{step:?} {largest:?}");
    assert_eq!(learner.steps().count(), steps.len());
}

proptest! {
    #[test]
    fn nothing_breaks_it(values in prop::collection::vec((any::<[f64; 6]>(), any::<[f64; 8]>(), 0_u64..3, -5_i64..100), 1..200)) {
        let source = tautline::grid::ConfiguredSource { r_ohm: 1.0, x_ohm: 20.0, spread: 0.3, swing_x_ohm: 0.0 };
        let mut learner = Learner::new(&[source; 2], LearningSettings { background_s: 1.0, ..LearningSettings::default() });
        let mut time = chrono::DateTime::UNIX_EPOCH;
        for (z, y, topology, seconds) in values {
            time += TimeDelta::seconds(seconds);
            learner.observe(&Observation {
                time,
                kv: [z[0], z[1]],
                mw: [z[2], z[3]],
                mvar: [z[4], z[5]],
                y: Matrix2::from_fn(|i, j| Complex::new(y[2 * i + j], y[4 + 2 * i + j])),
                topology,
                sigma: [0.6, 0.6, 3.0, 3.0, 3.0, 3.0],
                fit_ok: true,
            });
        }
        let estimate = learner.estimate();
        prop_assert!(estimate.mean.iter().chain(&estimate.covariance).all(|v| v.is_finite()));
        prop_assert!(estimate.mean[1] > 0.0 && estimate.mean[3] > 0.0);
    }
}
