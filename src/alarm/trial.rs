//! What a set of alarms would have done over recorded days, in the performance measures of ANSI/ISA-18.2 (2016, clause
//! 16) and IEC 62682 (2014, clause 16); the figures are from memory of the standards.

use std::{collections::BTreeMap, sync::Arc};

use chrono::{DateTime, TimeDelta, Utc};

use super::{CorridorBoard, Definition, Kind, Priority, Transition};
use crate::{desk::Assessment, grid::Corridor};

/// Alarms in 10 minutes, on average, that one operator can very likely deal with.
pub const ACCEPTABLE_PER_10_MIN: f64 = 1.0;
/// The most, on average, that he can manage.
pub const MANAGEABLE_PER_10_MIN: f64 = 2.0;
/// More than this many in 10 minutes begin a flood.
pub const FLOOD_BEGINS_ABOVE: usize = 10;
/// Fewer than this many in 10 minutes end it.
pub const FLOOD_ENDS_BELOW: usize = 5;
/// Share of the time that may be in flood, %.
pub const ACCEPTABLE_FLOOD_PCT: f64 = 1.0;
/// An alarm that stands for longer is stale.
pub const STALE: TimeDelta = TimeDelta::hours(24);
/// An alarm that is raised so often within [`CHATTER_SPAN`] chatters.
pub const CHATTER_RAISES: usize = 3;
/// See [`CHATTER_RAISES`].
pub const CHATTER_SPAN: TimeDelta = TimeDelta::minutes(1);

const INTERVAL: TimeDelta = TimeDelta::minutes(10);

/// One corridor under one set of alarms, frame by frame; nobody acknowledges, shelves or suppresses.
#[derive(Debug, Clone)]
pub struct Trial {
    board: CorridorBoard,
    courses: Vec<Course>,
    span: Option<(DateTime<Utc>, DateTime<Utc>)>,
    /// When the headroom was last at or below zero.
    last_spent: Option<DateTime<Utc>>,
    ends: Vec<End>,
    transitions: Vec<Transition>,
}

/// The course of one alarm.
#[derive(Debug, Clone)]
struct Course {
    definition: Arc<Definition>,
    raised: Vec<DateTime<Utc>>,
    standing_since: Option<DateTime<Utc>>,
    stood: TimeDelta,
    longest: TimeDelta,
}

/// The end of a margin: the headroom of a corridor came to zero.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct End {
    /// When.
    pub time: DateTime<Utc>,
    /// Where.
    pub corridor: Arc<str>,
    /// How long an alarm on the margin had been standing by then; `None`: none was.
    pub lead: Option<TimeDelta>,
}

/// What came of a set of alarms.
#[derive(Debug, Clone, Default)]
pub struct Figures {
    /// Recorded time, hours.
    pub hours: f64,
    /// Alarms by priority, from low to urgent.
    pub by_priority: [usize; Priority::ALL.len()],
    /// By kind: alarms, and minutes for which they stood.
    pub by_kind: BTreeMap<Kind, (usize, f64)>,
    /// Most alarms in 10 minutes of the clock.
    pub most_in_10_min: usize,
    /// Floods.
    pub floods: usize,
    /// Time in flood, %.
    pub flood_pct: f64,
    /// Alarms that chatter: corridor and name.
    pub chattering: Vec<(Arc<str>, Arc<str>)>,
    /// Alarms that are stale.
    pub stale: Vec<(Arc<str>, Arc<str>)>,
    /// Ends of the margins, in order.
    pub ends: Vec<End>,
}

impl Trial {
    /// Nothing seen yet.
    pub fn new(corridor: &Corridor, definitions: &[Definition]) -> Self {
        let board = CorridorBoard::new(corridor, definitions);
        let course = |definition: &Arc<Definition>| Course {
            definition: definition.clone(),
            raised: Vec::new(),
            standing_since: None,
            stood: TimeDelta::zero(),
            longest: TimeDelta::zero(),
        };
        let courses = board.alarms().iter().map(|alarm| course(&alarm.definition)).collect();
        Self { board, courses, span: None, last_spent: None, ends: Vec::new(), transitions: Vec::new() }
    }

    /// Takes the next assessment in.
    pub fn take(&mut self, assessment: &Assessment) {
        let time = assessment.time;
        self.span = Some((self.span.map_or(time, |(first, _)| first), time));
        self.look_for_an_end(assessment);
        self.board.observe(assessment, &mut self.transitions);
        for transition in self.transitions.drain(..) {
            // Both are in the order of the definitions, and few transitions come at once.
            let course = self.courses.iter_mut().find(|course| course.definition.name == transition.alarm);
            if let Some(course) = course {
                course.take(&transition);
            }
        }
    }

    /// The headroom is at its end; what is back for less than 10 minutes is the same end.
    fn look_for_an_end(&mut self, assessment: &Assessment) {
        let time = assessment.time;
        if assessment.headroom_mw.is_none_or(|headroom_mw| headroom_mw > 0.0) {
            return;
        }
        if self.last_spent.is_none_or(|last| time - last > INTERVAL) {
            let warning = self.courses.iter().filter(|course| course.definition.kind.warns());
            let since = warning.filter_map(|course| course.standing_since).min();
            let lead = since.map(|since| time - since).filter(|lead| *lead > TimeDelta::zero());
            self.ends.push(End { time, corridor: self.board.corridor().clone(), lead });
        }
        self.last_spent = Some(time);
    }
}

impl Course {
    fn take(&mut self, transition: &Transition) {
        if transition.is_annunciated() {
            self.raised.push(transition.time);
        }
        match self.standing_since {
            None if transition.to.is_standing() => self.standing_since = Some(transition.time),
            Some(_) if !transition.to.is_standing() => self.end(transition.time),
            _ => {}
        }
    }

    fn end(&mut self, time: DateTime<Utc>) {
        if let Some(since) = self.standing_since.take() {
            self.stood += time - since;
            self.longest = self.longest.max(time - since);
        }
    }

    fn chatters(&self) -> bool {
        let spans = self.raised.windows(CHATTER_RAISES);
        spans.into_iter().any(|raised| raised[CHATTER_RAISES - 1] - raised[0] <= CHATTER_SPAN)
    }
}

impl Figures {
    /// Of all corridors under one set of alarms.
    pub fn of(trials: impl IntoIterator<Item = Trial>) -> Self {
        let mut figures = Self::default();
        let mut raised = Vec::new();
        let mut span: Option<(DateTime<Utc>, DateTime<Utc>)> = None;
        for mut trial in trials {
            let Some((first, last)) = trial.span else { continue };
            span = Some(span.map_or((first, last), |(a, b)| (a.min(first), b.max(last))));
            for course in &mut trial.courses {
                course.end(last);
                let name = || (trial.board.corridor().clone(), course.definition.name.clone());
                figures.by_priority[course.definition.priority as usize] += course.raised.len();
                let (alarms, minutes) = figures.by_kind.entry(course.definition.kind).or_default();
                *alarms += course.raised.len();
                *minutes += course.stood.as_seconds_f64() / 60.0;
                figures.chattering.extend(course.chatters().then(name));
                figures.stale.extend((course.longest > STALE).then(name));
                raised.append(&mut course.raised);
            }
            figures.ends.append(&mut trial.ends);
        }
        figures.ends.sort_by_key(|end| end.time);
        if let Some((first, last)) = span {
            figures.hours = (last - first).as_seconds_f64() / 3600.0;
            figures.judge_intervals(&raised, first, last);
        }
        figures
    }

    fn judge_intervals(&mut self, raised: &[DateTime<Utc>], first: DateTime<Utc>, last: DateTime<Utc>) {
        let interval = |time: DateTime<Utc>| time.timestamp().div_euclid(INTERVAL.num_seconds());
        let mut counts: BTreeMap<i64, usize> = BTreeMap::new();
        for time in raised {
            *counts.entry(interval(*time)).or_default() += 1;
        }
        let (mut is_flood, mut in_flood, mut before) = (false, 0_usize, None);
        for (interval, count) in counts {
            // An interval without any in between has ended a flood.
            is_flood &= before.is_none_or(|before| interval == before + 1) && count >= FLOOD_ENDS_BELOW;
            if !is_flood && count > FLOOD_BEGINS_ABOVE {
                is_flood = true;
                self.floods += 1;
            }
            in_flood += usize::from(is_flood);
            before = Some(interval);
            self.most_in_10_min = self.most_in_10_min.max(count);
        }
        self.flood_pct = 100.0 * in_flood as f64 / (interval(last) - interval(first) + 1) as f64;
    }

    /// All alarms.
    pub fn alarms(&self) -> usize {
        self.by_priority.iter().sum()
    }

    /// Alarms per hour; `None` without any time.
    pub fn per_hour(&self) -> Option<f64> {
        (self.hours > 0.0).then(|| self.alarms() as f64 / self.hours)
    }

    /// Alarms per 10 minutes.
    pub fn per_10_min(&self) -> Option<f64> {
        self.per_hour().map(|per_hour| per_hour / 6.0)
    }

    /// Minutes for which alarms stood, all together.
    pub fn standing_min(&self) -> f64 {
        self.by_kind.values().map(|(_, minutes)| minutes).sum()
    }

    /// Ends of margins of which no alarm warned.
    pub fn missed(&self) -> usize {
        self.ends.iter().filter(|end| end.lead.is_none()).count()
    }

    /// Median time between the first alarm and the end, of those that were warned of.
    pub fn median_lead(&self) -> Option<TimeDelta> {
        let mut leads: Vec<TimeDelta> = self.ends.iter().filter_map(|end| end.lead).collect();
        leads.sort_unstable();
        leads.get(leads.len() / 2).copied()
    }
}
