//! What learning costs: a frame between steps, and the frame at which a step is judged.

#[path = "../tests/source/corridor.rs"]
mod corridor;
#[allow(dead_code, reason = "shared with the tests, which use all of it")]
#[path = "../tests/source/simulator.rs"]
mod simulator;

use std::hint::black_box;

use criterion::{BatchSize, Criterion, criterion_group, criterion_main};
use simulator::{Drill, Simulator};
use tautline::{
    config::LearningSettings,
    source::{Learner, Observation},
};

fn day(frame_s: f64, steps_per_hour: f64) -> (Learner, Vec<Observation>) {
    let mut simulator = Simulator::new(Drill { frame_s, hours: 2.0, steps_per_hour, trip: false, ..Drill::day(1) });
    let learner = Learner::new(&simulator.configured, LearningSettings::default());
    (learner, simulator.by_ref().collect())
}

fn between_steps(bench: &mut Criterion) {
    for (name, frame_s) in [("a frame in 2 s, between steps", 2.0), ("20 frames a second, between steps", 0.05)] {
        let (fresh, frames) = day(frame_s, 0.0);
        let mut learner = fresh.clone();
        let mut next = frames.iter();
        bench.bench_function(name, |b| {
            b.iter(|| {
                let seen = next.next().unwrap_or_else(|| {
                    learner = fresh.clone();
                    next = frames.iter();
                    &frames[0]
                });
                learner.observe(black_box(seen))
            });
        });
    }
}

fn at_a_step(bench: &mut Criterion) {
    let (mut learner, frames) = day(2.0, 6.0);
    let (before, frame) = frames
        .iter()
        .find_map(|seen| {
            let before = learner.clone();
            learner.observe(seen).map(|_| (before, seen))
        })
        .expect("two hours hold a step");
    bench.bench_function("judging a step", |b| {
        b.iter_batched_ref(|| before.clone(), |learner| learner.observe(black_box(frame)), BatchSize::SmallInput);
    });
}

criterion_group!(benches, between_steps, at_a_step);
criterion_main!(benches);
