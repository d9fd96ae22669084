//! A wrong meter is named, wherever it is large enough to matter, and nothing else is.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use tautline::feed::{Point, Snapshot};

use crate::world::{World, loaded_world, random_world};

/// What the state is fitted to.
fn meters(world: &World) -> impl Iterator<Item = Point> {
    world.points().into_iter().filter(|point| match point {
        Point::Kv(_) | Point::Flow(..) => true,
        Point::Load(bus, _) => *bus > 1,
        _ => false,
    })
}

/// The frame once for each meter and factor, wrong by it. A voltage that is far from possible is the feed's to refuse.
fn wrong_by(world: &World, frame: &Snapshot, factors: &[f64], mut check: impl FnMut(&Snapshot, Point)) {
    for point in meters(world) {
        for factor in factors.iter().filter(|f| !matches!(point, Point::Kv(_)) || (0.5..1.5).contains(*f)) {
            let mut snapshot = frame.clone();
            world.set(&mut snapshot, point, factor * world.value(point));
            check(&snapshot, point);
        }
    }
}

fn off(world: &World, fit: &tautline::fit::Fit) -> f64 {
    let voltages = fit.joined().unwrap().voltage.iter().zip(&world.voltage);
    voltages.map(|(fitted, truth)| (fitted - truth).norm() / truth.norm()).fold(0.0, f64::max)
}

/// Whether the wrong meter is named: alone, and with the true state. If not, it hardly moves the state.
fn is_named(world: &World, snapshot: &Snapshot, point: Point) -> bool {
    let fit = world.fit(snapshot);
    let name = point.name(&world.corridor);
    if fit.suspects.is_empty() {
        assert!(fit.chi2.unwrap() <= fit.limit.unwrap(), "{name} neither fits nor is named");
        assert!(off(world, &fit) < 0.005, "{name} passes but moves the state by {}", off(world, &fit));
        return false;
    }
    assert_eq!(world.names(&fit.suspects), [name]);
    assert!(off(world, &fit) < 1e-8);
    true
}

#[test]
fn one_wrong_meter_of_three_circuits_is_named_alone() {
    let mut named = 0;
    for seed in 0..200 {
        let world = random_world(seed, 0);
        let check = |snapshot: &Snapshot, point| named += usize::from(is_named(&world, snapshot, point));
        wrong_by(&world, &world.exact(), &[0.9, 1.1, -1.0, 0.0, 1000.0], check);
    }
    assert!(named > 8000, "only {named} were large enough to matter");
}

#[test]
fn without_angles_too() {
    let mut named = 0;
    for seed in 0..100 {
        let world = random_world(seed, 0);
        let mut frame = world.exact();
        world.drop(&mut frame, |point| matches!(point, Point::Deg(_)));
        let check = |snapshot: &Snapshot, point| named += usize::from(is_named(&world, snapshot, point));
        wrong_by(&world, &frame, &[0.9, 1.1, -1.0], check);
    }
    assert!(named > 2000, "only {named} were large enough to matter");
}

#[test]
fn beside_stations_too() {
    let mut named = 0;
    for seed in 0..60 {
        let world = random_world(seed, 1 + seed % 3);
        let check = |snapshot: &Snapshot, point| named += usize::from(is_named(&world, snapshot, point));
        wrong_by(&world, &world.exact(), &[0.9, -1.0, 1000.0], check);
    }
    assert!(named > 4000, "only {named} were large enough to matter");
}

#[test]
fn in_noise_it_is_named_first_and_mostly_alone() {
    let world = loaded_world();
    let mut rng = ChaCha8Rng::seed_from_u64(11);
    let (mut alone, mut all) = (0.0, 0.0);
    for _ in 0..40 {
        wrong_by(&world, &world.noisy(&mut rng), &[0.9, 1.1, -1.0], |snapshot, point| {
            if (0.1 * world.value(point)).abs() > 12.0 * world.sigma(point) {
                let suspects = world.fit(snapshot).suspects;
                assert_eq!(suspects[0], world.slot(point));
                alone += f64::from(suspects.len() == 1);
                all += 1.0;
            }
        });
    }
    assert!(alone > 0.96 * all, "one frame in a hundred fails by its noise: {alone} of {all}");
}

#[test]
fn two_wrong_meters_are_both_named() {
    let world = loaded_world();
    let points: Vec<_> = meters(&world).filter(|point| world.value(*point).abs() > 100.0).collect();
    for (index, &one) in points.iter().enumerate() {
        for &other in &points[index + 1..] {
            let related = match (one, other) {
                (Point::Flow(a, ..), Point::Flow(b, ..)) => a == b,
                (one, other) => matches!((one, other), (Point::Kv(_), Point::Kv(_))),
            };
            if related {
                continue;
            }
            let mut snapshot = world.exact();
            world.set(&mut snapshot, one, 0.8 * world.value(one));
            world.set(&mut snapshot, other, if matches!(other, Point::Kv(_)) { 330.0 } else { -world.value(other) });
            let mut suspects = world.fit(&snapshot).suspects;
            suspects.sort_unstable();
            assert_eq!(suspects, [world.slot(one), world.slot(other)]);
        }
    }
}
