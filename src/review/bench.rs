use std::sync::Arc;

use chrono::{DateTime, NaiveDate, NaiveTime, SecondsFormat, TimeDelta, Utc};
use rayon::prelude::*;
use serde_json::value::RawValue;

use super::{Beginning, CorridorDay, Day, FileNote, SourceNote};
use crate::{
    alarm::{CorridorBoard, Transition},
    config::Config,
    desk::{Alternative, Assessment, CorridorDesk, Desk, State},
    events::{Event, EventKind, Teller, gap},
    feed::{Aside, Channels, Frame, FrameText, Holder, Kept, Present, Snapshot, Start, Why},
};

/// Events of a corridor and a day; more than a reader would go through.
const MOST_EVENTS: usize = 1000;

/// What is said of recorded configurations on a day, and of each.
const MOST_FINDINGS: usize = 20;
const MOST_DIFFERENCES: usize = 8;

/// What is to be reviewed, and how.
#[derive(Debug, Clone)]
pub struct Task {
    /// Corridors, alarms, settings.
    pub config: Arc<Config>,
    /// Its text.
    pub configuration: Arc<str>,
    /// What its corridors read.
    pub channels: Arc<Channels>,
    /// Says what differs between a recording's configuration and the one it is reviewed with.
    pub differences: fn(&Config, &Config) -> Vec<String>,
    /// Changes that were asked for, corridor by corridor.
    pub alternatives: Vec<Option<Alternative>>,
}

impl Task {
    /// A review of what was, without any change.
    pub fn new(config: Config, configuration: Arc<str>, differences: fn(&Config, &Config) -> Vec<String>) -> Self {
        Self {
            channels: Arc::new(Channels::new(&config)),
            alternatives: vec![None; config.grid.corridors.len()],
            config: Arc::new(config),
            configuration,
            differences,
        }
    }
}

/// Takes every assessment as it is made, one for each corridor: to write it down in full.
pub trait Rows: Send {
    /// Takes the next one, and what it would have been with the change that was asked for.
    fn take(&mut self, was: &Assessment, what_if: Option<&Assessment>);
}

impl<R: Rows> Rows for Option<R> {
    fn take(&mut self, was: &Assessment, what_if: Option<&Assessment>) {
        if let Some(rows) = self {
            rows.take(was, what_if);
        }
    }
}

/// Keeps nothing.
impl Rows for () {
    fn take(&mut self, _was: &Assessment, _what_if: Option<&Assessment>) {}
}

/// One day at work: frames in, a [`Day`] out.
#[derive(Debug)]
pub struct Bench<R> {
    config: Arc<Config>,
    differences: fn(&Config, &Config) -> Vec<String>,
    max_age: TimeDelta,
    holder: Holder,
    seats: Vec<Seat<R>>,
    beginning: Beginning,
    span: Option<(DateTime<Utc>, DateTime<Utc>)>,
    frames: u64,
    covered_ms: i64,
    silent_ms: i64,
    events: Vec<Event>,
    findings: Vec<String>,
}

/// One corridor, which shares nothing with the others.
#[derive(Debug)]
struct Seat<R> {
    max_age: TimeDelta,
    desk: CorridorDesk,
    board: CorridorBoard,
    rows: R,
    teller: Option<Teller>,
    last: Option<Assessment>,
    what_if: Option<WhatIf>,
    first_sources: Option<[SourceNote; 2]>,
    day: CorridorDay,
    events: Vec<Event>,
    left_out: u64,
    transitions: Vec<Transition>,
}

/// What a corridor would be with a change.
#[derive(Debug)]
struct WhatIf {
    alternative: Alternative,
    board: CorridorBoard,
    last: Option<Assessment>,
}

impl<R: Rows> Bench<R> {
    /// At the beginning of a day, with nothing known but the configuration. `rows` are one for each corridor.
    pub fn new(task: &Task, rows: impl IntoIterator<Item = R>) -> Self {
        let config = &task.config;
        let max_age = config.feed.max_age();
        let desks = Desk::new(config, &task.channels).corridors.into_iter();
        let seats = desks.zip(&config.alarms).zip(&task.alternatives).zip(rows);
        let seats = seats.map(|(((desk, alarms), alternative), rows)| {
            let board = CorridorBoard::new(desk.corridor(), alarms);
            Seat::new(desk, board, alternative.clone(), rows, max_age)
        });
        Self {
            config: config.clone(),
            differences: task.differences,
            max_age,
            holder: Holder::new(&task.channels, max_age),
            seats: seats.collect(),
            beginning: Beginning::Configured,
            span: None,
            frames: 0,
            covered_ms: 0,
            silent_ms: 0,
            events: Vec::new(),
            findings: Vec::new(),
        }
    }

    /// Takes frames of the day, all corridors at once on the threads of the pool this is called in.
    pub fn take(&mut self, frames: &[Frame]) {
        let snapshots: Vec<Snapshot> = frames.iter().filter_map(|frame| self.holder.take(frame)).collect();
        for snapshot in &snapshots {
            self.note(snapshot.time);
            if let Some(start) = snapshot.start() {
                self.begin(start, snapshot.time);
            }
        }
        self.seats
            .par_iter_mut()
            .with_max_len(1)
            .for_each(|seat| snapshots.iter().for_each(|snapshot| seat.take(snapshot)));
    }

    /// Every corridor takes up by itself how it stood; here is what there is to say of it.
    fn begin(&mut self, start: &Start, time: DateTime<Utc>) {
        match self.beginning {
            Beginning::Carried if self.frames == 1 => return,
            _ if self.frames == 1 => self.beginning = Beginning::Recorded,
            _ => {}
        }
        if self.findings.len() < MOST_FINDINGS {
            self.findings.extend(self.other_configuration(start, time));
        }
        let what = match start.why {
            Why::Start => "the recording program was started",
            Why::Configuration => "another configuration came into force",
            Why::Gap => "frames before this one could not be recorded",
            Why::Day => return,
        };
        self.tell(Event::of_program(time, what.into()));
    }

    /// What differs between the recorded configuration and the one in use; `None` if nothing does.
    fn other_configuration(&self, start: &Start, time: DateTime<Utc>) -> Option<String> {
        let differences = match start.config() {
            Some(recorded) => (self.differences)(recorded, &self.config),
            None => vec!["it cannot be read".into()],
        };
        if differences.is_empty() {
            return None;
        }
        let some = differences.iter().take(MOST_DIFFERENCES).map(String::as_str).collect::<Vec<_>>().join("; ");
        let more = match differences.len().saturating_sub(MOST_DIFFERENCES) {
            0 => String::new(),
            more => format!("; and {more} more"),
        };
        let stamp = time.to_rfc3339_opts(SecondsFormat::AutoSi, true);
        Some(format!("recorded from {stamp} with another configuration than it is reviewed with: {some}{more}"))
    }

    /// Keeps what happened to all corridors.
    fn tell(&mut self, event: Event) {
        if self.events.len() < MOST_EVENTS {
            self.events.push(event);
        }
    }

    fn note(&mut self, time: DateTime<Utc>) {
        self.frames += 1;
        let Some((first, last)) = self.span else {
            self.span = Some((time, time));
            return;
        };
        self.covered_ms += lasted_ms(last, time, self.max_age);
        self.silent_ms += silent_ms(last, time, self.max_age);
        if let Some(gap) = gap(last, time, self.max_age) {
            self.tell(gap);
        }
        self.span = Some((first, time));
    }

    /// Goes on from the end of another day, unless the first frame says itself how everything stood.
    pub fn carry(&mut self, end: &RawValue, task: &Task, first: &mut Frame) {
        if first.aside.as_ref().is_some_and(|aside| aside.start.is_some()) {
            return;
        }
        if let Some(aside) = Aside::with_start(end, &task.channels) {
            self.beginning = Beginning::Carried;
            first.aside = Some(aside);
        }
    }

    /// How everything stands, for the next day to go on from.
    pub fn end(&self, task: &Task) -> Option<Box<RawValue>> {
        let stands = |seat: &Seat<R>| Kept { desk: seat.desk.memory(), alarms: seat.board.memory() };
        let present = Present {
            why: Why::Day,
            configuration: &task.configuration,
            holder: &self.holder,
            corridors: self.seats.iter().map(|seat| (&*seat.day.corridor, stands(seat))).collect(),
        };
        let text = present.write(&FrameText::new(&task.config, &task.channels)).ok()?;
        RawValue::from_string(text).ok()
    }

    /// What was taken down of each corridor.
    pub fn rows(&mut self) -> impl Iterator<Item = &mut R> {
        self.seats.iter_mut().map(|seat| &mut seat.rows)
    }

    /// Ends the day; `None` when there was not a single frame.
    pub fn finish(self, files: Vec<FileNote>, mut findings: Vec<String>) -> Option<Day> {
        let (first, last) = self.span?;
        findings.extend(self.findings);
        let midnight = midnight_after(last.date_naive());
        let (mut events, mut events_left_out) = (self.events, 0);
        let seats = self.seats.into_iter();
        let corridors = seats.filter_map(|seat| seat.finish(midnight, &mut events, &mut events_left_out)).collect();
        events.sort_by_key(|event| event.time);
        Some(Day {
            date: first.date_naive(),
            beginning: self.beginning,
            files,
            first,
            last,
            frames: self.frames,
            covered_ms: self.covered_ms + lasted_ms(last, midnight, self.max_age),
            silent_ms: self.silent_ms,
            findings,
            events,
            events_left_out,
            corridors,
        })
    }
}

impl<R: Rows> Seat<R> {
    fn new(
        desk: CorridorDesk,
        board: CorridorBoard,
        alternative: Option<Alternative>,
        rows: R,
        max_age: TimeDelta,
    ) -> Self {
        let what_if = |alternative| WhatIf { alternative, board: board.clone(), last: None };
        let what_if = alternative.map(what_if);
        Self {
            max_age,
            day: CorridorDay::new(desk.corridor().name.clone(), what_if.is_some()),
            what_if,
            desk,
            board,
            rows,
            teller: None,
            last: None,
            first_sources: None,
            events: Vec::new(),
            left_out: 0,
            transitions: Vec::new(),
        }
    }

    fn take(&mut self, snapshot: &Snapshot) {
        let (assessment, altered) = match &mut self.what_if {
            None => (self.desk.assess(snapshot), None),
            Some(what_if) => {
                let (assessment, altered) = self.desk.assess_with(snapshot, &mut what_if.alternative);
                (assessment, Some(altered))
            }
        };
        self.stood_until(assessment.time);
        self.rows.take(&assessment, altered.as_ref());
        self.day.was.take(self.desk.corridor(), &assessment);
        self.tell(snapshot.aside.as_deref(), &assessment);
        self.last = Some(assessment);
        if let Some((altered, (what_if, course))) = altered.zip(self.what_if.as_mut().zip(self.day.what_if.as_mut())) {
            course.take(self.desk.corridor(), &altered);
            if let Some(aside) = &snapshot.aside {
                what_if.board.take_up(aside, &mut self.transitions);
            }
            what_if.board.observe(&altered, &mut self.transitions);
            course.count(&self.transitions);
            self.transitions.clear();
            what_if.last = Some(altered);
        }
    }

    /// Takes in that what was seen last stood until a time.
    fn stood_until(&mut self, until: DateTime<Utc>) {
        let Some(assessment) = &self.last else { return };
        let ms = lasted_ms(assessment.time, until, self.max_age);
        self.day.was.stood(self.desk.corridor(), assessment, ms);
        let altered = self.what_if.as_ref().and_then(|what_if| what_if.last.as_ref());
        if let Some((altered, course)) = altered.zip(self.day.what_if.as_mut()) {
            course.stood(self.desk.corridor(), altered, ms);
        }
        for channel in &assessment.fit.missing {
            self.day.meter(channel).missing_ms += ms;
        }
        for channel in &assessment.fit.suspects {
            self.day.meter(channel).suspect_ms += ms;
        }
    }

    fn tell(&mut self, aside: Option<&Aside>, assessment: &Assessment) {
        self.first_sources.get_or_insert_with(|| SourceNote::both(assessment));
        if self.day.was.frames == 1 && assessment.state != State::Ample {
            self.keep(Event::first(assessment));
        }
        let teller = self.teller.get_or_insert_with(|| Teller::new(assessment));
        let told = teller.take(assessment);
        for event in told {
            self.keep(event);
        }
        let mut transitions = std::mem::take(&mut self.transitions);
        if let Some(aside) = aside {
            self.board.take_up(aside, &mut transitions);
        }
        self.board.observe(assessment, &mut transitions);
        self.day.was.count(&transitions);
        transitions.drain(..).for_each(|transition| self.keep(Event::of_alarm(&transition)));
        self.transitions = transitions;
    }

    /// Keeps an event, the most telling ones where there are too many.
    fn keep(&mut self, event: Event) {
        if self.events.len() >= MOST_EVENTS && matches!(event.kind, EventKind::Meter | EventKind::Step)
            || self.events.len() >= 2 * MOST_EVENTS
        {
            self.left_out += 1;
        } else {
            self.events.push(event);
        }
    }

    fn finish(mut self, midnight: DateTime<Utc>, events: &mut Vec<Event>, left_out: &mut u64) -> Option<CorridorDay> {
        self.stood_until(midnight);
        let end = SourceNote::both(&self.last?);
        events.append(&mut self.events);
        *left_out += self.left_out;
        let first = self.first_sources.unwrap_or_else(|| end.clone());
        Some(CorridorDay { sources: Some([first, end]), ..self.day })
    }
}

/// For how long what was seen at one time stands until the next, ms.
fn lasted_ms(from: DateTime<Utc>, until: DateTime<Utc>, max_age: TimeDelta) -> i64 {
    (until.timestamp_millis() - from.timestamp_millis()).min(max_age.num_milliseconds())
}

/// For how long nothing stood between two frames, ms.
pub(super) fn silent_ms(from: DateTime<Utc>, until: DateTime<Utc>, max_age: TimeDelta) -> i64 {
    until.timestamp_millis() - from.timestamp_millis() - lasted_ms(from, until, max_age)
}

fn midnight_after(date: NaiveDate) -> DateTime<Utc> {
    let next = date.succ_opt().unwrap_or(date);
    next.and_time(NaiveTime::MIN).and_utc()
}
