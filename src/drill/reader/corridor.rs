//! `[[corridor]]`, and who is meant by a name anywhere in the scenario.

use std::collections::HashMap;

use super::{Config, Findings, Limits, POSITIVE, Section, time::shape};
use crate::{
    config::{
        limits::{ANY, NOT_NEGATIVE},
        wording::quoted,
    },
    drill::{CorridorTruth, Dispatch, LoadTruth, RandomSteps, Shape, SideTruth, Wander, plan::Plan},
    feed::Point,
    grid::{BankIndex, Corridor, FROM, Load, TO},
};

/// Voltage behind an impedance that the scenario does not give, of nominal.
const DEFAULT_E: f64 = 1.05;
/// A usual time for swings between large grids to fade.
const DEFAULT_DECAY_S: f64 = 4.0;
/// More would be noise.
const MOST_STEPS_PER_HOUR: f64 = 240.0;

/// Something of a corridor that events point at.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Target {
    Side(usize),
    Circuit(usize),
    Bank(BankIndex),
}

/// The corridors of the scenario, and the names in them.
pub(super) struct Cast<'a> {
    pub config: &'a Config,
    pub findings: &'a Findings,
    pub duration_s: f64,
    truths: Vec<CorridorTruth>,
    /// Name, place in `truths`, and what it is; a bus and a circuit may have the same name.
    targets: Vec<(&'a str, usize, Target)>,
    channels: HashMap<String, (usize, Point)>,
}

impl<'a> Cast<'a> {
    pub fn new(config: &'a Config, findings: &'a Findings, duration_s: f64) -> Self {
        Self { config, findings, duration_s, truths: Vec::new(), targets: Vec::new(), channels: HashMap::new() }
    }

    /// The corridors with their events in order.
    pub fn corridors(mut self) -> Vec<CorridorTruth> {
        for truth in &mut self.truths {
            truth.events.sort_by(|a, b| a.at_s.total_cmp(&b.at_s));
        }
        self.truths
    }

    pub fn truth(&mut self, place: usize) -> &mut CorridorTruth {
        &mut self.truths[place]
    }

    pub fn truths(&mut self) -> impl Iterator<Item = &mut CorridorTruth> {
        self.truths.iter_mut()
    }

    pub fn corridor(&self, place: usize) -> &'a Corridor {
        &self.config.grid.corridors[self.truths[place].corridor]
    }

    /// What a key of a section names, if it is what `pick` wants; otherwise reported, and `None`.
    pub fn target<T>(
        &self,
        section: &Section<'a>,
        key: &str,
        name: &str,
        what: &str,
        pick: impl Fn(Target) -> Option<T>,
    ) -> Option<(usize, T)> {
        let possible = || self.targets.iter().filter_map(|(name, place, target)| Some((*name, *place, pick(*target)?)));
        let found = possible().find(|(possible, ..)| *possible == name).map(|(_, place, picked)| (place, picked));
        if found.is_none() && !name.is_empty() {
            let advice = self.findings.advice(name, possible().map(|(name, ..)| name));
            section.wrong(key, format!("{} is no {what} of the scenario's corridors; {advice}", quoted(name)));
        }
        found
    }

    /// The corridor and the point of a channel.
    pub fn channel(&self, name: &str) -> Result<(usize, Point), String> {
        let advice = || {
            let mut candidates: Vec<_> = self.channels.keys().map(String::as_str).collect();
            candidates.sort_unstable();
            self.findings.advice(name, candidates)
        };
        let found = self.channels.get(name).copied();
        found.ok_or_else(|| format!("{} is no channel of the scenario's corridors; {}", quoted(name), advice()))
    }

    /// Reads a `[[corridor]]`.
    pub fn read(&mut self, mut section: Section<'a>) {
        let name = section.required_text("name", "name a corridor of the configuration");
        let corridors = &self.config.grid.corridors;
        let Some(index) = corridors.iter().position(|corridor| *corridor.name == *name) else {
            if !name.is_empty() {
                let advice = self.findings.advice(&name, corridors.iter().map(|corridor| &*corridor.name));
                section.wrong("name", format!("{} is no corridor of the configuration; {advice}", quoted(&name)));
            }
            section.abandon();
            return;
        };
        let truth = read(&mut section, index, &corridors[index], self.duration_s);
        if self.truths.iter().any(|other| other.corridor == index) {
            section.wrong("name", format!("{} is given twice; keep one", quoted(&name)));
            return;
        }
        deliverable(&section, &corridors[index], &truth);
        self.enlist(&section, &corridors[index]);
        self.truths.push(truth);
    }

    fn enlist(&mut self, section: &Section<'a>, corridor: &'a Corridor) {
        let place = self.truths.len();
        for side in [FROM, TO] {
            self.targets.push((&corridor.buses[side].name, place, Target::Side(side)));
        }
        for (index, circuit) in corridor.circuits.iter().enumerate() {
            self.targets.push((&circuit.name, place, Target::Circuit(index)));
        }
        for (index, bank) in corridor.banks() {
            self.targets.push((&bank.name, place, Target::Bank(index)));
        }
        for point in Point::of(corridor) {
            if let Some((other, _)) = self.channels.insert(point.name(corridor), (place, point)) {
                let other = quoted(&self.corridor(other).name);
                let advice = "each corridor of a drill moves by itself, so play one of the two";
                section.wrong("name", format!("has a bus in common with {other}; {advice}"));
                return;
            }
        }
    }
}

fn read(section: &mut Section<'_>, index: usize, corridor: &Corridor, duration_s: f64) -> CorridorTruth {
    let mut loads: Vec<Option<LoadTruth>> = corridor.buses.iter().map(|bus| bus.load.map(level)).collect();
    let sides = [("from", 0), ("to", 1)].map(|(key, side)| {
        let mut section = section.section(key);
        read_load(&mut section, &mut loads[side], duration_s);
        read_side(&mut section, corridor, side, duration_s)
    });
    for mut station in section.sections("station", corridor.buses.len()) {
        let name = station.required_text("bus", "name a station of the corridor");
        let stations = || corridor.buses.iter().skip(2);
        match stations().position(|bus| *bus.name == *name) {
            Some(place) => read_load(&mut station, &mut loads[place + 2], duration_s),
            None if name.is_empty() => station.abandon(),
            None => {
                let advice = station.findings().advice(&name, stations().map(|bus| &*bus.name));
                station.wrong("bus", format!("{} is no station of the corridor; {advice}", quoted(&name)));
                station.abandon();
            }
        }
    }
    CorridorTruth {
        corridor: index,
        reports_angles: section.flag("reports_angles").unwrap_or_default(),
        reports_stored_energy: section.flag("reports_stored_energy").unwrap_or_default(),
        dispatch: dispatch(section, duration_s),
        wander: wander(section, "mw"),
        swing_decay_s: section.number("swing_decay_s", Limits::at_least(0.1).up_to(600.0)).unwrap_or(DEFAULT_DECAY_S),
        coincident_steps: steps(section, "coincident_steps"),
        sides,
        loads,
        events: Vec::new(),
        false_meters: Vec::new(),
        gaps: Vec::new(),
    }
}

fn dispatch(section: &mut Section<'_>, duration_s: f64) -> Dispatch {
    let transfer = shape(section, "transfer_mw", ANY, duration_s);
    let angle = shape(section, "angle_deg", Limits::at_least(-90.0).up_to(90.0), duration_s);
    match (transfer, angle) {
        (Some(transfer), None) => Dispatch::Transfer(transfer),
        (None, Some(angle)) => Dispatch::Angle(angle.map(f64::to_radians)),
        (transfer, _) => {
            let excess = transfer.is_some();
            let message = if excess { "excludes angle_deg; keep one" } else { "is missing; give it, or angle_deg" };
            section.wrong("transfer_mw", message);
            Dispatch::Angle(Shape::level(0.0))
        }
    }
}

/// Reports where the complete corridor cannot carry what it is told to.
fn deliverable(section: &Section<'_>, corridor: &Corridor, truth: &CorridorTruth) {
    let Dispatch::Transfer(transfer) = &truth.dispatch else { return };
    let mut plan = Plan::new(corridor, truth);
    for &(time_s, mw) in transfer.points() {
        plan.go_to(truth, time_s);
        let curve = plan.transfer();
        let [lowest, highest] = [-1.0, 1.0].map(|sine| curve.mean_mw + sine * curve.amplitude_mw);
        if mw < lowest || mw > highest {
            let range = format!("between {lowest:.0} and {highest:.0} MW");
            section.wrong("transfer_mw", format!("{mw} MW is more than the sources can send; keep it {range}"));
        }
    }
}

fn level(nominal: Load) -> LoadTruth {
    LoadTruth { nominal, shape: Shape::level(1.0) }
}

fn read_load(section: &mut Section<'_>, load: &mut Option<LoadTruth>, duration_s: f64) {
    let mut section = section.section("load");
    if section.is_present() {
        let mut truth = load.take().unwrap_or_else(|| level(Load { mw: 0.0, mvar: 0.0 }));
        truth.nominal.mw = section.number("mw", ANY).unwrap_or(truth.nominal.mw);
        truth.nominal.mvar = section.number("mvar", ANY).unwrap_or(truth.nominal.mvar);
        truth.shape = shape(&mut section, "shape", NOT_NEGATIVE.up_to(10.0), duration_s).unwrap_or(truth.shape);
        *load = Some(truth);
    }
}

fn read_side(section: &mut Section<'_>, corridor: &Corridor, side: usize, duration_s: f64) -> SideTruth {
    let configured = corridor.sides[side];
    let nominal_kv = corridor.buses[side].nominal_kv;
    let around_nominal = Limits::at_least(0.5 * nominal_kv).up_to(2.0 * nominal_kv);
    SideTruth {
        e_kv: shape(section, "e_kv", around_nominal, duration_s).unwrap_or(Shape::level(DEFAULT_E * nominal_kv)),
        r_ohm: section.number("r_ohm", NOT_NEGATIVE).unwrap_or(configured.source.r_ohm),
        x_ohm: section.number("x_ohm", NOT_NEGATIVE).unwrap_or(configured.source.x_ohm),
        stored_energy_mws: section.number("stored_energy_mws", POSITIVE).or(configured.stored_energy_mws),
        wander: wander(section, "kv"),
        steps: steps(section, "steps"),
    }
}

fn wander<'a>(section: &mut Section<'a>, unit: &'a str) -> Option<Wander> {
    let mut section = section.section("wander");
    let sd = section.required_number(unit, NOT_NEGATIVE);
    let minutes = section.number("minutes", POSITIVE.up_to(1e6)).unwrap_or(15.0);
    section.is_present().then_some(Wander { sd, memory_s: minutes * 60.0 })
}

fn steps<'a>(section: &mut Section<'a>, key: &'a str) -> Option<RandomSteps> {
    let mut section = section.section(key);
    let per_hour = section.required_number("per_hour", POSITIVE.up_to(MOST_STEPS_PER_HOUR));
    let kv = section.numbers("kv", [POSITIVE; 2]);
    if section.is_present() && kv.is_none_or(|[low, high]| low > high) {
        section.wrong("kv", "must be the smallest and the largest step, such as [1.5, 5.0]");
    }
    section.is_present().then_some(RandomSteps { per_hour, kv: kv.unwrap_or([f64::NAN; 2]) })
}
