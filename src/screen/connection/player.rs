use std::{io, iter::Peekable, sync::Arc};

use chrono::{DateTime, Utc};

use super::Recording;
use crate::{
    desk::Desk,
    feed::{Channels, Holder, Monitor, Recorded},
    screen::state::{Chronicle, Strip},
};

/// Frames between two kept places, at first.
const SPACING: usize = 256;

/// A place in a recording with everything remembered there: going on from it gives what playing up to it gave.
#[derive(Debug, Clone)]
pub struct Place {
    /// Frames taken to get here.
    pub taken: usize,
    /// Time of the last of them.
    pub time: Option<DateTime<Utc>>,
    /// What the corridors came to.
    pub chronicle: Chronicle,
    holder: Holder,
    desk: Desk,
}

/// Where to go.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Goal {
    /// Just past the last frame at or before this time.
    Time(DateTime<Utc>),
    /// Past so many frames.
    Taken(usize),
}

/// Plays a recording frame by frame, and goes back by way of places kept.
#[derive(Debug)]
pub struct Player {
    channels: Arc<Channels>,
    recording: Recording,
    frames: Peekable<Recorded>,
    monitor: Monitor,
    here: Place,
    /// In ascending order, the very first included.
    kept: Vec<Place>,
    kept_max: usize,
    spacing: usize,
    /// The worst state of all corridors, wherever this player has been.
    seen: Arc<Strip>,
}

impl Player {
    /// At the start of a recording.
    pub fn new(recording: Recording, channels: Arc<Channels>, holder: Holder, desk: Desk) -> io::Result<Self> {
        let frames = recording.open(&channels)?;
        let (monitor, frames) = (frames.monitor().clone(), frames.peekable());
        // A place holds what every corridor remembers, which may be a few hundred kilobytes each.
        let kept_max = (400 / desk.corridors.len().max(1)).clamp(8, 96);
        let here = Place { taken: 0, time: None, chronicle: Chronicle::default(), holder, desk };
        let kept = vec![here.clone()];
        Ok(Self { channels, recording, frames, monitor, here, kept, kept_max, spacing: SPACING, seen: Arc::default() })
    }

    /// Where we are.
    pub fn here(&self) -> &Place {
        &self.here
    }

    /// How the reading goes.
    pub fn monitor(&self) -> &Monitor {
        &self.monitor
    }

    /// The worst states seen, at any time of the recording.
    pub fn seen(&self) -> &Arc<Strip> {
        &self.seen
    }

    /// Time of the next frame; `None` at the end.
    pub fn next_time(&mut self) -> Option<DateTime<Utc>> {
        self.frames.peek().map(|frame| frame.time)
    }

    /// Takes the next frame; `false` at the end.
    pub fn step(&mut self) -> bool {
        let Some(frame) = self.frames.next() else { return false };
        let here = &mut self.here;
        here.taken += 1;
        here.time = Some(frame.time);
        if let Some(snapshot) = here.holder.take(&frame) {
            here.chronicle.take(here.desk.assess(&snapshot));
            if let Some(worst) = here.chronicle.worst() {
                Arc::make_mut(&mut self.seen).take(frame.time, worst);
            }
        }
        self.keep();
        true
    }

    fn keep(&mut self) {
        let taken = self.here.taken;
        if taken % self.spacing != 0 || self.kept.last().is_some_and(|last| last.taken >= taken) {
            return;
        }
        self.kept.push(self.here.clone());
        if self.kept.len() > self.kept_max {
            self.spacing *= 2;
            let spacing = self.spacing;
            self.kept.retain(|place| place.taken % spacing == 0);
        }
    }

    fn is_behind(&self, goal: Goal) -> bool {
        match goal {
            Goal::Time(time) => self.here.time.is_some_and(|here| time < here),
            Goal::Taken(taken) => taken < self.here.taken,
        }
    }

    /// Whether going on leads no nearer: we are there, or past it, or at the end.
    pub fn is_at(&mut self, goal: Goal) -> bool {
        match goal {
            Goal::Time(time) => self.next_time().is_none_or(|next| next > time),
            Goal::Taken(taken) => self.here.taken >= taken || self.next_time().is_none(),
        }
    }

    /// Goes to the kept place from which the goal is nearest, where that is better than going on from here.
    pub fn leap(&mut self, goal: Goal) -> io::Result<()> {
        let before = |place: &&Place| match goal {
            Goal::Time(time) => place.time.is_none_or(|at| at <= time),
            Goal::Taken(taken) => place.taken <= taken,
        };
        let nearest = self.kept.iter().rev().find(before).unwrap_or(&self.kept[0]);
        if !self.is_behind(goal) && nearest.taken <= self.here.taken {
            return Ok(());
        }
        let already = if nearest.taken < self.here.taken {
            let frames = self.recording.open(&self.channels)?;
            (self.monitor, self.frames) = (frames.monitor().clone(), frames.peekable());
            0
        } else {
            self.here.taken
        };
        self.here = nearest.clone();
        self.frames.by_ref().take(self.here.taken - already).for_each(drop);
        Ok(())
    }
}
