//! What the screen remembers: a pure model that takes keys and parcels in and gives orders out. No terminal.

mod alarms;
mod chronicle;
mod events;
mod held;
mod history;
mod instant;
mod jump;
mod keys;
mod panel;
mod pointer;
mod survey;

use std::{sync::Arc, time::Instant};

use chrono::TimeDelta;
use chrono_tz::Tz;
use crossterm::event::KeyCode;
use ratatui::layout::Size;

pub use alarms::{AlarmPage, Prompt};
pub use chronicle::{Chronicle, EVENTS_KEPT, Track};
pub use events::{EventPage, Kinds};
pub use held::Held;
pub use history::{History, Strip};
pub use instant::parse_time;
pub use jump::Jumps;
pub use keys::KEYS;
pub use panel::Panel;
pub use pointer::{Drawn, Target};
pub use survey::{Moment, MomentKind, Survey};

use super::connection::{Change, Mark, Origin, Parcel, Playback, Setting};
use crate::{
    config::ScreenSettings,
    desk::{Assessment, OutageRecord},
    grid::{Corridor, Grid},
};

/// Everything the screen remembers.
#[derive(Debug)]
pub struct App {
    /// What is watched.
    pub grid: Arc<Grid>,
    /// Zone for display.
    pub zone: Tz,
    /// How long a value stands, so how old a frame may get before the screen says so.
    pub max_age: TimeDelta,
    /// The newest of what the connection sent; `None` before anything came.
    pub parcel: Option<Parcel>,
    /// The page shown.
    pub page: Page,
    /// The page that help and messages return to.
    under: Page,
    /// The corridor with the cursor, by its place in the configuration.
    pub selected: usize,
    /// Order of the overview.
    pub sort: Sort,
    /// What the overview is narrowed to; empty: everything.
    pub filter: String,
    /// What is being typed.
    pub typing: Option<Typing>,
    /// The outage chosen by hand; `None`: the one that sets the headroom.
    pub outage: Option<Arc<str>>,
    /// The panel of the corridor page that has the keys.
    pub panel: Panel,
    /// First line shown of a page that is longer than the screen.
    pub scroll: usize,
    /// How to call for attention.
    pub settings: ScreenSettings,
    /// The alarm page.
    pub alarms: AlarmPage,
    /// Events and marks of a recording.
    pub events: EventPage,
    /// Jumps from one to another.
    pub jumps: Jumps,
    /// The moment that the present is compared with.
    pub held: Option<Held>,
    /// What is on the screen is to be written to a file, and how.
    pub export: Option<Export>,
    /// Of the terminal.
    pub size: Size,
    /// This computer's clock at the last drawing.
    pub clock: Instant,
    /// The same when this began.
    started: Instant,
    /// A word on the last key, until the next.
    pub notice: Option<String>,
    /// The same, where nothing is amiss.
    pub said: Option<String>,
    /// What the last drawing found out.
    pub drawn: Drawn,
    /// The user has had enough.
    pub leaving: bool,
}

/// The pages.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Page {
    /// All corridors.
    Overview,
    /// One corridor.
    Corridor,
    /// What calls for the operator.
    Alarms,
    /// Events and marks of a recording.
    Events,
    /// The moment held and the present, side by side.
    Compare,
    /// What a changed configuration file would bring.
    Change,
    /// What happened.
    Messages,
    /// Keys, numbers, caution.
    Help,
}

/// Orders of the overview.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sort {
    /// As in the configuration.
    Configured,
    /// Least headroom first, spent and blind before the rest.
    WorstFirst,
}

/// A line being typed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Typing {
    /// Narrowing the overview; it applies as it is typed.
    Filter,
    /// A time to go to.
    Time(String),
    /// Something about an alarm.
    Alarm(Prompt, String),
    /// Narrowing the list of events; it applies as it is typed.
    Events,
    /// The note of a mark.
    Mark(Mark),
    /// As what to write what is on the screen.
    Export,
}

/// What can be written of what is on the screen.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Export {
    /// The record of the corridor with the cursor, as JSON.
    Record,
    /// The page as text.
    Text,
    /// The page as a picture, SVG.
    Picture,
}

impl Export {
    /// The one that a key stands for.
    fn of_key(code: KeyCode) -> Option<Self> {
        match code {
            KeyCode::Char('j') => Some(Self::Record),
            KeyCode::Char('t') => Some(Self::Text),
            KeyCode::Char('s') => Some(Self::Picture),
            _ => None,
        }
    }
}

impl App {
    /// Nothing known yet.
    pub fn new(grid: Arc<Grid>, zone: Tz, max_age: TimeDelta) -> Self {
        let page = if grid.corridors.len() == 1 { Page::Corridor } else { Page::Overview };
        let started = Instant::now();
        Self {
            grid,
            zone,
            max_age,
            parcel: None,
            page,
            under: page,
            selected: 0,
            sort: Sort::Configured,
            filter: String::new(),
            typing: None,
            outage: None,
            panel: Panel::Outages,
            scroll: 0,
            settings: ScreenSettings::default(),
            alarms: AlarmPage::default(),
            events: EventPage::default(),
            jumps: Jumps::default(),
            held: None,
            export: None,
            size: Size::new(80, 24),
            clock: started,
            started,
            notice: None,
            said: None,
            drawn: Drawn::default(),
            leaving: false,
        }
    }

    /// Takes in what the connection sent.
    pub fn receive(&mut self, parcel: Parcel) {
        self.receive_alarms(&parcel.alarms);
        if let Origin::Replay(playback) = &parcel.origin {
            self.receive_marks(&playback.marks);
        }
        self.receive_setting(parcel.scene.setting.as_ref());
        self.parcel = Some(parcel);
    }

    /// Takes another configuration in; the cursor stays on its corridor.
    fn receive_setting(&mut self, setting: Option<&Arc<Setting>>) {
        let Some(setting) = setting.filter(|setting| !Arc::ptr_eq(&setting.grid, &self.grid)) else { return };
        let here = self.corridor().map(|corridor| corridor.name.clone());
        (self.grid, self.zone, self.max_age) = (setting.grid.clone(), setting.zone, setting.max_age);
        self.settings = setting.screen.clone();
        let place = self.grid.corridors.iter().position(|corridor| Some(&corridor.name) == here.as_ref());
        self.selected = place.unwrap_or(0);
        if place.is_none() {
            self.outage = None;
        }
    }

    /// Takes in what became of an export.
    pub fn exported(&mut self, outcome: Result<String, String>) {
        match outcome {
            Ok(said) => self.said = Some(said),
            Err(why) => self.notice = Some(why),
        }
    }

    /// What a changed configuration file would bring.
    pub fn change(&self) -> Option<&Change> {
        self.parcel.as_ref()?.scene.change.as_deref()
    }

    /// The corridors of the overview, by their place in the configuration.
    pub fn rows(&self) -> Vec<usize> {
        let wanted = self.filter.to_lowercase();
        let fits = |&index: &usize| {
            let state = self.track(index).map_or("", |track| track.latest.state.word());
            wanted.is_empty()
                || state.starts_with(&wanted)
                || self.grid.corridors[index].name.to_lowercase().contains(&wanted)
        };
        let mut rows: Vec<_> = (0..self.grid.corridors.len()).filter(fits).collect();
        if self.sort == Sort::WorstFirst {
            rows.sort_by(|&one, &other| {
                let key = |index| {
                    self.track(index).map_or((0, f64::INFINITY), |track| {
                        (track.latest.state.severity(), track.latest.headroom_mw.unwrap_or(f64::INFINITY))
                    })
                };
                let (one, other) = (key(one), key(other));
                other.0.cmp(&one.0).then(one.1.total_cmp(&other.1))
            });
        }
        rows
    }

    /// A corridor over time; `None` before its first frame.
    pub fn track(&self, index: usize) -> Option<&Track> {
        self.parcel.as_ref()?.chronicle.tracks.get(index).map(AsRef::as_ref)
    }

    /// The corridor with the cursor; `None` in an empty grid.
    pub fn corridor(&self) -> Option<&Corridor> {
        self.grid.corridors.get(self.selected)
    }

    /// The outage looked at: the chosen one, else the one that sets the headroom.
    pub fn outage<'a>(&self, assessment: &'a Assessment) -> Option<&'a OutageRecord> {
        let chosen = self.outage.as_ref().and_then(|name| assessment.outages.iter().find(|o| o.name == *name));
        chosen.or_else(|| worst_outage(assessment))
    }

    /// The recording, where one is played.
    pub fn playback(&self) -> Option<&Playback> {
        match &self.parcel.as_ref()?.origin {
            Origin::Live => None,
            Origin::Replay(playback) => Some(playback),
        }
    }

    /// How long ago the last frame was: since it came, or by the clock of the recording.
    pub fn age(&self) -> Option<TimeDelta> {
        let parcel = self.parcel.as_ref()?;
        match &parcel.origin {
            Origin::Live => TimeDelta::from_std(self.clock.saturating_duration_since(parcel.feed.arrived?)).ok(),
            Origin::Replay(playback) => Some((playback.now? - parcel.chronicle.time()?).max(TimeDelta::zero())),
        }
    }

    /// Whether the picture changes by the passing of time alone.
    pub fn ticks(&self) -> bool {
        let is_live = |parcel: &Parcel| matches!(parcel.origin, Origin::Live) && !parcel.feed.ended;
        self.blinks() || self.parcel.as_ref().is_some_and(is_live)
    }
}

/// The outage that sets the headroom, else the one with the smallest limit.
pub fn worst_outage(assessment: &Assessment) -> Option<&OutageRecord> {
    let binding = assessment.binding.as_ref().and_then(|binding| binding.outage.as_ref());
    let by_name = binding.and_then(|name| assessment.outages.iter().find(|outage| outage.name == *name));
    by_name.or_else(|| assessment.outages.iter().min_by(|one, other| smallest(one).total_cmp(&smallest(other))))
}

fn smallest(outage: &OutageRecord) -> f64 {
    let limits = outage.limit_mw;
    [limits.angle, limits.area, limits.loading, limits.voltage, limits.separation]
        .into_iter()
        .flatten()
        .fold(f64::INFINITY, f64::min)
}

#[cfg(test)]
pub(crate) mod sample {
    #![allow(dead_code, missing_docs, reason = "shared with tests/screen.rs, which uses the rest")]
    use crate as tautline;
    include!(concat!(env!("CARGO_MANIFEST_DIR"), "/tests/screen/sample.rs"));
}
