//! Learning all the way that a user's data goes: from the meters of drills with random truths through frames, fit and learner
//! to the headroom. (`tests/source` tries the learner alone, on a simulator of its own.)

mod course;
mod hostile;
mod orrin_tesk;
mod statistics;

use course::Course;
use statistics::Statistics;
use tautline::drill::{Invention, RandomSteps, Scenario, Wander};

/// A day of one corridor, priors off by up to 40 %. Every other one has a trip, every other pair poor telemetry.
fn mixed(seed: u64) -> Invention {
    Invention { seed, with_trip: seed.is_multiple_of(2), with_slow_telemetry: seed % 4 < 2, ..Invention::default() }
}

/// The same through poor telemetry, with both sides moving at once every hour.
fn coincident(seed: u64) -> Invention {
    Invention { with_slow_telemetry: true, with_coincident_steps: true, ..mixed(seed) }
}

#[test]
fn drills_come_near_their_truth() {
    let drills = Statistics::of((0..40).map(|seed| Course::new(&mixed(seed))));
    println!("{drills}");
    assert!(drills.error(0.5) <= 0.05 && drills.within(0.12) >= 0.9, "{drills}");
    assert!(drills.within_two_spreads() >= 0.85 && drills.headroom_within_two_spreads() >= 0.85, "{drills}");
    assert!(drills.right_side() >= 0.95, "{drills}");
    assert!(drills.headroom_error_left(0.5) <= 0.5, "{drills}");
}

#[test]
fn drills_with_coincident_steps_come_near_their_truth() {
    let drills = Statistics::of((100..140).map(|seed| Course::new(&coincident(seed))));
    println!("{drills}");
    assert!(drills.error(0.5) <= 0.05 && drills.within(0.12) >= 0.9, "{drills}");
    assert!(drills.within_two_spreads() >= 0.75 && drills.headroom_within_two_spreads() >= 0.75, "{drills}");
    assert!(drills.right_side() >= 0.95, "{drills}");
    assert!(drills.headroom_error_left(0.5) <= 0.5, "{drills}");
}

/// What a kind of drills is called, and how one is made.
type Kind = (&'static str, fn(u64) -> Course);

/// The long run: `cargo test --release --test learning long_run -- --ignored --nocapture`.
#[test]
#[ignore = "minutes; prints the statistics of 200 drills of each kind"]
fn long_run() {
    let kinds: [Kind; 11] = [
        ("mixed", |seed| Course::new(&mixed(seed))),
        ("coincident", |seed| Course::new(&coincident(seed))),
        ("good telemetry", |seed| Course::new(&Invention { with_slow_telemetry: false, ..mixed(seed) })),
        ("poor telemetry", |seed| Course::new(&Invention { with_slow_telemetry: true, ..mixed(seed) })),
        ("poor telemetry, twelve hours", |seed| {
            Course::new(&Invention { with_slow_telemetry: true, hours: 12.0, ..mixed(seed) })
        }),
        ("poor telemetry, a frame in 10 s", |seed| {
            Course::new(&Invention { with_slow_telemetry: true, interval_s: 10.0, ..mixed(seed) })
        }),
        ("poor telemetry, transfer wandering by 100 MW in 3 minutes", |seed| {
            poor(seed, |drill| drill.corridors[0].wander = Some(Wander { sd: 100.0, memory_s: 180.0 }))
        }),
        ("poor telemetry, voltages wandering by 0.5 kV in 2 minutes", |seed| {
            poor(seed, |drill| wander(drill, Wander { sd: 0.5, memory_s: 120.0 }))
        }),
        ("poor telemetry, voltages wandering by 2 kV in 30 minutes", |seed| {
            poor(seed, |drill| wander(drill, Wander { sd: 2.0, memory_s: 1800.0 }))
        }),
        ("poor telemetry, a step an hour on each side", |seed| {
            poor(seed, |drill| steps(drill, RandomSteps { per_hour: 1.0, kv: [1.5, 6.0] }))
        }),
        ("poor telemetry, small steps", |seed| {
            poor(seed, |drill| steps(drill, RandomSteps { per_hour: 3.0, kv: [0.3, 3.0] }))
        }),
    ];
    for (name, kind) in kinds {
        println!("{name}: {}", Statistics::of((1000..1200).map(kind)));
    }
}

fn poor(seed: u64, change: impl FnOnce(&mut Scenario)) -> Course {
    Course::new(&Invention { with_slow_telemetry: true, ..mixed(seed) }).changed(change)
}

fn wander(drill: &mut Scenario, wander: Wander) {
    for side in &mut drill.corridors[0].sides {
        side.wander = Some(wander);
    }
}

fn steps(drill: &mut Scenario, steps: RandomSteps) {
    for side in &mut drill.corridors[0].sides {
        side.steps = Some(steps);
    }
}
