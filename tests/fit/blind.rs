//! Too little measured: blind, with what is missing named; loads that nobody measures are assumed, and said to be.

use tautline::{
    feed::{End, Point, Quality, Quantity},
    fit::Standing,
    grid::{FROM, TO},
};

use crate::world::{World, configured, loaded_world, random_world};

#[test]
fn nothing_measured_is_blind_and_everything_missing() {
    let world = random_world(2, 1);
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |_| true);
    let fit = world.fit(&snapshot);
    assert_eq!((&fit.standing, fit.chi2, fit.dof, fit.limit), (&Standing::Blind, None, 0, None));
    let wanted: Vec<_> =
        world.points().into_iter().filter(|point| matches!(point, Point::Kv(_) | Point::Flow(..))).collect();
    assert_eq!(fit.missing, wanted.iter().map(|point| world.slot(*point)).collect::<Vec<_>>());
}

#[test]
fn without_mw_the_direction_is_not_guessed() {
    let world = loaded_world();
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| matches!(point, Point::Flow(_, _, Quantity::Active)));
    assert!(world.fit(&snapshot).joined().is_some(), "two angles tell it");
    world.drop(&mut snapshot, |point| matches!(point, Point::Deg(_)));
    let fit = world.fit(&snapshot);
    assert_eq!(fit.standing, Standing::Blind);
    assert!(world.names(&fit.missing).contains(&"SV1.from.mw"));
}

#[test]
fn one_circuits_meters_at_one_end_are_enough() {
    let world = loaded_world();
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| {
        matches!(point, Point::Deg(_) | Point::Kv(TO) | Point::Flow(1.., ..) | Point::Flow(_, End::To, _))
    });
    let fit = world.fit(&snapshot);
    let state = fit.joined().unwrap();
    assert!((state.voltage[FROM] - world.voltage[FROM]).norm() < 1e-7);
    assert_eq!((fit.dof, fit.limit), (0, None));
    assert_eq!(fit.missing.len(), 1 + 2 + 8);

    world.drop(&mut snapshot, |point| matches!(point, Point::Flow(_, _, Quantity::Reactive)));
    let fit = world.fit(&snapshot);
    assert_eq!(fit.standing, Standing::Blind);
    assert!(world.names(&fit.missing).contains(&"Velm.kv"));
}

#[test]
fn a_questionable_reading_has_three_times_the_spread() {
    let world = loaded_world();
    let point = Point::Flow(0, End::From, Quantity::Active);
    let off = 1e-3;
    let chi2 = |quality| {
        let mut snapshot = world.exact();
        world.set(&mut snapshot, point, world.value(point) + off);
        snapshot.readings[world.slot(point)].as_mut().unwrap().quality = quality;
        world.fit(&snapshot).chi2.unwrap()
    };
    // One reading off by e has e²/(σ² + s²) in a frame that fits otherwise, where s is the spread of what the others say.
    let variance = |quality| off * off / chi2(quality);
    let added = variance(Quality::Questionable) - variance(Quality::Good);
    assert!((added / (8.0 * world.sigma(point).powi(2)) - 1.0).abs() < 1e-4, "{added}");
    assert!(chi2(Quality::Invalid) < 1e-12);
}

fn with_configured_load(mut world: World, bus: usize, mw: f64, mvar: f64) -> World {
    std::sync::Arc::make_mut(&mut world.corridor).buses[bus].load = configured(mw, mvar);
    world
}

#[test]
fn terminal_loads_are_read_configured_or_none() {
    let world = with_configured_load(loaded_world(), FROM, 800.0, 120.0);
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| matches!(point, Point::Load(..)));
    world.set(&mut snapshot, Point::Load(FROM, Quantity::Reactive), 50.0);
    let fit = world.fit(&snapshot);
    let state = fit.joined().unwrap();
    assert!((state.load[FROM].re - 800.0 / 160_000.0).abs() < 1e-15);
    assert!((state.load[FROM].im + 50.0 / state.voltage[FROM].norm_sqr()).abs() < 1e-15);
    assert!(state.load[TO].norm() == 0.0);
    let sentences: Vec<_> = fit.assumed.iter().map(|s| &**s).collect();
    assert_eq!(
        sentences,
        ["Skarn load: not measured, 800 MW as configured", "Velm load: not measured, 0 MW assumed, 0 Mvar assumed"]
    );
}

#[test]
fn an_unmeasured_station_load_is_assumed_or_set_aside() {
    let world = random_world(5, 1);
    let drawn = [Quantity::Active, Quantity::Reactive].map(|quantity| world.value(Point::Load(2, quantity)));
    let at_nominal = drawn.map(|power| power * (400.0 / world.voltage[2].norm()).powi(2));
    let world = with_configured_load(world, 2, at_nominal[0], at_nominal[1]);
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| matches!(point, Point::Load(2, _)));
    let fit = world.fit(&snapshot);
    assert!(fit.chi2.unwrap() < 1e-12 && fit.suspects.is_empty());
    assert_eq!(fit.assumed.len(), 1);
    assert!(fit.assumed[0].ends_with("Mvar as configured"), "{}", fit.assumed[0]);

    let world = with_configured_load(world, 2, at_nominal[0] + 400.0, at_nominal[1]);
    let fit = world.fit(&snapshot);
    assert!(fit.suspects.is_empty(), "no channel is to blame");
    assert!(fit.assumed[0].contains("MW by balance"), "{}", fit.assumed[0]);
    assert!((fit.joined().unwrap().load[2] - world.load[2]).norm() < 1e-9, "the balance is the load");
}

#[test]
fn stored_energy_is_read_or_configured() {
    let world = loaded_world();
    let mut snapshot = world.exact();
    world.drop(&mut snapshot, |point| point == Point::StoredEnergy(TO));
    assert_eq!(world.fit(&snapshot).stored_energy_mws, [Some(50000.0), Some(60000.0)]);
}
