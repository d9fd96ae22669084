//! A moment held beside the present.

use std::sync::Arc;

use chrono::{DateTime, Utc};

use super::App;
use crate::{alarm::Board, desk::Assessment};

/// Everything as it stood at one moment.
#[derive(Debug, Clone)]
pub struct Held {
    /// Time of the frame.
    pub time: DateTime<Utc>,
    /// One for each corridor.
    pub assessments: Vec<Arc<Assessment>>,
    /// The alarms.
    pub board: Arc<Board>,
}

impl Held {
    /// A corridor by its name.
    pub fn assessment(&self, corridor: &str) -> Option<&Arc<Assessment>> {
        self.assessments.iter().find(|assessment| *assessment.corridor == *corridor)
    }
}

impl App {
    /// Everything as it stands; `None` before the first frame.
    pub fn now(&self) -> Option<Held> {
        let parcel = self.parcel.as_ref()?;
        let assessments = parcel.chronicle.tracks.iter().map(|track| track.latest.clone()).collect();
        Some(Held { time: parcel.chronicle.time()?, assessments, board: parcel.alarms.alarms.board.clone() })
    }

    pub(super) fn hold(&mut self) {
        self.held = self.now();
        self.said = self.held.as_ref().map(|held| {
            let time = held.time.with_timezone(&self.zone).format("%H:%M:%S");
            format!("{time} is held as A: B shows it beside the present, wherever you go.")
        });
    }
}
