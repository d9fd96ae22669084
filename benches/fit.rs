//! How long a fit takes: a good frame, and frames that need an explanation.

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use tautline::feed::{End, Point, Quantity};

#[allow(dead_code, reason = "the tests use more of it")]
#[path = "../tests/fit/world.rs"]
mod world;

fn fits(criterion: &mut Criterion) {
    let world = world::loaded_world();
    let good = world.noisy(&mut ChaCha8Rng::seed_from_u64(1));
    let mut no_angles = good.clone();
    world.drop(&mut no_angles, |point| matches!(point, Point::Deg(_)));
    let mut false_meter = good.clone();
    let wrong = Point::Flow(1, End::To, Quantity::Active);
    world.set(&mut false_meter, wrong, -world.value(wrong));
    let mut false_bank = good.clone();
    world.set(&mut false_bank, world.points()[world.points().len() - 1], 0.0);
    let mut fitter = world.fitter();
    let frames = [("good", good), ("no angles", no_angles), ("false meter", false_meter), ("false bank", false_bank)];
    for (name, frame) in frames {
        criterion.bench_function(&format!("three circuits, {name}"), |b| b.iter(|| fitter.fit(black_box(&frame))));
    }

    let world = world::random_world(3, 3);
    let frame = world.exact();
    let mut fitter = world.fitter();
    criterion.bench_function("three stations", |b| b.iter(|| fitter.fit(black_box(&frame))));
}

criterion_group!(benches, fits);
criterion_main!(benches);
