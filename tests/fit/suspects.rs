//! Wrong meters and wrong statuses are named, and nothing else is.

use tautline::feed::{Point, Snapshot};

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use crate::world::{World, loaded_world, random_world};

/// The measurement that a wrong reading must be traced to, or a state as good as without it.
fn assert_named(world: &World, snapshot: &Snapshot, point: Point, what: &str) {
    let fit = world.fit(snapshot);
    let name = point.name(&world.corridor);
    if fit.suspects.is_empty() {
        assert!(fit.chi2.unwrap() <= fit.limit.unwrap(), "{what}: {name} neither fits nor is named");
        let state = fit.joined().unwrap();
        for (fitted, truth) in state.voltage.iter().zip(&world.voltage) {
            let off = (fitted - truth).norm() / truth.norm();
            assert!(off < 0.005, "{what}: {name} is small enough to pass but moves the state by {off}");
        }
    } else {
        assert_eq!(world.names(&fit.suspects), [name], "{what}");
        let state = fit.joined().unwrap();
        for (fitted, truth) in state.voltage.iter().zip(&world.voltage) {
            assert!((fitted - truth).norm() < 1e-8 * truth.norm(), "{what}");
        }
    }
}

fn meters(world: &World) -> impl Iterator<Item = Point> {
    world.points().into_iter().filter(|point| {
        matches!(point, Point::Kv(_) | Point::Flow(..)) || matches!(point, Point::Load(bus, _) if *bus > 1)
    })
}

#[test]
fn one_wrong_meter_of_three_circuits_is_named_alone() {
    let mut named = 0;
    for seed in 0..200 {
        let world = random_world(seed, 0);
        for point in meters(&world) {
            for factor in [0.9, 1.1, -1.0, 0.0, 1000.0] {
                let mut snapshot = world.exact();
                world.set(&mut snapshot, point, factor * world.value(point));
                if matches!(point, Point::Kv(_)) && !(0.5..1.5).contains(&factor) {
                    continue;
                }
                let what = format!("seed {seed}, {point:?} times {factor}");
                assert_named(&world, &snapshot, point, &what);
                named += usize::from(!world.fit(&snapshot).suspects.is_empty());
            }
        }
    }
    assert!(named > 5000, "{named} were large enough to matter");
}

#[test]
fn without_angles_too() {
    for seed in 0..100 {
        let world = random_world(seed, 0);
        for point in meters(&world) {
            for factor in [0.9, 1.1, -1.0] {
                if matches!(point, Point::Kv(_)) && factor < 0.0 {
                    continue;
                }
                let mut snapshot = world.exact();
                world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_)));
                world.set(&mut snapshot, point, factor * world.value(point));
                assert_named(&world, &snapshot, point, &format!("seed {seed}, {point:?} times {factor}"));
            }
        }
    }
}

#[test]
fn nothing_is_named_in_a_good_frame() {
    let world = loaded_world();
    assert!(world.fit(&world.exact()).suspects.is_empty());
}

#[test]
fn one_wrong_meter_in_noise_is_named_first_and_mostly_alone() {
    let world = loaded_world();
    let mut rng = ChaCha8Rng::seed_from_u64(11);
    let (mut first, mut alone, mut all) = (0, 0, 0);
    for _ in 0..40 {
        let noisy = world.noisy(&mut rng);
        for point in meters(&world).filter(|point| (0.1 * world.value(*point)).abs() > 12.0 * world.sigma(*point)) {
            for factor in [0.9, 1.1, -1.0] {
                if matches!(point, Point::Kv(_)) && factor < 0.0 {
                    continue;
                }
                let mut snapshot = noisy.clone();
                world.set(&mut snapshot, point, factor * world.value(point));
                let fit = world.fit(&snapshot);
                let suspects = world.names(&fit.suspects);
                first += usize::from(suspects.first() == Some(&&*point.name(&world.corridor)));
                alone += usize::from(suspects == [point.name(&world.corridor)]);
                all += 1;
            }
        }
    }
    println!("{first} {alone} {all}");
    assert_eq!(first, all);
    assert!(alone as f64 > 0.97 * all as f64, "{alone} of {all}");
}

#[test]
fn one_wrong_meter_beside_stations_is_named_first() {
    let (mut first, mut alone, mut all) = (0, 0, 0);
    for seed in 0..60 {
        let world = random_world(seed, 1 + seed as usize % 3);
        for point in meters(&world) {
            for factor in [0.9, -1.0, 1000.0] {
                if matches!(point, Point::Kv(_)) && !(0.5..1.5).contains(&factor) {
                    continue;
                }
                let mut snapshot = world.exact();
                world.set(&mut snapshot, point, factor * world.value(point));
                let fit = world.fit(&snapshot);
                if fit.suspects.is_empty() {
                    continue;
                }
                let suspects = world.names(&fit.suspects);
                first += usize::from(suspects.first() == Some(&&*point.name(&world.corridor)));
                alone += usize::from(suspects == [point.name(&world.corridor)]);
                all += 1;
                if suspects != [point.name(&world.corridor)] {
                    println!("seed {seed} {point:?} {factor} {suspects:?}");
                }
            }
        }
    }
    println!("{first} {alone} {all}");
    assert_eq!(alone, all);
}
