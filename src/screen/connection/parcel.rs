use std::{sync::Arc, time::Instant};

use chrono::{DateTime, TimeDelta, Utc};
use chrono_tz::Tz;

use super::{AlarmOrder, AlarmReport, Change, MarkReport, MarkWish};
use crate::{
    config::ScreenSettings,
    grid::Grid,
    screen::state::{Chronicle, Survey},
};

/// Everything a screen shows, as it stands.
#[derive(Debug, Clone)]
pub struct Parcel {
    /// The corridors, and what became of them so far.
    pub chronicle: Chronicle,
    /// Their alarms.
    pub alarms: AlarmReport,
    /// What is watched, and what a changed file would change of it.
    pub scene: Scene,
    /// How the feed does.
    pub feed: FeedReport,
    /// Live or recorded.
    pub origin: Origin,
}

/// What is watched, where that can change meanwhile.
#[derive(Debug, Clone, Default)]
pub struct Scene {
    /// What has come into force since the start.
    pub setting: Option<Arc<Setting>>,
    /// What a changed configuration file would bring.
    pub change: Option<Arc<Change>>,
}

/// What a screen needs to know of a configuration.
#[derive(Debug)]
pub struct Setting {
    /// What is watched.
    pub grid: Arc<Grid>,
    /// Zone for display.
    pub zone: Tz,
    /// How long a value stands.
    pub max_age: TimeDelta,
    /// How to call for attention.
    pub screen: ScreenSettings,
}

/// Where the frames come from.
#[derive(Debug, Clone)]
pub enum Origin {
    /// Inputs that go on for as long as they like.
    Live,
    /// A recording that can be played.
    Replay(Playback),
}

/// How the feed does.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct FeedReport {
    /// Every input.
    pub inputs: Vec<InputReport>,
    /// The file that keeps what is learned, where there is one.
    pub kept: Option<InputReport>,
    /// The folder that frames are recorded in, where there is one.
    pub recorded: Option<InputReport>,
    /// Why frames are not recorded at the moment, though they should be.
    pub unrecorded: Option<String>,
    /// Frames taken so far.
    pub frames: u64,
    /// When the last frame came, by this computer's clock.
    pub arrived: Option<Instant>,
    /// Nothing more will come.
    pub ended: bool,
}

impl FeedReport {
    /// Every input, the file that keeps what is learned and the recording, each with what it is.
    pub fn reports(&self) -> impl Iterator<Item = (&'static str, &InputReport)> {
        let inputs = self.inputs.iter().map(|input| ("input", input));
        let kept = self.kept.iter().map(|kept| ("what is learned, in", kept));
        inputs.chain(kept).chain(self.recorded.iter().map(|recorded| ("recording, in", recorded)))
    }
}

/// How one input does, in words.
#[derive(Debug, Clone, PartialEq)]
pub struct InputReport {
    /// The input as it was given.
    pub name: Arc<str>,
    /// What it is doing.
    pub standing: String,
    /// What came in that cannot be used.
    pub findings: Vec<String>,
}

/// A recording being played.
#[derive(Debug, Clone)]
pub struct Playback {
    /// Running, unless paused.
    pub playing: bool,
    /// Recorded seconds in a second.
    pub speed: u32,
    /// Where in the recording we are: the time of the last frame, or a little after it while playing.
    pub now: Option<DateTime<Utc>>,
    /// Frames taken to get here.
    pub taken: usize,
    /// On the way to another place.
    pub seeking: Option<Seeking>,
    /// The last frame is taken.
    pub at_end: bool,
    /// The whole of it.
    pub survey: Arc<Survey>,
    /// The marks in it.
    pub marks: MarkReport,
}

/// On the way to another place of the recording.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Seeking {
    /// Where to; `None`: a number of frames.
    pub to: Option<DateTime<Utc>>,
    /// Done so far, 0 to 1.
    pub done: f64,
}

/// What the screen asks for; most of it can be asked of a recording only.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Order {
    /// Play or pause.
    Toggle,
    /// The next higher speed.
    Faster,
    /// The next lower speed.
    Slower,
    /// One frame on.
    StepForward,
    /// One frame back.
    StepBack,
    /// So much later, or earlier.
    Jump(TimeDelta),
    /// To the last frame at or before this time.
    Seek(DateTime<Utc>),
    /// The same, and stay there.
    Visit(DateTime<Utc>),
    /// Stop seeking where we are.
    Cancel,
    /// Apply the change of this number, live.
    Apply(u64),
    /// Something with alarms, also live.
    Alarm(AlarmOrder),
    /// Something with marks.
    Mark(MarkWish),
}

/// The speeds that keys step through.
pub const SPEEDS: [u32; 12] = [1, 2, 5, 10, 30, 60, 120, 300, 600, 1200, 1800, 3600];
