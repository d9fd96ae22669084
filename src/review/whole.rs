use std::{
    collections::{BTreeMap, BTreeSet},
    sync::Arc,
};

use chrono::{DateTime, NaiveDate, TimeDelta, Utc};
use serde::Serialize;

use super::{Beginning, Course, Day, FileNote, Least, MeterNote, SourceNote, Tallied, bench::silent_ms};
use crate::{
    desk::State,
    events::{Event, EventKind, gap},
};

/// Events of a whole review; where there are more, all of the least telling kinds go.
const MOST_EVENTS: usize = 20_000;
/// The least telling first.
const GO_FIRST: [EventKind; 12] = [
    EventKind::Step,
    EventKind::Meter,
    EventKind::Act,
    EventKind::Direction,
    EventKind::State,
    EventKind::Alarm,
    EventKind::Insertion,
    EventKind::Bypass,
    EventKind::Program,
    EventKind::Gap,
    EventKind::Return,
    EventKind::Trip,
];

/// Any number of days put together.
#[derive(Debug, Clone, PartialEq)]
pub struct Review {
    max_age: TimeDelta,
    /// Time of the first and of the last frame.
    pub span: Option<(DateTime<Utc>, DateTime<Utc>)>,
    /// Frames.
    pub frames: u64,
    /// Time with data, ms.
    pub covered_ms: i64,
    /// Time between the first and the last frame without data, ms.
    pub silent_ms: i64,
    /// What it was read from.
    pub files: Vec<FileNote>,
    /// What a reader should know, with the day it is about.
    pub findings: Vec<(NaiveDate, String)>,
    /// What happened, in order.
    pub events: Vec<Event>,
    /// Events left out, because there were too many.
    pub events_left_out: u64,
    gone: BTreeSet<EventKind>,
    /// Each day in brief.
    pub days: Vec<DayFigures>,
    /// One each, in the order of the configuration.
    pub corridors: Vec<CorridorReview>,
}

/// One corridor over all days.
#[derive(Debug, Clone, PartialEq)]
pub struct CorridorReview {
    /// The corridor.
    pub corridor: Arc<str>,
    /// As it was.
    pub was: Course,
    /// As it would have been, where a change was asked for that touches it.
    pub what_if: Option<Course>,
    /// What stood behind the terminals at the first and at the last frame; `from`, then `to`.
    pub sources: Option<[[SourceNote; 2]; 2]>,
    /// Channels that were missing or set aside, by name.
    pub meters: BTreeMap<Arc<str>, MeterNote>,
}

/// A day in brief.
#[derive(Debug, Clone, PartialEq)]
pub struct DayFigures {
    /// Which.
    pub date: NaiveDate,
    /// How it began.
    pub beginning: Beginning,
    /// Frames.
    pub frames: u64,
    /// Time with data, ms.
    pub covered_ms: i64,
    /// Time between its first and its last frame without data, ms.
    pub silent_ms: i64,
    /// Each corridor, as it was and as it would have been.
    pub corridors: Vec<(Brief, Option<Brief>)>,
}

/// A corridor's day in brief.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Brief {
    /// Time in each state.
    pub state_ms: Tallied<State>,
    /// Lowest and highest transfer, MW, positive from `from` to `to`.
    pub transfer_mw: Option<[f64; 2]>,
    /// Its mean.
    pub mean_transfer_mw: Option<f64>,
    /// Time without any balance, ms.
    pub unbalanced_ms: i64,
    /// The lowest headroom, where there was a balance all the time.
    pub least: Option<Least>,
    /// Headroom that was there for half of the time, and for 95 %, whole MW.
    pub held_mw: [Option<i32>; 2],
    /// Alarms raised.
    pub alarms: u64,
}

impl Brief {
    fn of(course: &Course) -> Self {
        Self {
            state_ms: course.state_ms.clone(),
            transfer_mw: course.transfer_mw,
            mean_transfer_mw: course.mean_transfer_mw(),
            unbalanced_ms: course.unbalanced.map_or(0, |unbalanced| unbalanced.ms),
            least: course.lowest().cloned(),
            held_mw: [0.5, 0.95].map(|part| course.held_for(part)),
            alarms: course.alarms.iter().map(|count| count.raised).sum(),
        }
    }
}

impl Review {
    /// Nothing yet. `max_age` is how long a value stands.
    pub fn new(max_age: TimeDelta) -> Self {
        Self {
            max_age,
            span: None,
            frames: 0,
            covered_ms: 0,
            silent_ms: 0,
            files: Vec::new(),
            findings: Vec::new(),
            events: Vec::new(),
            events_left_out: 0,
            gone: BTreeSet::new(),
            days: Vec::new(),
            corridors: Vec::new(),
        }
    }

    /// Adds a day, which is later than all before it.
    pub fn add(&mut self, day: Day) {
        if let Some((_, last)) = self.span {
            self.silent_ms += silent_ms(last, day.first, self.max_age);
            self.events.extend(gap(last, day.first, self.max_age));
        }
        self.span = Some((self.span.map_or(day.first, |(first, _)| first), day.last));
        self.frames += day.frames;
        self.covered_ms += day.covered_ms;
        self.silent_ms += day.silent_ms;
        self.findings.extend(day.findings.into_iter().map(|finding| (day.date, finding)));
        day.files.into_iter().for_each(|file| self.note(file));
        self.events_left_out += day.events_left_out;
        self.events.extend(day.events);
        self.thin_out();
        self.days.push(DayFigures {
            date: day.date,
            beginning: day.beginning,
            frames: day.frames,
            covered_ms: day.covered_ms,
            silent_ms: day.silent_ms,
            corridors: day
                .corridors
                .iter()
                .map(|corridor| (Brief::of(&corridor.was), corridor.what_if.as_ref().map(Brief::of)))
                .collect(),
        });
        for corridor in day.corridors {
            match self.corridors.iter_mut().find(|known| known.corridor == corridor.corridor) {
                Some(known) => known.add(CorridorReview::from(corridor)),
                None => self.corridors.push(corridor.into()),
            }
        }
    }

    /// A file of several days is one file.
    fn note(&mut self, file: FileNote) {
        match self.files.iter_mut().find(|known| known.name == file.name) {
            Some(known) => known.findings.extend(file.findings),
            None => self.files.push(file),
        }
    }

    /// Keeps the events few, in a way that does not depend on how the days are added.
    fn thin_out(&mut self) {
        let mut kinds = GO_FIRST.into_iter();
        loop {
            let before = self.events.len();
            self.events.retain(|event| !self.gone.contains(&event.kind));
            self.events_left_out += (before - self.events.len()) as u64;
            let Some(kind) = kinds.next().filter(|_| self.events.len() > MOST_EVENTS) else { return };
            self.gone.insert(kind);
        }
    }

    /// At most so many of the events, in order: the most telling kinds, and of equals the first.
    pub fn most_telling(&self, most: usize) -> Vec<&Event> {
        let telling = |event: &Event| GO_FIRST.iter().position(|kind| *kind == event.kind);
        let mut places: Vec<usize> = (0..self.events.len()).collect();
        places.sort_by_key(|place| std::cmp::Reverse(telling(&self.events[*place])));
        places.truncate(most);
        places.sort_unstable();
        places.into_iter().map(|place| &self.events[place]).collect()
    }

    /// Part of the time for which there were data, 0 to 1; `None` without any frame.
    pub fn availability(&self) -> Option<f64> {
        self.part(self.covered_ms)
    }

    /// So much time as a part of all of it, 0 to 1; `None` without any.
    pub fn part(&self, ms: i64) -> Option<f64> {
        let whole = self.covered_ms + self.silent_ms;
        (whole > 0).then(|| ms as f64 / whole as f64)
    }

    /// Time between the first and the last frame, ms.
    pub fn span_ms(&self) -> i64 {
        self.span.map_or(0, |(first, last)| span_ms(first, last))
    }
}

fn span_ms(first: DateTime<Utc>, last: DateTime<Utc>) -> i64 {
    last.timestamp_millis() - first.timestamp_millis()
}

impl From<super::CorridorDay> for CorridorReview {
    fn from(day: super::CorridorDay) -> Self {
        Self { corridor: day.corridor, was: day.was, what_if: day.what_if, sources: day.sources, meters: day.meters }
    }
}

impl CorridorReview {
    fn add(&mut self, later: Self) {
        self.was.merge(&later.was);
        match (&mut self.what_if, later.what_if) {
            (Some(what_if), Some(later)) => what_if.merge(&later),
            (what_if, later) => *what_if = what_if.take().or(later),
        }
        self.sources = match (self.sources.take(), later.sources) {
            (Some([first, _]), Some([_, last])) => Some([first, last]),
            (one, other) => one.or(other),
        };
        for (channel, note) in later.meters {
            let known = self.meters.entry(channel).or_default();
            known.missing_ms += note.missing_ms;
            known.suspect_ms += note.suspect_ms;
        }
    }
}
