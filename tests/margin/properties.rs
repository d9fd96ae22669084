//! What must hold for any corridor: invented ones at random, each with an exact frame made from its own admittances.

use proptest::prelude::*;
use tautline::{
    config::Config,
    desk::{Assessment, OutageLimits},
    grid::{FROM, TO},
    network::{Branch, C64, Topology},
};

use super::bench::{Values, assess};

/// A corridor of parallel circuits at random, and the voltages and loads of its frame.
#[derive(Debug, Clone)]
pub struct Invented {
    pub circuits: Vec<(f64, Option<f64>)>,
    sources: [[f64; 3]; 2],
    stored_energy: [f64; 2],
    fault: (&'static str, f64, f64),
    require: (f64, f64),
    rating_a: f64,
    kv: [f64; 2],
    pub angle_deg: f64,
    loads: [[f64; 2]; 2],
}

pub fn invented() -> impl Strategy<Value = Invented> {
    let circuit = (80.0..320.0, prop::option::of(5.0..24.0));
    let source = [0.3..2.0, 6.0..30.0, 0.0..10.0];
    let fault = (prop_oneof![Just("three-phase"), Just("phase-phase"), Just("phase-earth")], 0.0..1.0, 50.0..150.0);
    let load = [0.0..900.0, -50.0..200.0];
    (
        (
            prop::collection::vec(circuit, 2..4),
            [source.clone(), source],
            [20_000.0..150_000.0, 20_000.0..150_000.0],
            fault,
        ),
        ((0.0..35.0, 0.0..0.3), 1500.0..3000.0, [395.0..415.0, 390.0..415.0], 3.0..16.0, [load.clone(), load]),
    )
        .prop_map(|((circuits, sources, stored_energy, fault), (require, rating_a, kv, angle_deg, loads))| {
            Invented { circuits, sources, stored_energy, fault, require, rating_a, kv, angle_deg, loads }
        })
}

impl Invented {
    /// The configuration; `swapped` turns the corridor round, circuits, faults and all.
    pub fn config(&self, swapped: bool) -> String {
        let (kind, at, clear_ms) = self.fault;
        let side = |name: &str, index: usize| {
            let [r, x, swing_x] = self.sources[index];
            let (bus, energy) = (["Skarn", "Velm"][index], self.stored_energy[index]);
            format!(
                "[corridor.{name}]\nbus = \"{bus}\"\nnominal_kv = 400\nmin_kv = 350\nstored_energy_mws = {energy}\n\
                 source = {{ r_ohm = {r}, x_ohm = {x}, swing_x_ohm = {swing_x}, spread = 0.2 }}\n"
            )
        };
        let order = if swapped { [1, 0] } else { [0, 1] };
        let circuits = self.circuits.iter().enumerate().map(|(index, (length, bank))| {
            let bank = bank.map_or(String::new(), |x| {
                let at = if swapped { 0.6 } else { 0.4 };
                format!("series_capacitors = [{{ name = \"L{index}-SC\", x_ohm = {x}, at = {at} }}]\n")
            });
            format!(
                "[[corridor.circuit]]\nname = \"L{index}\"\nlength_km = {length}\nr_ohm_per_km = 0.028\n\
                 x_ohm_per_km = 0.31\nb_us_per_km = 3.7\nrating_a = {rating}\n{bank}",
                rating = self.rating_a
            )
        });
        let (angle, area) = self.require;
        let sequence = if kind == "three-phase" { "" } else { "z2_ohm = [0.5, 8]\nz0_ohm = [1.5, 15]\n" };
        format!(
            "[grid]\nfrequency_hz = 50\n[[corridor]]\nname = \"Skarn-Velm\"\n{}{}{}\
             [corridor.fault]\nkind = \"{kind}\"\nat = {at}\nclear_ms = {clear_ms}\n{sequence}\
             [corridor.require]\nangle_margin_deg = {angle}\narea_margin = {area}\n",
            side("from", order[0]),
            side("to", order[1]),
            circuits.collect::<String>()
        )
    }

    /// The exact frame: voltages, loads and the flows at both ends.
    pub fn values(&self, swapped: bool) -> Values {
        let config = Config::parse(&self.config(swapped), "config.toml").unwrap_or_else(|errors| panic!("{errors}"));
        let corridor = &config.grid.corridors[0];
        let complete = Topology::complete(corridor);
        let mut values = Values::new();
        let bus = [C64::from_polar(self.kv[0], self.angle_deg.to_radians()), C64::new(self.kv[1], 0.0)];
        for (index, name) in ["Skarn", "Velm"].into_iter().enumerate() {
            values.insert(format!("{name}.kv"), self.kv[index]);
            values.insert(format!("{name}.deg"), bus[index].arg().to_degrees());
            values.insert(format!("{name}.mw"), self.loads[index][0]);
            values.insert(format!("{name}.mvar"), self.loads[index][1]);
        }
        let ends = if swapped { [bus[1], bus[0]] } else { bus };
        for (circuit, inserted) in corridor.circuits.iter().zip(&complete.inserted) {
            let branch = Branch::of(circuit, inserted);
            for (end, own) in [(tautline::feed::End::From, ends[FROM]), (tautline::feed::End::To, ends[TO])] {
                let power = own * branch.current(end, ends[FROM], ends[TO]).conj();
                let end = if end == tautline::feed::End::From { "from" } else { "to" };
                values.insert(format!("{}.{end}.mw", circuit.name), power.re);
                values.insert(format!("{}.{end}.mvar", circuit.name), power.im);
            }
        }
        values
    }

    fn assess(&self) -> Assessment {
        assess(&self.config(false), &self.values(false))
    }

    /// The same sources and loads with the angle opened so far that about this much is transferred.
    fn at_transfer(&self, base: &Assessment, transfer_mw: f64) -> Assessment {
        Stressed::new(self, base).assess(transfer_mw)
    }
}

/// The corridor re-measured at another point of its stress: settled voltages held, internal angle opened.
struct Stressed<'a> {
    invented: &'a Invented,
    e: [f64; 2],
    load: [C64; 2],
}

impl<'a> Stressed<'a> {
    fn new(invented: &'a Invented, base: &Assessment) -> Self {
        let e = [0, 1].map(|side: usize| base.sources[side].e_kv.expect("known"));
        let load = [0, 1].map(|side| {
            let [mw, mvar] = invented.loads[side];
            C64::new(mw, -mvar) / (invented.kv[side] * invented.kv[side])
        });
        Self { invented, e, load }
    }

    /// Terminal voltages at an internal angle, by solving the network with its two sources.
    fn terminals(&self, angle_rad: f64) -> [C64; 2] {
        let config = Config::parse(&self.invented.config(false), "config.toml").expect("valid before");
        let corridor = &config.grid.corridors[0];
        let mut y = nalgebra::Matrix2::<C64>::zeros();
        for (circuit, inserted) in corridor.circuits.iter().zip(&Topology::complete(corridor).inserted) {
            let branch = Branch::of(circuit, inserted);
            y += nalgebra::Matrix2::new(branch.y11, branch.y12, branch.y12, branch.y22);
        }
        let source = [0, 1].map(|side: usize| {
            let [r, x, _] = self.invented.sources[side];
            C64::new(r, x).inv()
        });
        y[(0, 0)] += self.load[0] + source[0];
        y[(1, 1)] += self.load[1] + source[1];
        let injected = nalgebra::Vector2::new(
            C64::from_polar(self.e[0], angle_rad) * source[0],
            C64::new(self.e[1], 0.0) * source[1],
        );
        let solved = y.lu().solve(&injected).expect("a network with sources is regular");
        [solved[0], solved[1]]
    }

    fn assess(&self, transfer_mw: f64) -> Assessment {
        let at = |angle: f64| {
            let bus = self.terminals(angle);
            let loads = [0, 1].map(|side: usize| {
                let power = self.load[side].conj() * bus[side].norm_sqr();
                [power.re, power.im]
            });
            let angle_deg = (bus[0] * bus[1].conj()).arg().to_degrees();
            let kv = bus.map(C64::norm);
            Invented { kv, angle_deg, loads, ..self.invented.clone() }.assess()
        };
        let (mut low, mut high) = (0.0, 1.6);
        for _ in 0..40 {
            let middle = 0.5 * (low + high);
            let there = at(middle);
            let sign = if there.exporter.as_deref() == Some("Skarn") { 1.0 } else { -1.0 };
            if sign * there.transfer_mw.expect("a state") < transfer_mw { low = middle } else { high = middle }
        }
        at(low)
    }
}

fn near(found: f64, expected: f64, relative: f64) -> bool {
    (found - expected).abs() <= relative * expected.abs().max(1.0)
}

fn each(limits: &OutageLimits) -> [(&'static str, Option<f64>); 4] {
    [("angle", limits.angle), ("area", limits.area), ("loading", limits.loading), ("voltage", limits.voltage)]
}

/// Whether an outage's criterion holds at the present transfer, by the record's own figures.
fn holds(assessment: &Assessment, invented: &Invented, outage: usize, criterion: &str) -> bool {
    let outage = &assessment.outages[outage];
    match criterion {
        "angle" => outage.angle_margin_deg.is_some_and(|margin| margin >= invented.require.0),
        "area" => outage.area_margin.is_some_and(|margin| margin >= invented.require.1),
        "loading" => outage.loading_pct.is_some_and(|loading| loading <= 100.0),
        _ => outage.kv.as_ref().is_some_and(|kv| kv.iter().all(|(_, kv)| *kv >= 350.0)),
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn swapping_the_ends_changes_nothing(invented in invented()) {
        let one = invented.assess();
        let other = assess(&invented.config(true), &invented.values(true));
        prop_assert_eq!(&one.exporter, &other.exporter);
        prop_assert!(near(other.transfer_mw.unwrap(), one.transfer_mw.unwrap(), 1e-7));
        prop_assert!(near(other.headroom_mw.unwrap(), one.headroom_mw.unwrap(), 1e-5));
        prop_assert!(near(other.headroom_sd_mw.unwrap(), one.headroom_sd_mw.unwrap(), 1e-3));
        for outage in &one.outages {
            let same = super::bench::outage(&other, &outage.name);
            prop_assert!(near(same.area_margin.unwrap(), outage.area_margin.unwrap(), 1e-6), "{}", outage.name);
            for ((criterion, a), (_, b)) in each(&outage.limit_mw).into_iter().zip(each(&same.limit_mw)) {
                prop_assert_eq!(a.is_some(), b.is_some(), "{} {}", outage.name, criterion);
                prop_assert!(near(a.unwrap_or(0.0), b.unwrap_or(0.0), 1e-5), "{} {}", outage.name, criterion);
            }
        }
    }

    /// Noise-free, the flows and magnitudes fix the angle across the corridor.
    #[test]
    fn angle_channels_add_nothing_to_an_exact_frame(invented in invented()) {
        let with = invented.assess();
        let mut values = invented.values(false);
        values.retain(|name, _| !name.contains(".deg"));
        let without = assess(&invented.config(false), &values);
        prop_assert!(near(without.headroom_mw.unwrap(), with.headroom_mw.unwrap(), 1e-6));
        prop_assert!(near(without.bus_angle_deg.unwrap(), with.bus_angle_deg.unwrap(), 1e-6));
        prop_assert!(near(without.internal_angle_deg.unwrap(), with.internal_angle_deg.unwrap(), 1e-6));
    }

    #[test]
    fn asking_for_more_never_raises_a_limit(invented in invented(), more in 1.0..20.0) {
        let base = invented.assess();
        let (angle, area) = invented.require;
        let stricter = Invented { require: (angle + more, area + more / 50.0), ..invented.clone() };
        // A fault may brake more than the network after it. One at the exporter's bus, without loads, does not.
        let lossless = invented.sources.map(|[_, x, swing_x]| [0.0, x, swing_x]);
        let fault = ("three-phase", 0.0, invented.fault.2);
        let close = Invented { fault, loads: [[0.0; 2]; 2], sources: lossless, ..invented.clone() };
        let slower = Invented { fault: ("three-phase", 0.0, invented.fault.2 + 5.0 * more), ..close.clone() };
        let pairs = [(base, stricter.assess(), ["angle", "area"]), (close.assess(), slower.assess(), ["area", "area"])];
        for (base, other, criteria) in pairs {
            for (before, after) in base.outages.iter().zip(&other.outages) {
                for ((criterion, before), (_, after)) in each(&before.limit_mw).into_iter().zip(each(&after.limit_mw)) {
                    if criteria.contains(&criterion) {
                        let unlimited = f64::INFINITY;
                        prop_assert!(after.unwrap_or(unlimited) <= before.unwrap_or(unlimited) + 1e-4, "{} {:?} {:?}", criterion, before, after);
                    }
                }
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(6))]

    /// The definition of the headroom: re-measured half a megawatt below a limit its criterion holds, half a megawatt
    /// above it does not.
    #[test]
    fn at_its_limit_every_criterion_just_holds(invented in invented()) {
        let base = invented.assess();
        prop_assume!(base.exporter.as_deref() == Some("Skarn"));
        for index in 0..base.outages.len() {
            for (criterion, limit) in each(&base.outages[index].limit_mw) {
                // Right at the peak a megawatt is many degrees.
                let far_enough = |limit: &f64| *limit > 1.0 && *limit < 0.98 * base.intact.as_ref().unwrap().peak_mw;
                let Some(limit) = limit.filter(far_enough) else { continue };
                let below = invented.at_transfer(&base, limit - 0.5);
                prop_assert!(holds(&below, &invented, index, criterion), "{} {criterion}", base.outages[index].name);
                let above = invented.at_transfer(&base, limit + 0.5);
                prop_assert!(!holds(&above, &invented, index, criterion), "{} {criterion}", base.outages[index].name);
            }
        }
        prop_assume!(base.transfer_mw.unwrap() + base.headroom_mw.unwrap() > 1.0);
        let spent = invented.at_transfer(&base, base.transfer_mw.unwrap() + base.headroom_mw.unwrap());
        prop_assert!(spent.headroom_mw.unwrap().abs() < 0.5, "{:?}", spent.headroom_mw);
    }
}

/// Two equal circuits carry what one of half the impedance and twice the charging does (common practice).
#[test]
fn two_equal_circuits_are_one_of_half_the_impedance() {
    let corridor = |circuits: &[(&str, f64)]| {
        let circuit = |(name, share): &(&str, f64)| {
            let (r, x, b) = (8.0 * share, 80.0 * share, 900.0 / share);
            format!("[[corridor.circuit]]\nname = \"{name}\"\nr_ohm = {r}\nx_ohm = {x}\nb_us = {b}\n")
        };
        let circuits = circuits.iter().map(circuit).collect::<Vec<_>>().concat();
        format!(
            "[grid]\nfrequency_hz = 50\n[[corridor]]\nname = \"C\"\n\
             [corridor.from]\nbus = \"A\"\nnominal_kv = 400\nstored_energy_mws = 50000\nsource = {{ r_ohm = 1, x_ohm = 15 }}\n\
             [corridor.to]\nbus = \"B\"\nnominal_kv = 400\nsource = {{ r_ohm = 1, x_ohm = 20 }}\n\
             {circuits}[corridor.require]\naccept_separation = true\n"
        )
    };
    let values = |circuits: &[(&str, f64)]| {
        let config = Config::parse(&corridor(circuits), "config.toml").expect("valid");
        let bus = [C64::from_polar(408.0, 0.2), C64::new(402.0, 0.0)];
        let mut values = Values::from([("A.kv".into(), 408.0), ("B.kv".into(), 402.0)]);
        for circuit in &config.grid.corridors[0].circuits {
            let branch = Branch::of(circuit, &[]);
            for (end, name, own) in
                [(tautline::feed::End::From, "from", bus[0]), (tautline::feed::End::To, "to", bus[1])]
            {
                let power = own * branch.current(end, bus[0], bus[1]).conj();
                values.insert(format!("{}.{name}.mw", circuit.name), power.re);
                values.insert(format!("{}.{name}.mvar", circuit.name), power.im);
            }
        }
        values
    };
    let [two, one] = [&[("1", 1.0), ("2", 1.0)][..], &[("both", 0.5)][..]]
        .map(|circuits| assess(&corridor(circuits), &values(circuits)));
    let peak = |assessment: &Assessment| assessment.intact.as_ref().expect("a state").peak_mw;
    assert!(near(peak(&two), peak(&one), 1e-9), "{} {}", peak(&two), peak(&one));
    assert!(near(two.internal_angle_deg.unwrap(), one.internal_angle_deg.unwrap(), 1e-9));
    // The loss of one halves the admittance between the terminals: never more than what both carry.
    assert!(two.outages[0].peak_mw.unwrap() < peak(&two));
}

/// Three measured circuits that carry a good deal.
pub fn three_circuits() -> Invented {
    Invented {
        circuits: vec![(200.0, None), (220.0, Some(15.0)), (240.0, None)],
        sources: [[1.0, 20.0, 0.0], [1.0, 15.0, 0.0]],
        stored_energy: [60_000.0, 90_000.0],
        fault: ("three-phase", 0.0, 100.0),
        require: (20.0, 0.1),
        rating_a: 3000.0,
        kv: [405.0, 400.0],
        angle_deg: 9.0,
        loads: [[300.0, 50.0], [700.0, 90.0]],
    }
}

#[test]
fn one_wrong_meter_is_named_and_hardly_moves_the_headroom() {
    let invented = three_circuits();
    let right = invented.assess();
    let allowed_mw = 0.01 * right.intact.as_ref().expect("a state").peak_mw;
    let exact = invented.values(false);
    for (channel, value) in exact.iter().filter(|(channel, _)| channel.starts_with('L')) {
        for wrong in [0.9, 1.1, -1.0] {
            let mut values = exact.clone();
            values.insert(channel.clone(), wrong * value);
            let found = assess(&invented.config(false), &values);
            let moved = found.headroom_mw.expect("a state") - right.headroom_mw.expect("a state");
            assert!(moved.abs() < allowed_mw, "{channel} times {wrong}: {moved} MW");
            let suspects: Vec<_> = found.fit.suspects.iter().map(|suspect| &**suspect).collect();
            assert!(suspects.is_empty() || suspects == [channel], "{channel} times {wrong}: {suspects:?}");
            // A tenth of a few Mvar is within the metering class; a tenth of these MW is not.
            assert!(!suspects.is_empty() || !channel.contains(".mw"), "{channel} times {wrong} goes unnoticed");
        }
    }
}

/// A corridor judged some spreads below its headroom is thin before it is so by the headroom itself.
#[test]
fn the_state_may_be_judged_below_the_headroom() {
    let invented = three_circuits();
    let judged = |spreads: f64, thin_mw: f64| {
        let keys = format!("name = \"Skarn-Velm\"\nthin_mw = {thin_mw}\nstate_spreads = {spreads}\n");
        let config = invented.config(false).replace("name = \"Skarn-Velm\"\n", &keys);
        assess(&config, &invented.values(false))
    };
    let plain = judged(0.0, 1.0);
    let (headroom, spread) = (plain.headroom_mw.unwrap(), plain.headroom_sd_mw.unwrap());
    assert!(headroom > 0.0 && spread > 1.0, "{headroom} {spread}");
    let thin_mw = headroom - spread;
    assert_eq!(judged(0.5, thin_mw).state, tautline::desk::State::Ample);
    assert_eq!(judged(1.5, thin_mw).state, tautline::desk::State::Thin);
    assert_eq!(judged(0.0, thin_mw).headroom_mw, plain.headroom_mw, "the headroom stays what it is");
}
