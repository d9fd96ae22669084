//! Against an independent program, and against statistics.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use tautline::{
    feed::Point,
    grid::{Bank, Circuit, FROM, Line, TO},
    network::{C64, Topology},
};

use crate::world::{World, circuit, corridor, loaded_world, random_world};

fn line(name: &str, between: [usize; 2], km_r_x_b: [f64; 4], rating_a: f64) -> Circuit {
    let [length_km, r_ohm_per_km, x_ohm_per_km, b_us_per_km] = km_r_x_b;
    let line = Line::PerKm { length_km, r_ohm_per_km, x_ohm_per_km, b_us_per_km };
    Circuit { line, rating_a: Some(rating_a), ..circuit(name, between, length_km) }
}

#[test]
fn scipy_finds_the_same_state_in_a_noisy_frame() {
    let reference: serde_json::Value = serde_json::from_str(include_str!("reference.json")).unwrap();
    let mut circuits = vec![
        line("A", [FROM, 2], [140.0, 0.028, 0.31, 3.7], 1900.0),
        line("B", [FROM, 2], [155.0, 0.030, 0.33, 3.5], 1700.0),
        line("C", [2, TO], [120.0, 0.025, 0.30, 3.9], 2100.0),
        line("D", [TO, FROM], [270.0, 0.020, 0.29, 4.1], 2500.0),
    ];
    circuits[1].banks.push(Bank { name: "B-SC".into(), x_ohm: 11.0, at: 0.4 });
    let corridor = corridor(&["Mid"], circuits);
    let topology = Topology::complete(&corridor);
    let world = World::new(corridor, topology, [C64::from(400.0); 2], vec![C64::new(0.0, 0.0); 3]);
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |_| true);
    for point in world.points() {
        if let Some(value) = reference["values"][point.name(&world.corridor)].as_f64() {
            world.set(&mut snapshot, point, value);
        }
    }
    let fit = world.fit(&snapshot);
    let number = |value: &serde_json::Value| value.as_f64().unwrap();
    assert!((fit.chi2.unwrap() / number(&reference["chi2"]) - 1.0).abs() < 1e-9);
    assert_eq!(fit.dof as u64, reference["dof"].as_u64().unwrap());
    assert!((fit.limit.unwrap() / number(&reference["limit"]) - 1.0).abs() < 1e-9);
    assert!(fit.suspects.is_empty());
    for (bus, voltage) in world.corridor.buses.iter().zip(&fit.joined().unwrap().voltage) {
        let kv = number(&reference["kv"][&*bus.name]);
        let deg = number(&reference["deg"][&*bus.name]);
        assert!((voltage - C64::from_polar(kv, deg.to_radians())).norm() < 1e-6, "{}", bus.name);
    }
}

#[test]
fn the_sum_of_squares_is_chi_squared() {
    let world = loaded_world();
    let mut fitter = world.fitter();
    let mut rng = ChaCha8Rng::seed_from_u64(42);
    let frames = 4000;
    let fits: Vec<_> = (0..frames).map(|_| fitter.fit(&world.noisy(&mut rng))).collect();
    let untouched: Vec<_> = fits.iter().filter(|fit| fit.suspects.is_empty()).collect();
    let refused = 1.0 - untouched.len() as f64 / f64::from(frames);
    assert!((0.005..0.015).contains(&refused), "1 % of good frames fail a 99 % test, not {refused}");
    let dof = untouched[0].dof as f64;
    let mean = untouched.iter().map(|fit| fit.chi2.unwrap()).sum::<f64>() / untouched.len() as f64;
    // Without the last hundredth of its distribution the mean is about 1.6 % lower.
    assert!((mean / dof - 0.984).abs() < 0.02, "{mean} for {dof}");
}

#[test]
fn memory_of_earlier_frames_changes_nothing() {
    let mut rng = ChaCha8Rng::seed_from_u64(9);
    let world = random_world(12, 2);
    let mut fitter = world.fitter();
    for _ in 0..50 {
        let mut snapshot = world.exact();
        world.drop(&mut snapshot, |_| rand::RngExt::random_bool(&mut rng, 0.2));
        world.set(&mut snapshot, Point::Closed(0), f64::from(rand::RngExt::random_bool(&mut rng, 0.5)));
        assert_eq!(fitter.fit(&snapshot), world.fit(&snapshot));
    }
}
