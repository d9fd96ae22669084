use std::{collections::BTreeMap, sync::Arc};

use chrono::{DateTime, TimeDelta, Utc};

use super::{
    Event, EventKind,
    event::{reason, span},
    flutter::{Fact, News},
};
use crate::{
    desk::{Assessment, State, SwitchKind},
    source::{Moved, Step},
};

/// A change of state, of direction or of data is told once it has lasted so long.
const HOLD: TimeDelta = TimeDelta::seconds(5);
/// A corridor has a direction when it carries more than this part of what it could.
const DIRECTED: f64 = 0.01;

/// Tells what is worth a line in the messages of one corridor: a function of the frames alone.
#[derive(Debug, Clone)]
pub struct Teller {
    state: Fact<State>,
    /// Why it is, or was, in a state other than the one told.
    why: String,
    exporter: Option<Fact<Arc<str>>>,
    /// Circuits and their banks, in the order of the assessment.
    switches: Vec<Fact<bool>>,
    /// Channels that are out of order, or were lately.
    channels: BTreeMap<(Arc<str>, bool), Fact<bool>>,
}

/// How something that is so or not is talked of: when it is not, when it is.
#[derive(Debug)]
struct Words {
    turns: [&'static str; 2],
    is: [&'static str; 2],
}

const CIRCUIT: Words = Words { turns: ["opened", "closed"], is: ["open", "closed"] };
const BANK: Words = Words { turns: ["bypassed", "inserted"], is: ["bypassed", "inserted"] };
const SUSPECT: Words =
    Words { turns: ["fits again", "does not fit the rest and is set aside"], is: ["in use", "set aside"] };
const MISSING: Words = Words { turns: ["is back", "is missing"], is: ["there", "missing"] };

impl Teller {
    /// Begins with a first assessment.
    pub fn new(first: &Assessment) -> Self {
        Self {
            state: Fact::new(first.state, first.time, HOLD),
            why: String::new(),
            exporter: None,
            switches: Vec::new(),
            channels: BTreeMap::new(),
        }
    }

    /// Takes the next one; returns what is to be told.
    pub fn take(&mut self, assessment: &Assessment) -> Vec<Event> {
        let mut told = Told { corridor: &assessment.corridor, events: Vec::new() };
        self.state(assessment, &mut told);
        self.direction(assessment, &mut told);
        self.channels(assessment, &mut told);
        self.switches(assessment, &mut told);
        if let Some(step) = &assessment.step {
            told.add(step.time, EventKind::Step, None, sentence(step, assessment));
        }
        told.events
    }

    fn state(&mut self, assessment: &Assessment, told: &mut Told) {
        if assessment.state != *self.state.told() {
            self.why = reason(assessment);
        }
        let Some((time, news)) = self.state.take(assessment.time, assessment.state) else { return };
        let why = &self.why;
        let (state, text) = match news {
            News::Changed { from, to } => (to, format!("{} → {}{why}", from.word(), to.word())),
            News::Passed { was, lasted } => (was, format!("{} for {}{why}", was.word(), span(lasted))),
            News::Fluttered { from, to, changes, within, now } => {
                (now, to_and_fro("", [from.word(), to.word()], changes, within, now.word()))
            }
        };
        told.add(time, EventKind::State, Some(state), text);
    }

    fn direction(&mut self, assessment: &Assessment, told: &mut Told) {
        let (Some(exporter), Some(transfer), Some(intact)) =
            (&assessment.exporter, assessment.transfer_mw, &assessment.intact)
        else {
            return;
        };
        if transfer < DIRECTED * intact.peak_mw {
            return;
        }
        let time = assessment.time;
        let fact = self.exporter.get_or_insert_with(|| Fact::new(exporter.clone(), time, HOLD));
        let Some((time, news)) = fact.take(time, exporter.clone()) else { return };
        let text = match news {
            News::Changed { to, .. } => format!("direction reversed: {to} exports now"),
            News::Passed { was, lasted } => format!("{was} exported for {}", span(lasted)),
            News::Fluttered { from, to, changes, within, now } => {
                to_and_fro("exporter ", [&from, &to], changes, within, &now)
            }
        };
        told.add(time, EventKind::Direction, None, text);
    }

    fn channels(&mut self, assessment: &Assessment, told: &mut Told) {
        let time = assessment.time;
        let lists = [(&assessment.fit.suspects, false), (&assessment.fit.missing, true)];
        for (names, missing) in lists {
            for name in names {
                self.channels.entry((name.clone(), missing)).or_insert_with(|| Fact::new(false, time, HOLD));
            }
        }
        // Those that share a fate share a line.
        let mut shared: BTreeMap<(DateTime<Utc>, String), (Arc<str>, usize)> = BTreeMap::new();
        for ((name, missing), fact) in &mut self.channels {
            let (names, words) =
                if *missing { (&assessment.fit.missing, &MISSING) } else { (&assessment.fit.suspects, &SUSPECT) };
            if let Some((time, news)) = fact.take(time, names.contains(name)) {
                shared.entry((time, words.sentence(&news))).or_insert((name.clone(), 0)).1 += 1;
            }
        }
        self.channels.retain(|_, fact| *fact.told() || !fact.is_settled());
        for ((time, what), (name, count)) in shared {
            let text = if count == 1 {
                format!("{name} {what}")
            } else {
                format!("{name} and {} more: each {what}", count - 1)
            };
            told.add(time, EventKind::Meter, None, text);
        }
    }

    fn switches(&mut self, assessment: &Assessment, told: &mut Told) {
        let time = assessment.time;
        for (place, switch) in assessment.switches.iter().enumerate() {
            if place == self.switches.len() {
                self.switches.push(Fact::new(switch.on, time, TimeDelta::zero()));
            }
            let Some((time, news)) = self.switches[place].take(time, switch.on) else { continue };
            let (words, kinds) = match switch.kind {
                SwitchKind::Circuit => (&CIRCUIT, [EventKind::Trip, EventKind::Return]),
                SwitchKind::Bank => (&BANK, [EventKind::Bypass, EventKind::Insertion]),
            };
            let kind = kinds[usize::from(switch.on)];
            told.add(time, kind, None, format!("{} {}", switch.name, words.sentence(&news)));
        }
    }
}

struct Told<'a> {
    corridor: &'a Arc<str>,
    events: Vec<Event>,
}

impl Told<'_> {
    fn add(&mut self, time: DateTime<Utc>, kind: EventKind, state: Option<State>, text: String) {
        self.events.push(Event { time, corridor: Some(self.corridor.clone()), kind, state, text });
    }
}

impl Words {
    fn sentence(&self, news: &News<bool>) -> String {
        let is = |value: bool| self.is[usize::from(value)];
        match *news {
            News::Changed { to, .. } => self.turns[usize::from(to)].into(),
            News::Passed { was, lasted } => format!("was {} for {}", is(was), span(lasted)),
            News::Fluttered { from, to, changes, within, now } => {
                to_and_fro("", [is(from), is(to)], changes, within, is(now))
            }
        }
    }
}

/// What a step did, and how surely.
fn sentence(step: &Step, assessment: &Assessment) -> String {
    let [from, to] = &assessment.sources;
    let kv = |side: usize| format!("{:+.1} kV", step.de_kv[side]).replace('-', "−");
    let what = match step.moved {
        Moved::Neither => "neither side moved".to_owned(),
        Moved::From => format!("{} moved by {}", from.bus, kv(0)),
        Moved::To => format!("{} moved by {}", to.bus, kv(1)),
        Moved::Both => format!("{} moved by {}, {} by {}", from.bus, kv(0), to.bus, kv(1)),
    };
    let widened = if step.widened { "; its reactance is taken as less well known again" } else { "" };
    format!("step: {what} ({:.0} %){widened}", 100.0 * step.probability)
}

fn to_and_fro(what: &str, [one, other]: [&str; 2], changes: u32, within: TimeDelta, now: &str) -> String {
    format!("{what}{one} ↔ {other}, {changes} changes in {}; {now} now", span(within))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample;

    /// What is told of a course that changes after ten seconds for so many seconds.
    fn told(lasts_s: i64, change: impl Fn(&mut Assessment)) -> Vec<String> {
        let mut teller = Teller::new(&sample::at(0, 212.0));
        let lines = (0..200).flat_map(|second| {
            let mut assessment = sample::at(second, 212.0);
            if (10..10 + lasts_s).contains(&second) {
                change(&mut assessment);
            }
            teller.take(&assessment)
        });
        lines.map(|event| event.text).collect()
    }

    #[test]
    fn each_change_that_lasts_is_told_once_and_in_words() {
        let nothing: Vec<String> = Vec::new();
        assert_eq!(told(300, |_| ()), nothing);
        assert_eq!(
            told(300, |a| a.fit.suspects.push("SV1.to.mw".into())),
            ["SV1.to.mw does not fit the rest and is set aside"]
        );
        assert_eq!(
            told(300, |a| a.fit.missing = vec!["a".into(), "b".into(), "c".into()]),
            ["a and 2 more: each is missing"]
        );
        assert_eq!(told(300, |a| a.exporter = Some("Velm".into())), ["direction reversed: Velm exports now"]);
        assert_eq!(
            told(300, |a| {
                let switches = Arc::make_mut(&mut a.switches);
                switches[2].on = false;
                switches[3].on = false;
            }),
            ["SV2-SC bypassed", "SV3 opened"]
        );
        assert_eq!(told(20, |a| a.state = State::Blind).len(), 2);
    }

    #[test]
    fn what_does_not_last_is_one_line() {
        assert_eq!(told(3, |a| a.fit.missing.push("SV1.to.mw".into())), ["SV1.to.mw was missing for 3 s"]);
        assert_eq!(told(2, |a| a.exporter = Some("Velm".into())), ["Velm exported for 2 s"]);
        let thin = told(4, |a| {
            (a.state, a.headroom_mw) = (State::Thin, Some(80.0));
        });
        assert_eq!(thin, ["thin for 4 s: +80 ±36 MW (SV2 out, angle)"]);
    }

    #[test]
    fn near_zero_there_is_no_direction() {
        let quiet = told(300, |a| (a.exporter, a.transfer_mw) = (Some("Velm".into()), Some(12.0)));
        assert!(quiet.is_empty(), "{quiet:?}");
    }

    #[test]
    fn a_corridor_at_its_threshold_fills_no_page() {
        let mut teller = Teller::new(&sample::at(0, 105.0));
        let hovering = |second: i64| 100.0 + 8.0 * (second as f64 * 0.9).sin() + 6.0 * (second as f64 * 0.17).sin();
        let lines: Vec<_> = (0..3600).flat_map(|second| teller.take(&sample::at(second, hovering(second)))).collect();
        assert!((1..12).contains(&lines.len()), "{} lines", lines.len());
        assert!(lines.last().unwrap().text.contains("thin ↔ ample"), "{:?}", lines.last());
    }
}
