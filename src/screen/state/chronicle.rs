use std::{collections::VecDeque, sync::Arc};

use chrono::{DateTime, Utc};

use super::{History, Strip};
use crate::{
    desk::{Assessment, State},
    events::{Event, EventKind, Teller},
};

/// Events kept; older ones are forgotten.
pub const EVENTS_KEPT: usize = 1000;

/// What became of the corridors so far. A function of the frames alone, and cheap to clone.
#[derive(Debug, Clone, Default)]
pub struct Chronicle {
    /// One for each corridor, in the order of the configuration; empty before the first frame.
    pub tracks: Vec<Arc<Track>>,
    /// Newest last.
    pub events: Arc<VecDeque<Event>>,
}

/// One corridor over time.
#[derive(Debug, Clone)]
pub struct Track {
    /// How it stands.
    pub latest: Arc<Assessment>,
    /// Since when it has been in this state.
    pub since: DateTime<Utc>,
    /// Its headroom over the last two hours.
    pub history: History,
    /// Its states so far.
    pub strip: Strip,
    teller: Teller,
}

impl Chronicle {
    /// Takes in all corridors at one frame.
    pub fn take(&mut self, assessments: Vec<Assessment>) {
        for (index, assessment) in assessments.into_iter().enumerate() {
            if index == self.tracks.len() {
                if assessment.state != State::Ample {
                    self.note(Event::first(&assessment));
                }
                self.tracks.push(Arc::new(Track::new(assessment)));
            } else {
                let events = Arc::make_mut(&mut self.tracks[index]).take(Arc::new(assessment));
                // Steps have a list of their own, where they come by the hundred.
                events.into_iter().filter(|event| event.kind != EventKind::Step).for_each(|event| self.note(event));
            }
        }
    }

    /// Goes on with other corridors, as they are assessed at the latest frame; those of the same name keep their past.
    pub fn reconfigure(&mut self, assessments: Vec<Assessment>) {
        let mut before = std::mem::take(&mut self.tracks);
        for assessment in assessments {
            let old = before.iter().position(|track| track.latest.corridor == assessment.corridor);
            let old = old.map(|index| before.swap_remove(index));
            let track = if let Some(mut track) = old {
                Arc::make_mut(&mut track).latest = Arc::new(assessment);
                track
            } else {
                Arc::new(Track::new(assessment))
            };
            self.tracks.push(track);
        }
    }

    /// Adds to the events, by their time.
    pub fn note(&mut self, event: Event) {
        let events = Arc::make_mut(&mut self.events);
        if events.len() == EVENTS_KEPT {
            events.pop_front();
        }
        let later = events.iter().rev().take_while(|other| other.time > event.time).count();
        events.insert(events.len() - later, event);
    }

    /// Time of the last frame.
    pub fn time(&self) -> Option<DateTime<Utc>> {
        self.tracks.first().map(|track| track.latest.time)
    }
}

impl Track {
    fn new(assessment: Assessment) -> Self {
        let assessment = Arc::new(assessment);
        let mut track = Self {
            since: assessment.time,
            history: History::default(),
            strip: Strip::default(),
            teller: Teller::new(&assessment),
            latest: assessment.clone(),
        };
        track.take(assessment);
        track
    }

    /// Takes the next frame; returns what it is worth telling.
    fn take(&mut self, assessment: Arc<Assessment>) -> Vec<Event> {
        let events = self.teller.take(&assessment);
        if self.latest.state != assessment.state {
            self.since = assessment.time;
        }
        self.history.take(assessment.time, assessment.headroom_mw);
        self.strip.take(assessment.time, assessment.state);
        self.latest = assessment;
        events
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample;

    #[test]
    fn states_are_kept_with_their_beginning_and_told_once() {
        let mut chronicle = Chronicle::default();
        for (second, headroom_mw) in [(0, 212.0), (20, 80.0), (40, 70.0), (60, -3.0), (66, -4.0)] {
            chronicle.take(vec![sample::at(second, headroom_mw)]);
        }
        let track = &chronicle.tracks[0];
        assert_eq!(track.latest.state, State::Spent);
        assert_eq!(track.since, sample::time(60));
        let told: Vec<_> = chronicle.events.iter().map(|event| event.text.as_str()).collect();
        assert_eq!(told.len(), 2, "{told:?}");
        assert!(told[0].starts_with("ample → thin"), "{told:?}");
        assert!(told[1].starts_with("thin → spent"), "{told:?}");
    }

    #[test]
    fn events_are_bounded() {
        let mut chronicle = Chronicle::default();
        let event = |second| Event::of_program(sample::time(second), "new".into());
        (0..2 * i64::try_from(EVENTS_KEPT).unwrap()).for_each(|second| chronicle.note(event(second)));
        chronicle.note(event(1990));
        assert_eq!(chronicle.events.len(), EVENTS_KEPT);
        assert!(chronicle.events.iter().is_sorted_by_key(|event| event.time));
        assert_eq!(chronicle.events.back().unwrap().time, sample::time(1999));
    }
}
