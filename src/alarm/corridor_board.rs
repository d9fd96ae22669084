use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};
use serde::{Deserialize, Serialize};

use super::{
    Action, Definition, Event, Kind, Note, Refusal, Restored, State, Suppression, Transition,
    condition::Condition,
    operator::written,
    reading::{Reader, Reading},
    state::Standpoint,
};
use crate::{desk::Assessment, feed::stamp, grid::Corridor};

/// The alarms of one corridor: shares nothing with the others, so that each may be kept on its own thread.
#[derive(Debug, Clone)]
pub struct CorridorBoard {
    pub(super) corridor: Arc<str>,
    pub(super) reader: Reader,
    pub(super) alarms: Vec<Alarm>,
    /// Time of the last frame.
    pub(super) latest: Option<DateTime<Utc>>,
}

/// One alarm and how it stands.
#[derive(Debug, Clone)]
pub struct Alarm {
    /// What it watches.
    pub definition: Arc<Definition>,
    /// How it stands.
    pub standing: Standing,
    pub(super) condition: Condition,
    pub(super) suppressed: bool,
}

/// How an alarm stands: what is kept beyond the end of the program.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Standing {
    /// Its state.
    pub state: State,
    /// Since when; `None`: from the beginning.
    #[serde(with = "stamp::optional")]
    pub since: Option<DateTime<Utc>>,
    /// When it was raised last.
    #[serde(with = "stamp::optional")]
    pub raised: Option<DateTime<Utc>>,
    /// The watched value then.
    pub value: Option<f64>,
    /// What that value was of.
    pub about: Option<Arc<str>>,
    /// End of the shelving.
    #[serde(with = "stamp::optional")]
    pub until: Option<DateTime<Utc>>,
    /// Why it is shelved or out of service.
    pub reason: Option<Arc<str>>,
    /// The last note put on it.
    pub note: Option<Arc<str>>,
}

impl Default for Standing {
    fn default() -> Self {
        Self {
            state: State::Normal,
            since: None,
            raised: None,
            value: None,
            about: None,
            until: None,
            reason: None,
            note: None,
        }
    }
}

impl CorridorBoard {
    /// A corridor's alarms, all normal.
    pub fn new(corridor: &Corridor, definitions: &[Definition]) -> Self {
        let alarm = |definition: &Definition| Alarm {
            definition: Arc::new(definition.clone()),
            standing: Standing::default(),
            condition: Condition::default(),
            suppressed: false,
        };
        Self {
            corridor: corridor.name.clone(),
            reader: Reader::new(corridor),
            alarms: definitions.iter().map(alarm).collect(),
            latest: None,
        }
    }

    /// The corridor's name.
    pub fn corridor(&self) -> &Arc<str> {
        &self.corridor
    }

    /// The alarms, in the order of their definitions.
    pub fn alarms(&self) -> &[Alarm] {
        &self.alarms
    }

    /// Takes the next assessment in, and adds what changes by it. One older than the last changes nothing.
    pub fn observe(&mut self, assessment: &Assessment, transitions: &mut Vec<Transition>) {
        let time = assessment.time;
        if self.latest.is_some_and(|latest| time < latest) {
            return;
        }
        self.elapse(time, transitions);
        self.latest = Some(time);
        self.reader.remember(assessment);
        for alarm in &mut self.alarms {
            let reading = self.reader.read(alarm.definition.kind, assessment);
            let shown = match reading {
                Reading::Value(value, about) => (Some(value), about),
                Reading::Absent | Reading::Unknown => (None, None),
            };
            let mut step = |alarm: &mut Alarm, event| {
                transitions.extend(alarm.step(&self.corridor, event, time, shown));
            };
            // First what the design says: a condition that begins with an alarm's own silences it from the start.
            if let Some(event) = alarm.judge_design(assessment) {
                step(alarm, event);
            }
            if let Some(event) = alarm.condition.take(&alarm.definition, time, reading) {
                step(alarm, event);
            }
        }
    }

    /// Takes in that time has passed without a frame: ends shelvings, and tells the age of the data.
    ///
    /// Silence between two frames is noticed at the second one at the latest, with the time at which it became too long.
    pub fn elapse(&mut self, now: DateTime<Utc>, transitions: &mut Vec<Transition>) {
        for alarm in &mut self.alarms {
            if alarm.definition.kind == Kind::DataAge
                && !alarm.condition.active
                && let Some(due) = self.latest.and_then(|latest| alarm.too_old_at(latest))
                && now >= due
            {
                alarm.condition = Condition::new(true);
                let age_s = alarm.definition.setpoint;
                transitions.extend(alarm.step(&self.corridor, Event::Alarm, due, (Some(age_s), None)));
            }
            if alarm.standing.state == State::Shelved && alarm.standing.until.is_none_or(|until| now >= until) {
                transitions.extend(alarm.step(&self.corridor, Event::ShelvingEnds, now, (None, None)));
            }
        }
    }

    /// Does what the operator wants at a time, which is that of the latest frame.
    pub fn act(&mut self, alarm: usize, action: &Action, time: DateTime<Utc>) -> Result<Transition, Refusal> {
        let alarm = self.alarms.get_mut(alarm).ok_or(Refusal::NotThere)?;
        let (reason, until, event) = (action.reason()?, action.until(time)?, action.event());
        let refusal = Refusal::NotPossible { state: alarm.standing.state, event };
        let mut transition = alarm.step(&self.corridor, event, time, (None, None)).ok_or(refusal)?;
        alarm.standing.reason.clone_from(&reason);
        alarm.standing.until = until;
        (transition.reason, transition.until) = (reason, until);
        Ok(transition)
    }

    /// Puts a note on an alarm.
    pub fn note(&mut self, alarm: usize, text: &str, time: DateTime<Utc>) -> Result<Note, Refusal> {
        let alarm = self.alarms.get_mut(alarm).ok_or(Refusal::NotThere)?;
        let text = written(text)?;
        alarm.standing.note = Some(text.clone());
        Ok(Note { time, corridor: self.corridor.clone(), alarm: alarm.definition.name.clone(), text })
    }

    /// Sets an alarm to how it was kept; false if there is none of that name.
    pub(super) fn restore(&mut self, restored: &Restored) -> bool {
        let alarm = self.alarms.iter_mut().find(|alarm| *alarm.definition.name == *restored.alarm);
        let found = alarm.is_some();
        if let Some(alarm) = alarm {
            let state = restored.standing.state;
            alarm.condition = Condition::new(state.is_standing());
            alarm.suppressed = state == State::Suppressed;
            alarm.standing = restored.standing.clone();
        }
        found
    }

    /// Goes on from another board of this corridor: alarms keep their state by name, and those that are gone are withdrawn.
    pub(super) fn take_over(&mut self, before: Self, time: DateTime<Utc>, transitions: &mut Vec<Transition>) {
        self.latest = before.latest;
        self.reader.carry(&before.reader);
        for mut old in before.alarms {
            let same = |alarm: &&mut Alarm| {
                alarm.definition.name == old.definition.name && alarm.definition.kind == old.definition.kind
            };
            if let Some(alarm) = self.alarms.iter_mut().find(same) {
                *alarm = Alarm { definition: alarm.definition.clone(), ..old };
            } else {
                transitions.extend(old.step(&self.corridor, Event::Withdraw, time, (None, None)));
            }
        }
    }

    /// Withdraws all alarms.
    pub(super) fn withdraw(mut self, time: DateTime<Utc>, transitions: &mut Vec<Transition>) {
        for alarm in &mut self.alarms {
            transitions.extend(alarm.step(&self.corridor, Event::Withdraw, time, (None, None)));
        }
    }
}

impl Alarm {
    /// Whether the condition holds now, shown or not.
    pub fn is_active(&self) -> bool {
        self.condition.active
    }

    /// Goes where an event leads.
    fn step(
        &mut self,
        corridor: &Arc<str>,
        event: Event,
        time: DateTime<Utc>,
        (value, about): (Option<f64>, Option<&Arc<str>>),
    ) -> Option<Transition> {
        let standpoint = Standpoint { active: self.condition.active, suppressed: self.suppressed };
        let from = self.standing.state;
        let to = from.after(event, standpoint)?;
        let standing = &mut self.standing;
        (standing.state, standing.since) = (to, Some(time));
        (standing.until, standing.reason) = (None, None);
        if to == State::Unacknowledged {
            (standing.raised, standing.value, standing.about) = (Some(time), value, about.cloned());
        }
        Some(Transition {
            time,
            corridor: corridor.clone(),
            alarm: self.definition.name.clone(),
            on: self.definition.kind,
            priority: self.definition.priority,
            event,
            from,
            to,
            value,
            about: about.cloned(),
            reason: None,
            until: None,
            by: None,
        })
    }

    /// The event when its design begins or ceases to suppress it; what is not known changes nothing.
    fn judge_design(&mut self, assessment: &Assessment) -> Option<Event> {
        let suppressed = holds(&self.definition.suppress_while, assessment)?;
        if suppressed == self.suppressed {
            return None;
        }
        self.suppressed = suppressed;
        Some(if suppressed { Event::Suppress } else { Event::Unsuppress })
    }

    /// When data of a time become too old; `None` beyond the end of time.
    fn too_old_at(&self, latest: DateTime<Utc>) -> Option<DateTime<Utc>> {
        // Setpoints end at a million seconds.
        #[allow(clippy::cast_possible_truncation)]
        let age = TimeDelta::milliseconds((1e3 * self.definition.setpoint) as i64);
        latest.checked_add_signed(age)?.checked_add_signed(self.definition.on_delay)
    }
}

/// Whether any of the conditions holds; `None` while the corridor is blind.
fn holds(suppression: &Suppression, assessment: &Assessment) -> Option<bool> {
    let transfer_mw = assessment.transfer_mw?;
    let is_out = |circuit: &Arc<str>| assessment.reclose.iter().any(|open| open.circuit == *circuit);
    Some(
        suppression.transfer_below_mw.is_some_and(|below_mw| transfer_mw < below_mw)
            || suppression.circuits_out.iter().any(is_out),
    )
}
