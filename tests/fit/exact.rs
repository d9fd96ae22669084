//! Frames without noise give the state they were made from.

use tautline::{
    feed::{Point, Quantity},
    fit::Fit,
    grid::{FROM, Line, TO},
    network::{C64, Topology},
};

use crate::world::{World, circuit, corridor, random_world};

fn assert_true_state(world: &World, fit: &Fit, within: f64) {
    let state = fit.joined().unwrap_or_else(|| panic!("no state: missing {:?}", world.names(&fit.missing)));
    for (bus, (fitted, truth)) in state.voltage.iter().zip(&world.voltage).enumerate() {
        assert!((fitted - truth).norm() < within * truth.norm(), "bus {bus}: {fitted} for {truth}");
        let load: C64 = (state.load[bus] - world.load[bus]) * truth.norm_sqr();
        assert!(load.norm() < within * 1e4, "load {bus}: off by {load} MVA");
    }
}

#[test]
fn any_corridor_gives_back_its_state() {
    for seed in 0..300 {
        let world = random_world(seed, seed % 6);
        let fit = world.fit(&world.exact());
        assert!(fit.chi2.unwrap() < 1e-12, "seed {seed}: {:?}", fit.chi2);
        assert!(fit.suspects.is_empty() && fit.missing.is_empty() && fit.assumed.is_empty(), "seed {seed}");
        assert_true_state(&world, &fit, 1e-11);
    }
}

#[test]
fn angle_channels_are_optional() {
    for seed in 0..300 {
        let world = random_world(seed, seed % 4);
        let mut snapshot = world.exact();
        world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_)));
        let fit = world.fit(&snapshot);
        assert!(fit.missing.is_empty(), "angles are never missed");
        assert_true_state(&world, &fit, 1e-9);
    }
}

#[test]
fn one_angle_says_nothing() {
    let world = random_world(7, 0);
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| point == Point::Deg(0));
    let with_one = world.fit(&snapshot);
    world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_)));
    assert_eq!(with_one, world.fit(&snapshot));
}

#[test]
fn the_degrees_of_freedom_are_counted() {
    let world = random_world(3, 1);
    let circuits = world.corridor.circuits.len();
    let mut snapshot = world.exact();
    // kV and degrees at three buses, load at one, four flows each; three voltages, two angles, one common to all degrees.
    assert_eq!(world.fit(&snapshot).dof, 3 + 3 + 2 + 4 * circuits - 3 - 2 - 1);
    world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_) | Point::Load(2, Quantity::Active)));
    assert_eq!(world.fit(&snapshot).dof, 3 + 2 + 4 * circuits - 3 - 2, "an assumed load is a measurement");
}

/// One circuit of the given totals.
fn one_circuit(kv: f64, x_ohm: f64, b_us: f64, angle_deg: f64) -> World {
    let mut line = circuit("A", [FROM, TO], 100.0);
    line.line = Line::Totals { r_ohm: 0.0, x_ohm, b_us };
    line.rating_a = None;
    let mut corridor = corridor(&[], vec![line]);
    corridor.buses.iter_mut().for_each(|bus| bus.nominal_kv = kv);
    let topology = Topology::complete(&corridor);
    let terminals = [C64::from_polar(1.02 * kv, angle_deg.to_radians()), C64::from(kv)];
    World::new(corridor, topology, terminals, vec![C64::new(0.0, 0.0); 2])
}

#[test]
fn per_unit_data_and_very_short_circuits_are_no_exception() {
    for (kv, x_ohm, b_us, angle_deg) in
        [(1.0, 0.2, 0.0, 17.458), (1.0, 0.5, 0.0, 85.0), (400.0, 0.003, 0.0, 0.01), (400.0, 0.3, 4.0, 0.2)]
    {
        let world = one_circuit(kv, x_ohm, b_us, angle_deg);
        let mut snapshot = world.exact();
        assert_true_state(&world, &world.fit(&snapshot), 1e-9);
        world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_)));
        assert_true_state(&world, &world.fit(&snapshot), 1e-9);
    }
}
