//! A desk that records, as `watch` has it, without its screen.

use std::{path::Path, sync::Arc};

use chrono::{DateTime, TimeDelta, Utc};
use tautline::{
    alarm::{Act, Board, Deed, Restored, Transition},
    config::Config,
    desk::Desk,
    drill::{Drill, Invention, Scenario},
    feed::{Channels, Frame, Holder, Reader, Recorded},
    recording::{Present, Recorder, Status},
    report::jsonl,
    source::store::Memory,
};

/// Two corridors that switch, learn and raise alarms.
pub const INVENTION: Invention = Invention {
    seed: 7,
    corridors: 2,
    hours: 54.0,
    interval_s: 20.0,
    prior_error: 0.4,
    with_trip: true,
    with_slow_telemetry: true,
    with_coincident_steps: true,
};

const ALARMS: &str = "
[[alarm]]
name = \"busy\"
on = \"headroom_mw\"
setpoint = 900
deadband = 10
on_delay_s = 40
off_delay_s = 60
[[alarm]]
name = \"fit\"
on = \"fit\"
setpoint = 0.8
on_delay_s = 0
off_delay_s = 60
";

pub fn at(text: &str) -> DateTime<Utc> {
    text.parse().unwrap()
}

/// The configuration (TOML) and the scenario of a made-up feed.
pub fn invented(invention: &Invention) -> (String, Scenario) {
    let invented = invention.invent();
    let (_, scenario) = invented.read().unwrap();
    (invented.config + ALARMS, scenario)
}

pub fn parse(text: &str) -> Config {
    Config::parse(text, "bed.toml").unwrap_or_else(|errors| panic!("{errors}"))
}

/// The frames of a scenario, with the channels of a configuration that it was read for. Statuses are told when they change.
pub fn frames(text: &str, scenario: &Scenario) -> impl Iterator<Item = Frame> {
    let config = parse(text);
    let channels = Channels::new(&config);
    let mut told = vec![None; channels.len()];
    Drill::new(&config, &channels, scenario).map(move |mut frame| {
        let mut is_news = |slot: usize, value: f64| told[slot].replace(value) != Some(value);
        frame.readings.retain(|(slot, reading)| is_news(*slot, reading.value) || !channels.is_status(*slot));
        frame
    })
}

/// What was learned, and how the alarms stood, over a restart.
pub type Kept = (Vec<Option<Memory>>, Vec<Restored>);

/// A desk at work.
pub struct Station {
    channels: Arc<Channels>,
    holder: Holder,
    pub desk: Desk,
    pub board: Board,
    pub recorder: Option<Recorder>,
    pub now: Option<DateTime<Utc>>,
    config: Config,
    pub seen: Seen,
}

/// What came of frames: records as `assess` writes them, and what the alarms did.
#[derive(Default)]
pub struct Seen {
    pub records: Vec<(DateTime<Utc>, Vec<u8>)>,
    pub transitions: Vec<Transition>,
}

impl Station {
    pub fn begin(folder: Option<&Path>, text: &str, kept: Kept) -> Self {
        let config = parse(text);
        let channels = Arc::new(Channels::new(&config));
        let mut desk = Desk::detailed(&config, &channels);
        for (corridor, memory) in desk.corridors.iter_mut().zip(kept.0) {
            if let Some(memory) = memory {
                corridor.learner_mut().recall(&memory).unwrap();
            }
        }
        let mut board = Board::new(&config);
        board.restore(kept.1);
        let recorder = folder.map(|folder| Recorder::open(folder, &config, text, &channels).unwrap());
        let holder = Holder::new(&channels, config.feed.max_age());
        Self { channels, holder, desk, board, recorder, now: None, config, seen: Seen::default() }
    }

    pub fn take(&mut self, frame: &Frame) {
        let now = Present { holder: &self.holder, desk: &self.desk, board: &self.board };
        let frame = self.recorder.as_mut().map_or_else(|| frame.clone(), |recorder| recorder.take(frame, &now));
        self.now = Some(frame.time);
        let Some(snapshot) = self.holder.take(&frame) else { return };
        snapshot.start().into_iter().for_each(|start| self.board.begin(start));
        let assessments = self.desk.assess(&snapshot);
        self.seen.transitions.extend(self.board.observe(&assessments));
        for assessment in &assessments {
            let mut record = Vec::new();
            jsonl::write(assessment, &mut record).unwrap();
            self.seen.records.push((assessment.time, record));
        }
    }

    /// Time passes without a frame.
    pub fn wait(&mut self, seconds: i64) {
        let now = self.now.unwrap() + TimeDelta::seconds(seconds);
        let transitions = self.board.elapse(now);
        if !transitions.is_empty() {
            self.record(Act { time: now, by: None, deed: Deed::Silence });
        }
        self.seen.transitions.extend(transitions);
        self.now = Some(now);
    }

    pub fn record(&mut self, act: Act) {
        if let Some(recorder) = &mut self.recorder {
            recorder.act([act]);
        }
    }

    pub fn reconfigure(&mut self, text: &str) {
        let after = parse(text);
        self.channels = Arc::new(self.channels.extended(&after));
        self.holder.rewire(&self.channels, after.feed.max_age());
        let desk = std::mem::replace(&mut self.desk, Desk { corridors: Vec::new() });
        self.desk = desk.reconfigured(&self.config, &after, &self.channels);
        self.board.reconfigure(&after, self.now.unwrap());
        self.recorder.iter_mut().for_each(|recorder| recorder.reconfigure(&after, text, &self.channels));
        self.config = after;
    }

    pub fn kept(&self) -> Kept {
        let memories = self.desk.corridors.iter().map(|corridor| corridor.learner().memory()).collect();
        let standings = self.board.corridors.iter().flat_map(|board| {
            board.alarms().iter().map(|alarm| Restored {
                corridor: board.corridor().to_string(),
                alarm: alarm.definition.name.to_string(),
                standing: alarm.standing.clone(),
            })
        });
        (memories, standings.collect())
    }

    pub fn end(self) -> (Seen, Status) {
        (self.seen, self.recorder.map_or_else(Status::default, Recorder::end))
    }
}

/// What a replay of recorded files sees, and what it says of them.
pub fn replayed(files: &[&Path], text: &str) -> (Seen, Vec<String>) {
    let config = parse(text);
    let channels = Arc::new(Channels::new(&config));
    let readers = files.iter().map(|file| Reader::open(file, &channels).unwrap()).collect();
    let mut recorded = Recorded::new(readers, &channels);
    let mut holder = Holder::new(&channels, config.feed.max_age());
    let (mut desk, mut board) = (Desk::new(&config, &channels), Board::new(&config));
    let mut seen = Seen::default();
    for frame in recorded.by_ref() {
        let Some(snapshot) = holder.take(&frame) else { continue };
        snapshot.aside.iter().for_each(|aside| seen.transitions.extend(board.take_up(aside)));
        let assessments = desk.assess(&snapshot);
        seen.transitions.extend(board.observe(&assessments));
        for assessment in &assessments {
            let mut record = Vec::new();
            jsonl::write(assessment, &mut record).unwrap();
            seen.records.push((assessment.time, record));
        }
    }
    let findings = recorded.monitor().inputs().iter().flat_map(|input| input.tally.findings()).collect();
    (seen, findings)
}
