//! The page of events and marks: what it lists, what has the cursor, and what keys do there.

use std::{ops::ControlFlow, sync::Arc};

use chrono::{DateTime, Utc};
use crossterm::event::KeyCode;

use super::{App, Moment, MomentKind, Page, Typing, survey::insert};
use crate::{
    events::EventKind,
    screen::connection::{Mark, MarkReport, MarkWish, Order},
};

/// What the screen remembers of events and marks.
#[derive(Debug, Default)]
pub struct EventPage {
    /// The moment with the cursor; `None`: the one we are at.
    pub chosen: Option<Arc<Moment>>,
    /// What the list is narrowed to; empty: everything of these kinds.
    pub filter: String,
    /// Which kinds are listed.
    pub kinds: Kinds,
    /// The mark taken away last, which can be brought back.
    removed: Option<Mark>,
    /// What was asked for with marks, in words, until it is answered.
    pub(super) asked: Option<String>,
    /// Answers seen.
    answered: u64,
}

/// Kinds of moments that are listed together.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Kinds {
    /// All but steps, which come by the hundred.
    #[default]
    Most,
    /// Trips, returns, bypasses, insertions.
    Switching,
    /// States and directions.
    States,
    /// Alarms.
    Alarms,
    /// Lowest headrooms.
    Lows,
    /// Meters and gaps.
    Data,
    /// Steps of the sources.
    Steps,
    /// Marks.
    Marks,
    /// Everything.
    All,
}

impl Kinds {
    const ORDER: [Self; 9] = [
        Self::Most,
        Self::Switching,
        Self::States,
        Self::Alarms,
        Self::Lows,
        Self::Data,
        Self::Steps,
        Self::Marks,
        Self::All,
    ];

    /// What they are called.
    pub fn words(self) -> &'static str {
        match self {
            Self::Most => "all but steps",
            Self::Switching => "trips, returns, bypasses and insertions",
            Self::States => "states and directions",
            Self::Alarms => "alarms",
            Self::Lows => "lowest headrooms",
            Self::Data => "meters and gaps",
            Self::Steps => "steps of the sources",
            Self::Marks => "marks",
            Self::All => "everything",
        }
    }

    fn has(self, kind: MomentKind) -> bool {
        use EventKind::{Act, Alarm, Bypass, Direction, Gap, Insertion, Meter, Program, Return, State, Step, Trip};
        let home = match kind {
            MomentKind::Event(Trip | Return | Bypass | Insertion) => Self::Switching,
            MomentKind::Event(State | Direction) => Self::States,
            MomentKind::Event(Alarm | Act) | MomentKind::Raised(_) => Self::Alarms,
            MomentKind::Event(Meter | Gap | Program) => Self::Data,
            MomentKind::Event(Step) => Self::Steps,
            MomentKind::Low { .. } => Self::Lows,
            MomentKind::Mark => Self::Marks,
        };
        match self {
            Self::All => true,
            Self::Most => home != Self::Steps,
            _ => home == self,
        }
    }

    fn turned(self, by: usize) -> Self {
        let here = Self::ORDER.iter().position(|kinds| *kinds == self).unwrap_or(0);
        Self::ORDER[(here + by) % Self::ORDER.len()]
    }
}

impl App {
    /// Everything of the recording that can be gone to, in order, as far as it is known.
    pub fn moments(&self) -> Vec<Arc<Moment>> {
        let Some(playback) = self.playback() else { return Vec::new() };
        let mut moments = playback.survey.moments.clone();
        for Mark { time, corridor, note } in playback.marks.marks.iter() {
            let (corridor, text) = (corridor.clone(), note.clone());
            insert(&mut moments, Moment { time: *time, corridor, kind: MomentKind::Mark, state: None, text });
        }
        moments
    }

    /// Those that are listed: of the kinds chosen, with every word typed in their kind, corridor or text.
    pub fn event_rows(&self) -> Vec<Arc<Moment>> {
        let words: Vec<_> = self.events.filter.split_whitespace().map(str::to_lowercase).collect();
        let mut rows = self.moments();
        rows.retain(|moment| {
            let has = |word: &String| {
                let names = [moment.corridor.as_deref().unwrap_or_default(), &moment.text];
                moment.kind.word().starts_with(word) || names.iter().any(|name| name.to_lowercase().contains(word))
            };
            self.events.kinds.has(moment.kind) && words.iter().all(has)
        });
        rows
    }

    /// Place of the cursor in the list: at what was chosen, else at the latest moment up to the present.
    pub fn event_cursor(&self, rows: &[Arc<Moment>]) -> usize {
        let chosen = self.events.chosen.as_ref();
        let at = chosen.and_then(|chosen| rows.iter().position(|row| row == chosen));
        at.unwrap_or_else(|| {
            let time = chosen.map(|chosen| chosen.time).or_else(|| self.present());
            rows.partition_point(|row| Some(row.time) <= time).saturating_sub(1)
        })
    }

    /// Time of the frame shown.
    pub fn present(&self) -> Option<DateTime<Utc>> {
        self.parcel.as_ref()?.chronicle.time()
    }

    pub(super) fn walk_events(&mut self, by: isize) {
        let rows = self.event_rows();
        let place = self.event_cursor(&rows).saturating_add_signed(by).min(rows.len().saturating_sub(1));
        self.events.chosen = rows.get(place).cloned();
    }

    /// Answers a key on the page of events; those that mean the same everywhere go on.
    pub(super) fn event_key(&mut self, code: KeyCode) -> ControlFlow<Option<Order>> {
        let rows = self.event_rows();
        let under = rows.get(self.event_cursor(&rows)).cloned();
        let order = match code {
            KeyCode::Enter => under.map(|moment| self.go_to_listed(&moment)),
            KeyCode::Char('v') => self.list(self.events.kinds.turned(1)),
            KeyCode::Char('V') => self.list(self.events.kinds.turned(Kinds::ORDER.len() - 1)),
            KeyCode::Char('/') => self.ask(Typing::Events),
            KeyCode::Char('n') => under.and_then(|moment| {
                let note = self.note_at(moment.time, moment.corridor.clone());
                self.events.chosen = Some(moment);
                self.ask(note)
            }),
            KeyCode::Delete | KeyCode::Backspace => under.and_then(|moment| self.remove_mark(&moment)),
            KeyCode::Char('u') => self.events.removed.take().map(|mark| self.set_mark(mark, "is back")),
            KeyCode::Esc if !self.events.filter.is_empty() => {
                self.events.filter.clear();
                None
            }
            _ => return ControlFlow::Continue(()),
        };
        ControlFlow::Break(order)
    }

    fn list(&mut self, kinds: Kinds) -> Option<Order> {
        self.events.kinds = kinds;
        None
    }

    /// Goes to a moment and shows the corridor that it is about.
    pub(super) fn go_to_listed(&mut self, moment: &Moment) -> Order {
        self.events.chosen = None;
        if self.select(moment.corridor.as_ref()) {
            self.filter.clear();
            self.open(Page::Corridor);
        } else {
            self.page = self.under;
        }
        self.visit_moment(moment, "")
    }

    /// Puts the cursor on a corridor; `false` where it is not known.
    pub(super) fn select(&mut self, name: Option<&Arc<str>>) -> bool {
        let place = name.and_then(|name| self.grid.corridors.iter().position(|corridor| corridor.name == *name));
        self.selected = place.unwrap_or(self.selected);
        place.is_some()
    }

    /// What asks for the note of a mark at the present.
    pub(super) fn note_of_present(&self) -> Option<Typing> {
        let corridor = self.corridor().filter(|_| self.page == Page::Corridor);
        Some(self.note_at(self.present()?, corridor.map(|corridor| corridor.name.clone())))
    }

    /// The same at any time, where there may be one already.
    fn note_at(&self, time: DateTime<Utc>, corridor: Option<Arc<str>>) -> Typing {
        let there = self.mark_at(time).cloned();
        Typing::Mark(there.unwrap_or(Mark { time, corridor, note: String::new() }))
    }

    fn mark_at(&self, time: DateTime<Utc>) -> Option<&Mark> {
        self.playback()?.marks.marks.iter().find(|mark| mark.time == time)
    }

    pub(super) fn set_mark(&mut self, mark: Mark, done: &str) -> Order {
        self.events.asked = Some(format!("The mark at {} {done}", self.clock_words(mark.time)));
        Order::Mark(MarkWish::Set(mark))
    }

    fn remove_mark(&mut self, moment: &Moment) -> Option<Order> {
        let mark = self.mark_at(moment.time).filter(|_| moment.kind == MomentKind::Mark).cloned();
        if mark.is_none() {
            self.notice = Some("Only marks can be taken away; what happened, happened.".into());
        }
        let time = mark.as_ref()?.time;
        self.events.removed = mark;
        self.events.asked = Some(format!("The mark at {} is taken away, u brings it back", self.clock_words(time)));
        Some(Order::Mark(MarkWish::Remove(time)))
    }

    fn clock_words(&self, time: DateTime<Utc>) -> String {
        time.with_timezone(&self.zone).format("%H:%M:%S").to_string()
    }

    /// Takes in what became of wishes about marks.
    pub(super) fn receive_marks(&mut self, report: &MarkReport) {
        let is_new = report.answered > self.events.answered || self.playback().is_none();
        self.events.answered = report.answered;
        if !is_new {
            return;
        }
        let asked = self.events.asked.take();
        match (&report.trouble, asked) {
            (Some(trouble), Some(asked)) => self.notice = Some(format!("{asked}; {trouble}.")),
            (Some(trouble), None) => self.notice = Some(format!("Marks: {trouble}.")),
            (None, Some(asked)) => self.said = Some(format!("{asked}; marks are {}.", report.place)),
            (None, None) => {}
        }
    }
}
