//! Frames without noise give the state they were made from.

use tautline::{
    feed::{Point, Quantity},
    fit::Fit,
    network::C64,
};

use crate::world::{World, random_world};

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
        let world = random_world(seed, seed as usize % 6);
        let fit = world.fit(&world.exact());
        assert!(fit.chi2.unwrap() < 1e-12, "seed {seed}: {:?}", fit.chi2);
        assert!(fit.suspects.is_empty() && fit.missing.is_empty() && fit.assumed.is_empty(), "seed {seed}");
        assert_true_state(&world, &fit, 1e-11);
    }
}

#[test]
fn angle_channels_are_optional() {
    for seed in 0..300 {
        let world = random_world(seed, seed as usize % 4);
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
