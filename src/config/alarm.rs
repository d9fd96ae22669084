//! `[[alarm]]` for all corridors and `[[corridor.alarm]]` for one.
//!
//! Three layers, each over the one before: the built-in alarms, those for all corridors, those of the corridor. A table
//! with the name of an alarm that is there already changes the keys it gives; any other name adds an alarm.

use std::{
    cell::RefCell,
    collections::{BTreeMap, HashSet},
};

use chrono::TimeDelta;

use super::{
    DAY_S,
    findings::Place,
    limits::{Limits, NOT_NEGATIVE},
    names::Names,
    section::Section,
    wording::quoted,
};
use crate::{
    alarm::{BUILT_IN, Definition, Kind, Priority, Suppression, built_in},
    grid::{Corridor, Grid},
};

/// More alarms for one corridor would not be understood by anybody.
pub(super) const MOST_ALARMS: usize = 100;

/// What an alarm has when its table does not say.
const DEFAULT_PRIORITY: Priority = Priority::Medium;
const DEFAULT_ON_DELAY_S: f64 = 10.0;
const DEFAULT_OFF_DELAY_S: f64 = 60.0;

/// The tables of one layer.
pub(super) struct Layer(Vec<Change>);

/// What one table says.
struct Change {
    name: String,
    kind: Kind,
    is_new: bool,
    enabled: Option<bool>,
    priority: Option<Priority>,
    setpoint: Option<f64>,
    deadband: Option<f64>,
    on_delay: Option<TimeDelta>,
    off_delay: Option<TimeDelta>,
    message: Option<String>,
    action: Option<String>,
    suppress_while: Option<Suppression>,
    /// Where the deadband stands, or else the setpoint.
    deadband_place: Place,
}

/// Kinds of the alarms known so far, by name.
#[derive(Clone)]
pub(super) struct Known(BTreeMap<String, Kind>);

impl Known {
    pub fn built_in() -> Self {
        Self(BUILT_IN.iter().map(|(name, kind)| ((*name).to_owned(), *kind)).collect())
    }

    /// Reads a layer, whose alarms are known from then on; its circuits are those of these corridors.
    pub fn read(&mut self, sections: Vec<Section<'_>>, corridors: &[Corridor]) -> Layer {
        let Some(first) = sections.first() else { return Layer(Vec::new()) };
        let mut names = Names::new(first.findings());
        Layer(sections.into_iter().filter_map(|section| self.change(section, &mut names, corridors)).collect())
    }

    fn change<'a>(
        &mut self,
        mut section: Section<'a>,
        names: &mut Names<'a>,
        corridors: &[Corridor],
    ) -> Option<Change> {
        let name = section.required_text("name", "name the alarm");
        names.claim(&name, "alarm", &section.place("name"));
        let given = word(&mut section, "on", Kind::from_word, &Kind::ALL.map(Kind::word));
        let known = self.0.get(&name).copied();
        if let (Some(known), Some(given)) = (known, given)
            && known != given
        {
            section.wrong("on", format!("alarm {} is on {known} already; choose another name", quoted(&name)));
        }
        if known.is_none() && !section.has("on") {
            let advice = section.findings().advice(&name, self.0.keys().map(String::as_str));
            section.missed("on", &format!("say what a new alarm is on, or name one that is there: {advice}"));
        }
        let kind = known.or(given);
        let change = Change {
            is_new: known.is_none(),
            enabled: section.flag("enabled"),
            priority: word(&mut section, "priority", Priority::from_word, &Priority::ALL.map(Priority::word)),
            setpoint: section.number("setpoint", kind.map_or(super::limits::ANY, setpoints)),
            deadband: section.number("deadband", NOT_NEGATIVE),
            on_delay: delay(&mut section, "on_delay_s"),
            off_delay: delay(&mut section, "off_delay_s"),
            message: section.text("message"),
            action: section.text("action"),
            suppress_while: suppression(section.section("suppress_while"), corridors),
            deadband_place: section.place(if section.has("deadband") { "deadband" } else { "setpoint" }),
            // Without a kind nothing more can be told, and that is reported.
            kind: kind?,
            name,
        };
        if change.is_new && kind.is_some_and(|kind| kind.usual_setpoint().is_none()) {
            section.needed("setpoint", change.setpoint, "say at which value a new alarm is raised");
        }
        self.0.insert(change.name.clone(), change.kind);
        Some(change)
    }
}

/// The alarms of a corridor after all layers. What is wrong with a layer for all is reported once.
pub(super) fn resolve(
    corridor: &Corridor,
    layers: [&Layer; 2],
    root: &Section<'_>,
    reported: &RefCell<HashSet<(usize, String)>>,
) -> Vec<Definition> {
    let mut definitions: Vec<_> = built_in(corridor).into_iter().map(|definition| (definition, true)).collect();
    for change in layers.into_iter().flat_map(|layer| &layer.0) {
        let found = definitions.iter().position(|(definition, _)| *definition.name == *change.name);
        let index = found.unwrap_or_else(|| {
            definitions.push((fresh(change), true));
            definitions.len() - 1
        });
        let (definition, enabled) = &mut definitions[index];
        *enabled = change.enabled.unwrap_or(*enabled);
        change.apply(definition);
        let Definition { setpoint, deadband, .. } = definition;
        // A setpoint of nothing has no size to compare with.
        if *setpoint != 0.0 && *deadband > setpoint.abs() {
            let place = &change.deadband_place;
            if reported.borrow_mut().insert((place.line, place.key.clone())) {
                let what = format!("the deadband ({deadband}) is larger than the setpoint ({setpoint})");
                root.findings().report(place, format!("{what}; make it smaller, or the alarm would not end"));
            }
        }
    }
    definitions.into_iter().filter_map(|(definition, enabled)| enabled.then_some(definition)).collect()
}

/// An alarm that is in no earlier layer, as its table leaves it open.
fn fresh(change: &Change) -> Definition {
    let setpoint = change.setpoint.or(change.kind.usual_setpoint()).unwrap_or(f64::NAN);
    Definition {
        name: change.name.as_str().into(),
        kind: change.kind,
        priority: DEFAULT_PRIORITY,
        setpoint,
        deadband: if change.kind.usual_setpoint().is_some() { 0.0 } else { 0.1 * setpoint.abs() },
        on_delay: seconds(DEFAULT_ON_DELAY_S),
        off_delay: seconds(DEFAULT_OFF_DELAY_S),
        message: change.kind.usual_message().into(),
        action: change.kind.usual_action().into(),
        suppress_while: Suppression::default(),
    }
}

impl Change {
    fn apply(&self, definition: &mut Definition) {
        let Definition { priority, setpoint, deadband, on_delay, off_delay, message, action, .. } = definition;
        *priority = self.priority.unwrap_or(*priority);
        *setpoint = self.setpoint.unwrap_or(*setpoint);
        // The deadband of an earlier layer was chosen for another setpoint.
        let usual = if self.setpoint.is_some() && *setpoint != 0.0 { deadband.min(setpoint.abs()) } else { *deadband };
        *deadband = self.deadband.unwrap_or(usual);
        *on_delay = self.on_delay.unwrap_or(*on_delay);
        *off_delay = self.off_delay.unwrap_or(*off_delay);
        for (text, given) in [(message, &self.message), (action, &self.action)] {
            if let Some(given) = given {
                *text = given.as_str().into();
            }
        }
        if let Some(suppression) = &self.suppress_while {
            definition.suppress_while = suppression.clone();
        }
    }
}

/// What a word stands for; nothing, and reported, where it is none of those.
fn word<'a, T>(
    section: &mut Section<'a>,
    key: &'a str,
    from_word: impl Fn(&str) -> Option<T>,
    words: &[&str],
) -> Option<T> {
    let given = section.text(key)?;
    let found = from_word(&given);
    if found.is_none() && !given.is_empty() {
        let advice = section.findings().advice(&given, words.iter().copied());
        section.wrong(key, format!("no {} is possible here; {advice}", quoted(&given)));
    }
    found
}

fn setpoints(kind: Kind) -> Limits {
    let [low, high] = kind.setpoints();
    Limits::at_least(low).up_to(high)
}

fn delay<'a>(section: &mut Section<'a>, key: &'a str) -> Option<TimeDelta> {
    section.number(key, NOT_NEGATIVE.up_to(DAY_S)).map(seconds)
}

/// Whole milliseconds; nothing for what was reported.
fn seconds(seconds: f64) -> TimeDelta {
    // At most a day.
    #[allow(clippy::cast_possible_truncation)]
    TimeDelta::milliseconds((1e3 * seconds).round() as i64)
}

fn suppression(mut section: Section<'_>, corridors: &[Corridor]) -> Option<Suppression> {
    let circuits_out = section.texts("circuits_out").unwrap_or_default();
    let transfer_below_mw = section.number("transfer_below_mw", NOT_NEGATIVE);
    let circuits = || corridors.iter().flat_map(|corridor| &corridor.circuits).map(|circuit| &circuit.name);
    let known = |named: super::given::Placed| {
        let circuit = circuits().find(|name| ***name == *named.text).cloned();
        if circuit.is_none() && !named.text.is_empty() {
            let advice =
                section.findings().advice(&named.text, circuits().map(|name| &**name).filter(|name| !name.is_empty()));
            section.findings().report(&named.place, format!("no circuit {} here; {advice}", quoted(&named.text)));
        }
        circuit
    };
    let circuits_out = circuits_out.into_iter().filter_map(known).collect();
    section.is_present().then_some(Suppression { circuits_out, transfer_below_mw })
}

/// The layers of all corridors in one.
pub(super) fn all<'a>(
    root: &mut Section<'a>,
    grid: &Grid,
    of_corridors: Vec<Vec<Section<'a>>>,
) -> Vec<Vec<Definition>> {
    let mut known = Known::built_in();
    let for_all = known.read(root.sections("alarm", MOST_ALARMS), &grid.corridors);
    let reported = RefCell::default();
    let corridors = grid.corridors.iter().zip(of_corridors);
    let resolved = corridors.map(|(corridor, sections)| {
        let own = known.clone().read(sections, std::slice::from_ref(corridor));
        resolve(corridor, [&for_all, &own], root, &reported)
    });
    resolved.collect()
}
