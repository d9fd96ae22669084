use std::{
    collections::BTreeMap,
    path::{Path, PathBuf},
    sync::{
        Arc,
        mpsc::{SyncSender, sync_channel},
    },
    thread::{self, JoinHandle},
    time::Duration,
};

use chrono::NaiveDate;
use serde::Serialize;

use super::{
    RecordError, Status,
    folder::Folder,
    writer::{Gauge, Line, Writer},
};
use crate::{
    alarm::{Act, Board},
    config::{Config, RecordingSettings},
    desk::Desk,
    feed::{self, Channels, Decoder, Format, Frame, FrameText, Holder, Kept, MAX_LINE_BYTES, Tally, Why},
};

/// Lines that may wait for the thread that writes.
const QUEUE: usize = 4096;
/// Acts that may wait for the next frame; after more, it says how everything stands instead.
const MOST_ACTS: usize = 1000;

/// Records frames.
#[derive(Debug)]
pub struct Recorder {
    folder: PathBuf,
    text: FrameText,
    /// Reads what is written.
    decoder: Decoder,
    configuration: Arc<str>,
    lines: SyncSender<Line>,
    thread: JoinHandle<()>,
    gauge: Gauge,
    /// Why the next frame has to say how everything stands.
    start: Option<Why>,
    day: Option<NaiveDate>,
    acts: Vec<Act>,
    number: u64,
    too_long: Option<String>,
}

/// Everything as it stands before a frame.
#[derive(Debug, Clone, Copy)]
pub struct Present<'a> {
    /// What holds values.
    pub holder: &'a Holder,
    /// What assesses.
    pub desk: &'a Desk,
    /// The alarms.
    pub board: &'a Board,
}

#[derive(Serialize)]
struct Besides<'a> {
    #[serde(skip_serializing_if = "Option::is_none")]
    start: Option<&'a serde_json::value::RawValue>,
    #[serde(skip_serializing_if = "<[Act]>::is_empty")]
    acts: &'a [Act],
}

impl Recorder {
    /// Takes a folder to record in, under a configuration with its text (TOML).
    pub fn open(
        folder: &Path,
        config: &Config,
        configuration: &str,
        channels: &Arc<Channels>,
    ) -> Result<Self, RecordError> {
        let settings = config.recording.clone();
        let disk = (Folder::take(folder)?, settings.clone());
        let (gauge, apart) = (Gauge::default(), flush_interval(&settings));
        let (lines, taken) = sync_channel(QUEUE);
        let writer = Writer::new(disk, gauge.clone(), apart);
        Ok(Self {
            folder: folder.to_owned(),
            text: FrameText::new(config, channels),
            decoder: Decoder::new(Format::JsonLines, channels.clone()),
            configuration: configuration.into(),
            lines,
            thread: thread::spawn(move || writer.run(&taken)),
            gauge,
            start: Some(Why::Start),
            day: None,
            acts: Vec::new(),
            number: 0,
            too_long: None,
        })
    }

    /// Records a frame, and gives it back as a replay will read it: that is what has to be taken from here on.
    pub fn take(&mut self, frame: &Frame, now: &Present) -> Frame {
        let day = frame.time.date_naive();
        if std::mem::take(&mut self.gauge.lock().wants_start) {
            self.start.get_or_insert(Why::Gap);
        }
        if self.day.replace(day).is_some_and(|before| before != day) {
            self.start.get_or_insert(Why::Day);
        }
        let start = self.start.take().and_then(|why| self.written(why, now));
        let is_start = start.is_some();
        let aside = self.aside(start);
        let mut text = self.line(frame, aside.as_deref());
        let read = self.read(&text).unwrap_or_else(|| {
            // Longer than can be read: it goes without.
            text = self.line(frame, None);
            Frame { aside: None, ..frame.clone() }
        });
        let is_start = is_start && read.aside.is_some();
        let line = Line { number: self.number, time: frame.time, is_start, text };
        self.number += 1;
        if self.lines.try_send(line).is_err() {
            self.gauge.lock().lost += 1;
        }
        read
    }

    /// Keeps what was done to alarms for the next frame.
    pub fn act(&mut self, acts: impl IntoIterator<Item = Act>) {
        self.acts.extend(acts);
        if self.acts.len() > MOST_ACTS {
            self.acts.clear();
            self.start.get_or_insert(Why::Gap);
        }
    }

    /// Goes on under another configuration, with channels that came from its own by [`Channels::extended`].
    pub fn reconfigure(&mut self, config: &Config, configuration: &str, channels: &Arc<Channels>) {
        self.text = FrameText::new(config, channels);
        self.decoder = Decoder::new(Format::JsonLines, channels.clone());
        self.configuration = configuration.into();
        self.start = Some(Why::Configuration);
    }

    /// Where it records.
    pub fn folder(&self) -> &Path {
        &self.folder
    }

    /// How it is doing.
    pub fn status(&self) -> Status {
        self.gauge.lock().clone()
    }

    /// What happened since it was last asked.
    pub fn take_news(&mut self) -> Vec<String> {
        let mut news = std::mem::take(&mut self.gauge.lock().news);
        news.extend(self.too_long.take());
        news
    }

    /// Ends it, complete; how it did.
    pub fn end(self) -> Status {
        drop(self.lines);
        let failed = self.thread.join().is_err();
        let mut status = self.gauge.lock().clone();
        if failed {
            status.trouble = Some("recording failed; this is a fault of the program, please report it".into());
        }
        status
    }

    fn written(&mut self, why: Why, now: &Present) -> Option<String> {
        let boards: BTreeMap<_, _> = now.board.corridors.iter().map(|board| (board.corridor(), board)).collect();
        let corridors = now.desk.corridors.iter().filter_map(|desk| {
            let name = &desk.corridor().name;
            Some((&**name, Kept { desk: desk.memory(), alarms: boards.get(name)?.memory() }))
        });
        let present = feed::Present {
            why,
            configuration: &self.configuration,
            holder: now.holder,
            corridors: corridors.collect(),
        };
        present.write(&self.text).ok()
    }

    /// What a line says besides its frame; `None` if nothing.
    fn aside(&mut self, start: Option<String>) -> Option<String> {
        let acts = std::mem::take(&mut self.acts);
        if start.is_none() && acts.is_empty() {
            return None;
        }
        let start = start.and_then(|start| serde_json::value::RawValue::from_string(start).ok());
        serde_json::to_string(&Besides { start: start.as_deref(), acts: &acts }).ok()
    }

    fn line(&self, frame: &Frame, aside: Option<&str>) -> Vec<u8> {
        let mut line = Vec::new();
        // Memory takes everything.
        let _written = self.text.write_with(frame, aside, &mut line);
        line
    }

    fn read(&mut self, line: &[u8]) -> Option<Frame> {
        if line.len() > MAX_LINE_BYTES {
            let text =
                format!("a start of {} MiB is too long to be recorded: replays begin without it", line.len() >> 20);
            self.too_long = Some(text);
            return None;
        }
        let mut frames = Vec::with_capacity(1);
        self.decoder.push(line, &mut Tally::default(), &mut frames);
        frames.pop()
    }
}

fn flush_interval(settings: &RecordingSettings) -> Duration {
    Duration::try_from_secs_f64(settings.flush_s).unwrap_or(Duration::MAX)
}
