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
    /// Of these, those that are on the disk.
    pub on_disk: u64,
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
                if let Some(repaired) = repaired {
                    status.tell(repaired);
                }
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
                let mut status = self.gauge.lock();
                if outcome.is_ok() {
                    status.on_disk = status.recorded;
                }
                // Deleted under way: the next flush begins another.
                if outcome.as_ref().is_err_and(|error| error.kind() == io::ErrorKind::NotFound) {
                    status.lost += file.unsynced;
                    self.file = None;
                    self.waits_for_start = true;
                }
                drop(status);
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

#[cfg(test)]
mod tests {
    use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};

    use chrono::TimeDelta;

    use super::*;
    use crate::recording::day_file::Sink;

    /// A disk with room for so many bytes, and a folder that can be opened or not.
    #[derive(Clone, Default)]
    struct Small {
        room: Arc<AtomicUsize>,
        closed: Arc<AtomicBool>,
        bytes: Arc<Mutex<Vec<u8>>>,
    }

    impl Sink for Small {
        fn append(&mut self, bytes: &[u8]) -> io::Result<usize> {
            let count = bytes.len().min(self.room.load(Ordering::Relaxed));
            if count == 0 {
                return Err(io::ErrorKind::StorageFull.into());
            }
            self.room.fetch_sub(count, Ordering::Relaxed);
            self.bytes.lock().unwrap().extend(&bytes[..count]);
            Ok(count)
        }

        fn sync(&mut self) -> io::Result<()> {
            Ok(())
        }
    }

    impl Disk for Small {
        fn open(&mut self, _: NaiveDate) -> io::Result<(DayFile, Option<String>)> {
            if self.closed.load(Ordering::Relaxed) {
                return Err(io::ErrorKind::ReadOnlyFilesystem.into());
            }
            Ok((DayFile::new(Box::new(self.clone())), None))
        }

        fn path(&self, day: NaiveDate) -> PathBuf {
            day.to_string().into()
        }

        fn prune(&mut self, _: NaiveDate) -> Vec<NaiveDate> {
            Vec::new()
        }
    }

    impl Small {
        fn lines(&self) -> Vec<String> {
            let bytes = self.bytes.lock().unwrap();
            let text = String::from_utf8(zstd::decode_all(&bytes[..]).unwrap()).unwrap();
            text.lines().map(|line| line.split(' ').next().unwrap().to_owned()).collect()
        }
    }

    /// Hard to compress.
    fn line(number: u64, is_start: bool, length: usize) -> Line {
        let mut state = number + 1;
        let mut noise = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            char::from(b'a' + u8::try_from((state >> 33) % 26).unwrap())
        };
        let noise: String = (0..length).map(|_| noise()).collect();
        let time = DateTime::UNIX_EPOCH + TimeDelta::seconds(number.try_into().unwrap());
        Line { number, time, is_start, text: format!("{number} {noise}\n").into_bytes() }
    }

    fn writer(disk: &Small) -> (Writer<Small>, Gauge) {
        let gauge = Gauge::default();
        (Writer::new(disk.clone(), gauge.clone(), Duration::ZERO), gauge)
    }

    #[test]
    fn a_disk_that_is_full_for_a_while_loses_nothing() {
        let disk = Small::default();
        let (mut writer, gauge) = writer(&disk);
        disk.room.store(5000, Ordering::Relaxed);
        for number in 0..20 {
            writer.take(&line(number, number == 0, 1000));
            writer.flush();
            assert_eq!(gauge.lock().trouble.is_some(), number >= 7, "{number}");
        }
        disk.room.store(100_000, Ordering::Relaxed);
        writer.flush();
        assert_eq!(gauge.lock().trouble, None);
        writer.close();
        assert_eq!(disk.lines(), (0..20).map(|n| n.to_string()).collect::<Vec<_>>());
        let status = gauge.lock();
        assert_eq!((status.recorded, status.lost, status.wants_start), (20, 0, false));
        assert_eq!(status.news.len(), 2, "{:?}", status.news);
    }

    #[test]
    fn what_does_not_fit_is_counted_and_it_goes_on_with_a_start() {
        let disk = Small::default();
        let (mut writer, gauge) = writer(&disk);
        for number in 0..30 {
            writer.take(&line(number, number == 0, 1 << 20));
            writer.flush();
        }
        let lost = gauge.lock().lost;
        assert!((5..25).contains(&lost) && !gauge.lock().wants_start, "{lost}");
        disk.room.store(100 << 20, Ordering::Relaxed);
        writer.flush();
        assert!(gauge.lock().wants_start && gauge.lock().trouble.is_none());
        writer.take(&line(30, false, 10));
        writer.take(&line(31, true, 10));
        writer.take(&line(32, false, 10));
        // One that was lost on its way.
        writer.take(&line(34, false, 10));
        writer.take(&line(35, true, 10));
        writer.close();
        let held = 30 - lost;
        let expected: Vec<_> = (0..held).chain([31, 32, 35]).map(|n| n.to_string()).collect();
        assert_eq!(disk.lines(), expected);
        assert_eq!(gauge.lock().lost, lost + 2);
    }

    #[test]
    fn a_deleted_file_is_noticed_and_begun_anew() {
        let place = tempfile::tempdir().unwrap();
        let folder = place.path().join("days");
        let gauge = Gauge::default();
        let disk = (Folder::take(&folder).unwrap(), RecordingSettings::default());
        let mut writer = Writer::new(disk, gauge.clone(), Duration::ZERO);
        let trouble = || gauge.lock().trouble.clone();
        writer.take(&line(0, true, 10));
        writer.flush();
        assert_eq!(trouble(), None);
        std::fs::remove_dir_all(&folder).unwrap();
        writer.take(&line(1, false, 10));
        writer.flush();
        assert!(trouble().unwrap().contains("deleted"));
        writer.flush();
        assert!(trouble().is_some(), "the folder is not there either");
        std::fs::create_dir(&folder).unwrap();
        writer.flush();
        assert_eq!(trouble(), None);
        assert!(gauge.lock().wants_start);
        writer.take(&line(2, false, 10));
        writer.take(&line(3, true, 10));
        writer.close();
        let bytes = std::fs::File::open(folder.join("1970-01-01.jsonl.zst")).unwrap();
        assert!(zstd::decode_all(bytes).unwrap().starts_with(b"3 "));
        assert_eq!(gauge.lock().lost, 2);
    }

    #[test]
    fn a_folder_that_cannot_be_written_is_tried_again() {
        let disk = Small::default();
        disk.closed.store(true, Ordering::Relaxed);
        disk.room.store(1 << 20, Ordering::Relaxed);
        let (mut writer, gauge) = writer(&disk);
        writer.take(&line(0, true, 10));
        writer.take(&line(1, false, 10));
        writer.flush();
        let status = gauge.lock().clone();
        assert!(status.trouble.is_some_and(|trouble| trouble.contains("read-only")) && status.lost == 2);
        disk.closed.store(false, Ordering::Relaxed);
        writer.flush();
        assert!(gauge.lock().wants_start);
        writer.take(&line(2, true, 10));
        // Time must not go back within a file.
        writer.take(&Line { time: DateTime::UNIX_EPOCH, ..line(3, true, 10) });
        writer.take(&line(4, true, 10));
        writer.close();
        assert_eq!(disk.lines(), ["2", "4"]);
        assert_eq!(gauge.lock().lost, 3);
    }
}
