//! Rates, gaps, false meters, and sides that move together: they may slow learning, and no more.

use chrono::TimeDelta;
use rayon::prelude::*;
use tautline::{
    desk::{Assessment, Basis, CorridorDesk},
    drill::{FalseMeter, Gap, Invention, RandomSteps, Scenario, Span},
    feed::{End, Frame, Point, Quality, Quantity},
};

use crate::{course::Course, mixed, poor, steps};

/// Both reactances: error in their own spreads, and the spread relative to the truth.
fn off(course: &Course, desk: &CorridorDesk) -> [[f64; 2]; 2] {
    let estimate = desk.learner().estimate();
    let truth = course.true_x_ohm();
    [0, 1].map(|side| {
        let (x, sd) = (estimate.mean[2 * side + 1], estimate.sd()[2 * side + 1]);
        [(x - truth[side]) / sd, sd / truth[side]]
    })
}

#[test]
fn slow_and_fast_frames_learn() {
    let rates = [(10.0, 24.0, 3.0), (0.02, 2.0, 12.0)];
    let tries: Vec<_> = rates.into_iter().flat_map(|rate| (0..2).map(move |seed| (rate, seed))).collect();
    tries.par_iter().for_each(|&((interval_s, hours, per_hour), seed)| {
        let drill = Invention { interval_s, hours, with_slow_telemetry: true, ..mixed(seed) };
        let course = Course::new(&drill).changed(|drill| steps(drill, RandomSteps { per_hour, kv: [1.5, 6.0] }));
        let mut desk = course.learning();
        course.snapshots(course.drill()).for_each(|snapshot| desk.follow(&snapshot));
        let off = off(&course, &desk);
        println!("a frame in {interval_s} s, seed {seed}: {off:.3?}");
        assert!(off.iter().all(|[spreads, sd]| spreads.abs() < 3.0 && *sd < 0.1), "{interval_s} s: {off:?}");
    });
}

/// Once an hour each: nothing at all, no voltage at one end, a wrong sign, a voltage twelve kilovolts off, a circuit metered
/// wrong as a whole, a status that lies.
fn spoil(drill: &mut Scenario) {
    let every_hour = |from_s: f64, for_s: f64| {
        let hours = (0..24).map(move |hour| f64::from(hour) * 3600.0 + from_s);
        hours.map(move |from_s| Span { from_s, until_s: from_s + for_s })
    };
    let flow = |circuit, end, quantity| Point::Flow(circuit, end, quantity);
    let corridor = &mut drill.corridors[0];
    corridor.gaps.extend(every_hour(100.0, 120.0).map(|span| Gap { points: None, span }));
    corridor.gaps.extend(every_hour(400.0, 240.0).map(|span| Gap { points: Some(vec![Point::Kv(0)]), span }));
    let mut falsify = |point, from_s, for_s, scale, offset| {
        corridor.false_meters.extend(every_hour(from_s, for_s).map(|span| FalseMeter { point, span, scale, offset }));
    };
    falsify(flow(0, End::To, Quantity::Active), 800.0, 200.0, -1.0, 0.0);
    falsify(Point::Kv(1), 1200.0, 200.0, 1.0, 12.0);
    for (end, quantity) in [
        (End::From, Quantity::Active),
        (End::From, Quantity::Reactive),
        (End::To, Quantity::Active),
        (End::To, Quantity::Reactive),
    ] {
        falsify(flow(1, end, quantity), 1600.0, 60.0, 1.15, 0.0);
    }
    falsify(Point::Closed(2), 2000.0, 60.0, 0.0, 0.0);
}

/// Frames lost, late, and with values that are none.
fn garbled(frames: impl Iterator<Item = Frame>) -> impl Iterator<Item = Frame> {
    frames.enumerate().filter_map(|(number, mut frame)| {
        let place = number % frame.readings.len();
        let (_, reading) = &mut frame.readings[place];
        match number % 97 {
            7 => return None,
            13 => reading.value = f64::NAN,
            29 => reading.quality = Quality::Invalid,
            43 => reading.value *= 1e300,
            61 => frame.time -= TimeDelta::hours(1),
            _ => {}
        }
        Some(frame)
    })
}

#[test]
fn gaps_false_meters_and_bad_fits_slow_learning_and_no_more() {
    (0..4_u64).into_par_iter().for_each(|seed| {
        let course = poor(seed, spoil);
        let mut desk = course.learning();
        course.snapshots(garbled(course.drill())).for_each(|snapshot| desk.follow(&snapshot));
        let off = off(&course, &desk);
        println!("seed {seed}: {off:.3?}");
        assert!(off.iter().all(|[spreads, sd]| spreads.abs() < 3.0 && *sd < 0.15), "seed {seed}: {off:?}");
    });
}

#[test]
fn coincident_steps_get_no_foothold() {
    (0..16_u64).into_par_iter().for_each(|seed| {
        let course = Course::new(&Invention { with_slow_telemetry: true, ..mixed(seed) }).changed(|drill| {
            let corridor = &mut drill.corridors[0];
            corridor.coincident_steps = Some(RandomSteps { per_hour: 6.0, kv: [1.5, 6.0] });
            corridor.sides.iter_mut().for_each(|side| side.steps = None);
        });
        let mut desk = course.learning();
        for snapshot in course.snapshots(course.drill()) {
            desk.follow(&snapshot);
            let (mean, sd) = (desk.learner().estimate().mean, desk.learner().estimate().sd());
            for (side, truth) in course.true_x_ohm().into_iter().enumerate() {
                let (r, x, sd) = (mean[2 * side], mean[2 * side + 1], sd[2 * side + 1]);
                assert!(r >= 0.0 && x > 0.0, "seed {seed}: {r} + j{x} ohm");
                assert!(x > 0.4 * truth || sd > 0.3 * x, "seed {seed}, side {side}: {x} ± {sd} ohm for {truth}");
            }
        }
    });
}

#[test]
fn configured_sources_are_held_at_every_frame() {
    let course = poor(2, |_| ());
    let mut desk = course.holding();
    let sides = desk.corridor().sides;
    for snapshot in course.snapshots(course.drill()).step_by(15) {
        let assessment = desk.assess(&snapshot);
        for (record, side) in assessment.sources.iter().zip(&sides) {
            let source = side.source;
            assert_eq!((record.r_ohm, record.x_ohm), (source.r_ohm, source.x_ohm));
            assert!((record.r_sd - source.r_sd_ohm()).abs() < 1e-12 && (record.x_sd - source.x_sd_ohm()).abs() < 1e-12);
            assert_eq!((record.basis, record.steps), (Basis::Configured, 0));
        }
    }
    assert_eq!(desk.learner().steps().count(), 0);
}

#[test]
fn the_same_frames_give_the_same_records() {
    let course = Course::new(&Invention { hours: 6.0, ..crate::coincident(4) });
    let play = |_: &usize| {
        let mut desk = course.learning();
        let records: Vec<Assessment> = course.snapshots(course.drill()).map(|s| desk.assess(&s)).collect();
        (records, *desk.learner().estimate())
    };
    let both: Vec<_> = [0, 1].par_iter().map(play).collect();
    assert!(both[0].0.last().unwrap().sources.iter().all(|source| source.basis == Basis::Learned));
    assert!(both[0] == both[1]);
    // What is learned does not depend on how often somebody looks.
    let mut desk = course.learning();
    course.snapshots(course.drill()).for_each(|snapshot| desk.follow(&snapshot));
    assert_eq!(*desk.learner().estimate(), both[0].1);
}
