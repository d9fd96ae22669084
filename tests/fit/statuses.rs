//! Flows win over flags, and a bank's status over several meters.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use tautline::{
    feed::{End, Point, Quantity},
    fit::Standing,
    grid::{BankIndex, FROM, TO},
    network::{C64, Topology},
};

use crate::world::{World, circuit, corridor, loaded_world, random_world, three_circuits};

const BANK: BankIndex = BankIndex { circuit: 0, bank: 0 };

/// The three circuits with some of them open and the bank as given.
fn world(open: &[usize], inserted: bool, angle_rad: f64) -> World {
    let corridor = three_circuits();
    let mut topology = Topology::complete(&corridor).without(open, &[]);
    topology.inserted[0][0] = inserted;
    let terminals = [C64::from_polar(408.0, angle_rad), C64::from(402.0)];
    World::new(corridor, topology, terminals, vec![C64::new(0.005, -0.0007), C64::new(0.003, 0.0)])
}

#[test]
fn open_but_carrying_counts_as_closed() {
    let world = loaded_world();
    for circuit in 0..3 {
        let mut snapshot = world.exact();
        world.set(&mut snapshot, Point::Closed(circuit), 0.0);
        let fit = world.fit(&snapshot);
        assert_eq!(fit.suspects, [world.slot(Point::Closed(circuit))]);
        assert!(fit.topology.closed[circuit] && fit.chi2.unwrap() < 1e-9);

        world.drop(&mut snapshot, |point| matches!(point, Point::Flow(c, End::To, _) if c == circuit));
        assert_eq!(world.fit(&snapshot).suspects, [world.slot(Point::Closed(circuit))], "one end is enough");
    }
}

#[test]
fn open_but_carrying_with_a_wrong_meter_still_counts_as_closed() {
    let world = loaded_world();
    let mut snapshot = world.exact();
    let wrong = Point::Flow(1, End::To, Quantity::Active);
    world.set(&mut snapshot, Point::Closed(1), 0.0);
    world.set(&mut snapshot, wrong, 0.8 * world.value(wrong));
    assert_eq!(world.fit(&snapshot).suspects, [world.slot(Point::Closed(1)), world.slot(wrong)]);
}

#[test]
fn old_flows_of_a_tripped_circuit_do_not_close_it() {
    let before = loaded_world();
    let after = world(&[2], true, 0.29);
    let mut snapshot = after.exact();
    for point in after.points().into_iter().filter(|point| matches!(point, Point::Flow(2, ..))) {
        after.set(&mut snapshot, point, before.value(point));
    }
    let fit = after.fit(&snapshot);
    assert!(!fit.topology.closed[2]);
    assert_eq!(fit.suspects, [End::From, End::To].map(|end| after.slot(Point::Flow(2, end, Quantity::Active))));
}

#[test]
fn charging_of_an_open_circuit_is_not_carrying() {
    let world = world(&[2], true, 0.25);
    let mut snapshot = world.exact();
    world.set(&mut snapshot, Point::Flow(2, End::From, Quantity::Active), 0.4);
    world.set(&mut snapshot, Point::Flow(2, End::From, Quantity::Reactive), -140.0);
    let fit = world.fit(&snapshot);
    assert!(fit.suspects.is_empty() && !fit.topology.closed[2]);
    world.drop(&mut snapshot, |point| matches!(point, Point::Flow(2, ..)));
    assert_eq!(fit.standing, world.fit(&snapshot).standing, "without flows the flag stands");
    assert!(world.fit(&snapshot).missing.is_empty(), "an open circuit's flows are not missed");
}

#[test]
fn closed_but_dead_counts_as_open() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    for angle_rad in [0.25, 0.05, -0.2] {
        for circuit in 0..3 {
            let world = world(&[circuit], true, angle_rad);
            for noise in [false, true] {
                let mut snapshot = if noise { world.noisy(&mut rng) } else { world.exact() };
                world.set(&mut snapshot, Point::Closed(circuit), 1.0);
                let fit = world.fit(&snapshot);
                assert_eq!(fit.suspects, [world.slot(Point::Closed(circuit))], "{circuit} at {angle_rad}");
                assert!(!fit.topology.closed[circuit]);
            }
        }
    }
}

#[test]
fn two_dead_circuits_and_a_wrong_meter_are_told_apart() {
    let world = world(&[1, 2], true, 0.3);
    let mut snapshot = world.exact();
    let wrong = Point::Kv(TO);
    world.set(&mut snapshot, Point::Closed(1), 1.0);
    world.set(&mut snapshot, Point::Closed(2), 1.0);
    world.set(&mut snapshot, wrong, 0.9 * world.value(wrong));
    let suspects = world.fit(&snapshot).suspects;
    let mut statuses = suspects[..2].to_vec();
    statuses.sort_unstable();
    assert_eq!(statuses, [1, 2].map(|circuit| world.slot(Point::Closed(circuit))));
    assert_eq!(suspects[2..], [world.slot(wrong)]);
}

#[test]
fn an_idle_circuit_that_is_closed_stays_closed() {
    let mut idle = circuit("A", [FROM, TO], 100.0);
    idle.line = tautline::grid::Line::Totals { r_ohm: 3.0, x_ohm: 30.0, b_us: 0.0 };
    let mut twin = idle.clone();
    twin.name = "B".into();
    let corridor = corridor(&[], vec![idle, twin]);
    let topology = Topology::complete(&corridor);
    let world = World::new(corridor, topology, [C64::from(400.0), C64::from(400.0)], vec![C64::new(0.0, 0.0); 2]);
    let mut snapshot = world.exact();
    world.set(&mut snapshot, Point::Kv(TO), 360.0);
    let fit = world.fit(&snapshot);
    assert_eq!(fit.topology.closed, [true, true]);
}

#[test]
fn a_wrong_bank_status_is_named() {
    let mut rng = ChaCha8Rng::seed_from_u64(6);
    for inserted in [true, false] {
        for angle_rad in [0.3, 0.15, -0.2] {
            let world = world(&[], inserted, angle_rad);
            for noise in [false, true] {
                let mut snapshot = if noise { world.noisy(&mut rng) } else { world.exact() };
                world.set(&mut snapshot, Point::Inserted(BANK), f64::from(!inserted));
                let fit = world.fit(&snapshot);
                assert_eq!(world.names(&fit.suspects), ["SV1-SC.inserted"], "{inserted} at {angle_rad}");
                assert_eq!(fit.topology.inserted[0][0], inserted);
            }
        }
    }
}

#[test]
fn a_wrong_bank_status_on_a_single_circuit_is_named() {
    let world = world(&[1, 2], true, 0.3);
    let mut snapshot = world.exact();
    world.set(&mut snapshot, Point::Inserted(BANK), 0.0);
    assert_eq!(world.names(&world.fit(&snapshot).suspects), ["SV1-SC.inserted"]);
}

#[test]
fn a_wrong_bank_status_and_a_wrong_meter_are_told_apart() {
    let world = world(&[], true, 0.3);
    let mut snapshot = world.exact();
    let wrong = Point::Flow(1, End::From, Quantity::Active);
    world.set(&mut snapshot, Point::Inserted(BANK), 0.0);
    world.set(&mut snapshot, wrong, -world.value(wrong));
    assert_eq!(world.names(&world.fit(&snapshot).suspects), ["SV1-SC.inserted", "SV2.from.mw"]);
}

#[test]
fn a_bank_is_never_blamed_for_one_meter() {
    let world = random_world(1, 0);
    for point in world.points().into_iter().filter(|point| matches!(point, Point::Flow(..))) {
        let mut snapshot = world.exact();
        world.set(&mut snapshot, point, 1.2 * world.value(point));
        let suspects = world.fit(&snapshot).suspects;
        assert!(suspects.is_empty() || suspects == [world.slot(point)]);
    }
}

#[test]
fn a_corridor_without_a_closed_circuit_is_parted() {
    let world = world(&[0, 1, 2], true, 0.4);
    let mut snapshot = world.exact();
    let fit = world.fit(&snapshot);
    let Standing::Parted { state, angle_known: true } = &fit.standing else { panic!("{:?}", fit.standing) };
    assert!((state.voltage[FROM] - C64::from_polar(408.0, 0.4)).norm() < 1e-9);
    assert!((state.voltage[TO] - C64::from(402.0)).norm() < 1e-9);
    assert!((state.load[FROM] - world.load[FROM]).norm() < 1e-12);

    world.drop(&mut snapshot, |point| point == Point::Deg(TO));
    let Standing::Parted { state, angle_known: false } = world.fit(&snapshot).standing else { panic!() };
    assert!((state.voltage[FROM] - C64::from(408.0)).norm() < 1e-9);

    world.drop(&mut snapshot, |point| point == Point::Kv(FROM));
    let fit = world.fit(&snapshot);
    assert_eq!(fit.standing, Standing::Blind);
    assert_eq!(world.names(&fit.missing), ["Skarn.kv"]);
}

#[test]
fn a_station_on_one_part_still_has_a_voltage() {
    let corridor = corridor(&["Mid"], vec![circuit("A", [FROM, 2], 90.0), circuit("B", [2, TO], 90.0)]);
    let topology = Topology::complete(&corridor).without(&[1], &[]);
    let terminals = [C64::from_polar(405.0, 0.2), C64::from(402.0)];
    let mut world = World::new(corridor, topology, terminals, vec![C64::new(0.001, 0.0); 3]);
    let y = world.branch(0);
    world.voltage[2] = -y.y12 * terminals[0] / (y.y22 + world.load[2]);
    let fit = world.fit(&world.exact());
    let Standing::Parted { state, angle_known: true } = &fit.standing else { panic!("{:?}", fit.standing) };
    for (fitted, truth) in state.voltage.iter().zip(&world.voltage) {
        assert!((fitted - truth).norm() < 1e-9);
    }
    assert!(fit.suspects.is_empty() && fit.chi2.unwrap() < 1e-12);
}
