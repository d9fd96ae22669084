//! Learning the sources: a recorded day, many drills with random truths, and hostile feeds.

mod corridor;
mod hostile;
mod kept;
mod orrin_tesk;
mod simulator;
mod statistics;

use nalgebra::{Matrix3, Vector3};
use simulator::Drill;
use statistics::Statistics;
use tautline::{config::LearningSettings, source::Learner};

#[test]
fn a_recorded_day_comes_to_the_truth() {
    let mut learner = Learner::new(&orrin_tesk::configured(), LearningSettings::default());
    for seen in orrin_tesk::day() {
        learner.observe(&seen);
    }
    let estimate = learner.estimate();
    for (side, truth) in orrin_tesk::TRUTH.into_iter().enumerate() {
        let (x, sd) = (estimate.mean[2 * side + 1], estimate.sd()[2 * side + 1]);
        println!("side {side}: {x:.2} ± {sd:.2}, truth {truth}");
        assert!((x - truth).abs() < 0.06 * truth && (x - truth).abs() < 2.0 * sd, "{x:.2} ± {sd:.2}, truth {truth}");
    }
}

/// The baseline: |V| = E − R·P/V − X·Q/V at one end, recursively, for E, R and X.
#[test]
fn least_squares_at_one_end_fails_on_the_same_day() {
    let day = orrin_tesk::day();
    for (side, truth) in orrin_tesk::TRUTH.into_iter().enumerate() {
        let mut state = Vector3::new(420.0, 1.5, 20.0);
        let mut covariance = Matrix3::from_diagonal(&Vector3::new(1e4, 1e2, 1e2));
        for seen in &day {
            let kv = seen.kv[side];
            let row = Vector3::new(1.0, -seen.mw[side] / kv, -seen.mvar[side] / kv);
            let gain = covariance * row / (0.16 + (row.transpose() * covariance * row)[0]);
            state += gain * (kv - row.dot(&state));
            covariance -= gain * (covariance * row).transpose();
        }
        let (x, sd) = (state[2], covariance[(2, 2)].sqrt());
        println!("side {side}: {x:.2} ± {sd:.2}, truth {truth}");
        assert!((x - truth).abs() > 0.1 * truth && (x - truth).abs() > 50.0 * sd, "{x:.2} ± {sd:.2}, truth {truth}");
    }
}

#[test]
fn drills_come_near_their_truth() {
    let drills = Statistics::of((0..40).map(Drill::day));
    println!("{drills}");
    assert!(drills.error(0.5) <= 0.05 && drills.within(0.12) >= 0.9, "{drills}");
    assert!(drills.within_two_spreads() >= 0.85, "{drills}");
    assert!(drills.right_side() >= 0.95 && drills.named() >= 0.95, "{drills}");
}

#[test]
fn drills_with_coincident_steps_come_near_their_truth() {
    let drills = Statistics::of((0..40).map(|seed| Drill { coincident_per_hour: 1.0, ..Drill::day(seed) }));
    println!("{drills}");
    assert!(drills.error(0.5) <= 0.05 && drills.within(0.12) >= 0.9, "{drills}");
    assert!(drills.within_two_spreads() >= 0.75, "{drills}");
    assert!(drills.right_side() >= 0.95 && drills.named() >= 0.95, "{drills}");
}

/// The long run: `cargo test --release --test source long_run -- --ignored --nocapture`.
#[test]
#[ignore = "minutes; prints the statistics of 300 drills of each kind"]
fn long_run() {
    type Kind = (&'static str, fn(u64) -> Drill);
    let kinds: [Kind; 8] = [
        ("clean telemetry", |s| Drill { skew: false, deadband: false, swing: false, trip: false, ..Drill::day(s) }),
        ("day", Drill::day),
        ("without trip", |s| Drill { trip: false, ..Drill::day(s) }),
        ("coincident", |s| Drill { coincident_per_hour: 1.0, ..Drill::day(s) }),
        ("coincident, without trip", |s| Drill { coincident_per_hour: 1.0, trip: false, ..Drill::day(s) }),
        ("twelve hours", |s| Drill { hours: 12.0, ..Drill::day(s) }),
        ("a frame in 10 s", |s| Drill { frame_s: 10.0, ..Drill::day(s) }),
        ("5 frames a second, twelve hours", |s| Drill { frame_s: 0.2, hours: 12.0, ..Drill::day(s) }),
    ];
    for (name, kind) in kinds {
        println!("{name}: {}", Statistics::of((1000..1300).map(kind)));
    }
}
