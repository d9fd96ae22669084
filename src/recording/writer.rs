use std::{
    io,
    path::PathBuf,
    sync::{
        Arc, Mutex, MutexGuard, PoisonError,
        mpsc::{Receiver, RecvTimeoutError},
    },
    time::{Duration, Instant},
};

use chrono::{DateTime, NaiveDate, Utc};

use super::{day_file::DayFile, folder::Folder};
use crate::config::RecordingSettings;

/// How often to look for days that are too old or too many.
const PRUNING: Duration = Duration::from_secs(3600);
/// Things to tell that wait.
const NEWS_KEPT: usize = 20;

/// A frame to be written.
pub(super) struct Line {
    /// Counts up: one that is missing was not recorded.
    pub number: u64,
    pub time: DateTime<Utc>,
    /// Whether it says how everything stood before it.
    pub is_start: bool,
    pub text: Vec<u8>,
}

/// How the recording is doing.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Status {
    /// The file being written.
    pub file: Option<PathBuf>,
    /// Frames taken for the recording.
    pub recorded: u64,
    /// Frames that are not in it.
    pub lost: u64,
    /// Why it cannot be written at present.
    pub trouble: Option<String>,
    /// What was not told yet.
    pub(super) news: Vec<String>,
    /// Something is missing: the next frame has to say how everything stands.
    pub(super) wants_start: bool,
}

/// Shared between the thread that writes and whoever asks.
#[derive(Debug, Clone, Default)]
pub(super) struct Gauge(Arc<Mutex<Status>>);

impl Gauge {
    pub fn lock(&self) -> MutexGuard<'_, Status> {
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

impl Status {
    fn tell(&mut self, what: String) {
        if self.news.len() < NEWS_KEPT {
            self.news.push(what);
        }
    }
}

/// Opens the file of a day; what had to be repaired.
pub(super) trait Disk: Send {
    fn open(&mut self, day: NaiveDate) -> io::Result<(DayFile, Option<String>)>;
    /// Where that is.
    fn path(&self, day: NaiveDate) -> PathBuf;
    /// Makes room, and says which days are gone.
    fn prune(&mut self, today: NaiveDate) -> Vec<NaiveDate>;
}

impl Disk for (Folder, RecordingSettings) {
    fn open(&mut self, day: NaiveDate) -> io::Result<(DayFile, Option<String>)> {
        DayFile::open(&self.0.file(day))
    }

    fn path(&self, day: NaiveDate) -> PathBuf {
        self.0.file(day)
    }

    fn prune(&mut self, today: NaiveDate) -> Vec<NaiveDate> {
        self.0.prune(today, &self.1)
    }
}

/// Writes lines as they come, on a thread of its own.
pub(super) struct Writer<D> {
    disk: D,
    gauge: Gauge,
    apart: Duration,
    /// The day that is wanted last.
    wanted: Option<NaiveDate>,
    file: Option<DayFile>,
    next_number: u64,
    /// Something is missing: only a frame that says how everything stood goes on from there.
    waits_for_start: bool,
    pruned: Instant,
}

impl<D: Disk> Writer<D> {
    pub fn new(disk: D, gauge: Gauge, apart: Duration) -> Self {
        let pruned = Instant::now();
        Self { disk, gauge, apart, wanted: None, file: None, next_number: 0, waits_for_start: false, pruned }
    }

    /// Writes until nobody sends any more.
    pub fn run(mut self, lines: &Receiver<Line>) {
        let mut flushed = Instant::now();
        loop {
            match lines.recv_timeout(self.apart.saturating_sub(flushed.elapsed())) {
                Ok(line) => self.take(&line),
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => break,
            }
            if flushed.elapsed() >= self.apart {
                self.flush();
                flushed = Instant::now();
            }
        }
        self.close();
    }

    pub fn take(&mut self, line: &Line) {
        self.waits_for_start |= line.number != self.next_number;
        self.next_number = line.number + 1;
        let day = line.time.date_naive();
        if self.wanted != Some(day) {
            self.close();
            self.wanted = Some(day);
            self.open();
        }
        let is_next = |file: &&mut DayFile| !file.is_full() && file.latest.is_none_or(|latest| line.time >= latest);
        let goes_on = line.is_start || !self.waits_for_start;
        let taken = self.file.as_mut().filter(is_next).filter(|_| goes_on).map(|file| file.take(&line.text, line.time));
        self.waits_for_start = !matches!(taken, Some(Ok(())));
        let mut status = self.gauge.lock();
        if self.waits_for_start {
            status.lost += 1;
        } else {
            status.recorded += 1;
        }
        drop(status);
        if let Some(outcome @ Err(_)) = taken {
            self.judge(outcome);
        }
    }

    fn open(&mut self) {
        let Some(day) = self.wanted else { return };
        match self.disk.open(day) {
            Ok((file, repaired)) => {
                self.file = Some(file);
                let mut status = self.gauge.lock();
                status.file = Some(self.disk.path(day));
                repaired.into_iter().for_each(|repaired| status.tell(repaired));
                drop(status);
                self.judge(Ok(()));
                self.prune();
            }
            Err(error) => self.judge(Err(error)),
        }
    }

    /// Brings what there is to the disk, and tries again what failed.
    pub fn flush(&mut self) {
        match &mut self.file {
            Some(file) => {
                let outcome = file.flush();
                self.judge(outcome);
            }
            None => self.open(),
        }
        let is_ready = self.file.as_ref().is_some_and(|file| !file.is_full());
        self.gauge.lock().wants_start |= self.waits_for_start && is_ready;
        if self.pruned.elapsed() >= PRUNING {
            self.prune();
        }
    }

    fn prune(&mut self) {
        self.pruned = Instant::now();
        if let Some(today) = self.wanted {
            for day in self.disk.prune(today) {
                self.gauge.lock().tell(format!("the recording of {day} was deleted, as [recording] says"));
            }
        }
    }

    /// Ends the file at hand; what does not get to the disk now never will.
    fn close(&mut self) {
        if let Some(mut file) = self.file.take() {
            let outcome = file.end();
            if outcome.is_err() {
                self.gauge.lock().lost += file.unsynced;
            }
            self.judge(outcome);
        }
    }

    fn judge(&self, outcome: io::Result<()>) {
        let mut status = self.gauge.lock();
        let trouble = outcome.err().map(|error| format!("recording fails: {error}"));
        match &trouble {
            Some(trouble) if status.trouble.is_none() => status.tell(trouble.clone()),
            None if status.trouble.is_some() => {
                let told = format!("recording works again; {} frames are not in it", status.lost);
                status.tell(told);
            }
            _ => {}
        }
        status.trouble = trouble;
    }
}
