//! Stretches of recorded days on all cores: within one, corridors side by side while the next frames are read; and
//! several stretches at once. The days come out in the order of time.

use std::{
    collections::VecDeque,
    io,
    iter::Peekable,
    num::NonZeroUsize,
    sync::{
        Mutex, PoisonError,
        mpsc::{Receiver, SyncSender, sync_channel},
    },
    thread,
};

use chrono::NaiveDate;
use rayon::{ThreadPool, ThreadPoolBuilder};
use serde_json::value::RawValue;

use super::{Bench, Day, FileNote, Follow, Rows, Stretch, Task, archive::barren};
use crate::feed::{Frame, Recorded};

/// Frames assessed at once.
const BATCH_FRAMES: usize = 128;

/// Where the rows of each day go.
pub trait Output: Sync {
    /// Takes the rows of one corridor.
    type Rows: Rows;
    /// Takes those of all corridors on one day.
    type Book: Send;
    /// Begins a day of a stretch, with rows for each corridor.
    fn open(&self, stretch: &Stretch, date: NaiveDate) -> io::Result<(Self::Book, Vec<Self::Rows>)>;
    /// Looks after rows that have come, the last ones of the day included.
    fn turn(&self, book: &mut Self::Book, rows: &mut Self::Rows, is_last: bool) -> io::Result<()>;
    /// Ends a day.
    fn close(&self, book: Self::Book) -> io::Result<()>;
}

/// What is to be done.
pub struct Run<'a, O> {
    /// How to review.
    pub task: &'a Task,
    /// What to review, in the order of time.
    pub stretches: &'a [Stretch],
    /// Threads that assess; `None`: one a processor.
    pub threads: Option<NonZeroUsize>,
    /// Days without a recorded start go on from the day before them, one after another.
    pub carry: bool,
    /// Where rows go.
    pub output: &'a O,
    /// A day that was reviewed before.
    pub known: &'a (dyn Fn(&Stretch, NaiveDate) -> Option<Reviewed> + Sync),
    /// Follows the reading.
    pub follow: &'a Follow,
}

/// A day that is done, and how everything stood at its end where the next day is to go on from there.
#[derive(Debug, Clone)]
pub struct Reviewed {
    /// The day.
    pub day: Day,
    /// Its end, as a recording says how a day starts.
    pub end: Option<Box<RawValue>>,
}

/// What the day before left.
struct Before {
    end: Option<Box<RawValue>>,
    was_known: bool,
}

/// A day that is done.
pub struct Done {
    /// The day.
    pub reviewed: Reviewed,
    /// Its stretch, by place.
    pub stretch: usize,
    /// Whether it was known before.
    pub was_known: bool,
}

/// A stretch to be done, and where its days go.
type Job = (usize, SyncSender<io::Result<Step>>);

/// What comes of a stretch.
enum Step {
    Day(Done),
    /// Files without a single frame.
    Nothing(Vec<FileNote>),
}

impl<O: Output> Run<'_, O> {
    /// Reviews everything; `each` gets the days in the order of time, and may end it by failing. Returns the files that
    /// did not bring a single frame.
    pub fn go<E: From<io::Error>>(&self, mut each: impl FnMut(Done) -> Result<(), E>) -> Result<Vec<FileNote>, E> {
        let threads = self.threads.map_or(0, NonZeroUsize::get);
        let pool = ThreadPoolBuilder::new().num_threads(threads).build().map_err(io::Error::other)?;
        let workers = if self.carry { 1 } else { pool.current_num_threads().min(self.stretches.len()) };
        let (jobs, taken) = sync_channel::<Job>(workers);
        let (pool, taken) = (&pool, &Mutex::new(taken));
        thread::scope(|scope| {
            // Gone with the scope: that is what ends the workers.
            let jobs = jobs;
            for _ in 0..workers {
                scope.spawn(move || self.work(pool, taken));
            }
            let mut ahead: VecDeque<Receiver<io::Result<Step>>> = VecDeque::new();
            let mut barren = Vec::new();
            let mut next = 0..self.stretches.len();
            loop {
                // Not so far ahead that days pile up.
                while ahead.len() < 2 * workers
                    && let Some(stretch) = next.next()
                {
                    let (days, coming) = sync_channel(1);
                    if jobs.send((stretch, days)).is_err() {
                        break;
                    }
                    ahead.push_back(coming);
                }
                let Some(days) = ahead.pop_front() else { return Ok(barren) };
                for step in days {
                    match step? {
                        Step::Day(done) => each(done)?,
                        Step::Nothing(files) => barren.extend(files),
                    }
                }
            }
        })
    }

    fn work(&self, pool: &ThreadPool, jobs: &Mutex<Receiver<Job>>) {
        let mut before = Before { end: None, was_known: true };
        loop {
            let job = jobs.lock().unwrap_or_else(PoisonError::into_inner).recv();
            let Ok((place, days)) = job else { return };
            if let Err(error) = self.stretch(place, pool, &mut before, &days) {
                // Nobody listens any more when the whole run has failed already.
                let _unheard = days.send(Err(error));
            }
        }
    }

    fn stretch(
        &self,
        place: usize,
        pool: &ThreadPool,
        before: &mut Before,
        days: &SyncSender<io::Result<Step>>,
    ) -> io::Result<()> {
        let stretch = &self.stretches[place];
        let send = |reviewed, was_known| days.send(Ok(Step::Day(Done { reviewed, stretch: place, was_known }))).is_ok();
        let known = |date| (self.known)(stretch, date);
        // A day that is not known may have no frame, or wait to be reviewed: the files tell.
        if let Some((first, last)) = stretch.days.filter(|_| !self.carry) {
            let dates = first.iter_days().take_while(|date| *date <= last);
            if dates.clone().all(|date| known(date).is_some()) {
                let _all_heard = dates.filter_map(known).all(|reviewed| send(reviewed, true));
                return Ok(());
            }
        }
        let recorded = stretch.open(&self.task.channels, self.follow);
        let monitor = recorded.monitor().clone();
        let mut frames = recorded.peekable();
        let mut findings = stretch.findings.clone();
        if frames.peek().is_none() {
            let _unheard = days.send(Ok(Step::Nothing(barren(&monitor))));
            return Ok(());
        }
        while let Some(date) = frames.peek().map(|frame| frame.time.date_naive()) {
            // What is carried over is known only as long as everything before it is.
            let reviewed = known(date).filter(|_| !self.carry || before.was_known);
            before.was_known = reviewed.is_some();
            // They are said once, on the first day.
            let findings = std::mem::take(&mut findings);
            let reviewed = if let Some(reviewed) = reviewed {
                while !batch(&mut frames, date).is_empty() {}
                reviewed
            } else {
                let carried = before.end.take().filter(|_| self.carry);
                let bench = self.day(stretch, date, carried, pool, &mut frames)?;
                let files = stretch.notes(date, frames.peek().is_none(), &monitor);
                let end = self.carry.then(|| bench.end(self.task)).flatten();
                let Some(day) = bench.finish(files, findings) else { continue };
                Reviewed { day, end }
            };
            before.end.clone_from(&reviewed.end);
            if !send(reviewed, before.was_known) {
                return Ok(());
            }
        }
        Ok(())
    }

    /// Takes all frames of a day.
    fn day(
        &self,
        stretch: &Stretch,
        date: NaiveDate,
        carried: Option<Box<RawValue>>,
        pool: &ThreadPool,
        frames: &mut Peekable<Recorded>,
    ) -> io::Result<Bench<O::Rows>> {
        let (mut book, rows) = self.output.open(stretch, date)?;
        let mut bench = Bench::new(self.task, rows);
        let mut now = batch(frames, date);
        if let (Some(end), Some(first)) = (carried, now.first_mut()) {
            bench.carry(&end, self.task, first);
        }
        while !now.is_empty() {
            let mut next = Vec::new();
            pool.in_place_scope(|scope| {
                scope.spawn(|_| bench.take(&now));
                next = batch(frames, date);
            });
            bench.rows().try_for_each(|rows| self.output.turn(&mut book, rows, false))?;
            now = next;
        }
        bench.rows().try_for_each(|rows| self.output.turn(&mut book, rows, true))?;
        self.output.close(book)?;
        Ok(bench)
    }
}

/// The next frames of a day; none when they are all taken.
fn batch(frames: &mut Peekable<Recorded>, date: NaiveDate) -> Vec<Frame> {
    let mut batch = Vec::new();
    while batch.len() < BATCH_FRAMES
        && let Some(frame) = frames.next_if(|frame| frame.time.date_naive() == date)
    {
        batch.push(frame);
    }
    batch
}

/// Keeps no rows.
impl Output for usize {
    type Rows = ();
    type Book = ();

    fn open(&self, _stretch: &Stretch, _date: NaiveDate) -> io::Result<((), Vec<()>)> {
        Ok(((), vec![(); *self]))
    }

    fn turn(&self, _book: &mut (), _rows: &mut (), _is_last: bool) -> io::Result<()> {
        Ok(())
    }

    fn close(&self, _book: ()) -> io::Result<()> {
        Ok(())
    }
}
