use std::{
    sync::{
        Arc,
        mpsc::{Receiver, RecvTimeoutError},
    },
    time::{Duration, Instant},
};

use chrono::{DateTime, TimeDelta, Utc};
use tokio::sync::watch;

use super::{
    AlarmOrder, AlarmReport, FeedReport, Goal, InputReport, MarkBook, Order, Origin, Parcel, Playback, Player, SPEEDS,
    Scene, Seeking, report,
};
use crate::screen::state::Survey;

/// Parcels go out at most this often while frames rush by.
const PARCELS_APART: Duration = Duration::from_millis(40);
/// How often to look how far the survey is.
const LOOK_AGAIN: Duration = Duration::from_millis(200);
/// Further behind than this, the clock of the recording waits for the frames.
const LAG_MAX: Duration = Duration::from_millis(100);

/// A recording at work: takes orders, and sends what comes of them.
pub struct Replay {
    player: Player,
    name: Arc<str>,
    survey: watch::Receiver<Arc<Survey>>,
    marks: MarkBook,
    parcels: watch::Sender<Option<Parcel>>,
    orders: Receiver<Order>,
    playing: bool,
    speed: u32,
    clock: Clock,
    seeking: Option<Seek>,
    trouble: Option<String>,
    sent: Option<Instant>,
    /// The last order about alarms that was answered, and why it was refused.
    answer: (u64, Option<String>),
}

/// A way under way.
struct Seek {
    goal: Goal,
    from: usize,
    start: Option<DateTime<Utc>>,
}

/// Recorded time against this computer's, while playing.
#[derive(Clone, Copy)]
struct Clock {
    real: Instant,
    recorded: Option<DateTime<Utc>>,
}

impl Replay {
    /// Ready to run.
    pub fn new(
        player: Player,
        survey: watch::Receiver<Arc<Survey>>,
        parcels: watch::Sender<Option<Parcel>>,
        orders: Receiver<Order>,
    ) -> Self {
        let recording = player.beginning().recording;
        let clock = Clock { real: Instant::now(), recorded: None };
        Self {
            player,
            name: recording.name().into(),
            survey,
            marks: MarkBook::beside(&recording),
            parcels,
            orders,
            playing: true,
            speed: 1,
            clock,
            seeking: None,
            trouble: None,
            sent: None,
            answer: (0, None),
        }
    }

    /// Starts at a time, at a speed, playing or not.
    pub fn begin(&mut self, at: Option<DateTime<Utc>>, speed: u32, playing: bool) {
        (self.speed, self.playing) = (speed, playing);
        match at {
            Some(time) => self.go(Goal::Time(time)),
            // Something to look at, also when paused.
            None => drop(self.player.step()),
        }
        self.set_clock();
    }

    /// Plays until the screen is gone.
    pub fn run(mut self) {
        loop {
            let due = self.due();
            if due.is_none_or(|due| !due.is_zero()) || self.sent.is_none_or(|sent| sent.elapsed() > PARCELS_APART) {
                self.send();
            }
            let order = match due {
                None => self.orders.recv().map_err(|_| RecvTimeoutError::Disconnected),
                Some(due) => self.orders.recv_timeout(due),
            };
            match order {
                Ok(order) => self.obey(order),
                Err(RecvTimeoutError::Disconnected) => return,
                Err(RecvTimeoutError::Timeout) => self.go_on(),
            }
        }
    }

    /// How long until there is something to do; `None`: until the next order.
    fn due(&mut self) -> Option<Duration> {
        if self.seeking.is_some() {
            return Some(Duration::ZERO);
        }
        let next = if self.playing { self.player.next_time() } else { None };
        let Some(next) = next else {
            return (!self.survey.borrow().ended).then_some(LOOK_AGAIN);
        };
        // The time bar moves between frames, too: once a second, recorded or real, whichever is longer.
        let tick = Duration::from_secs(1).div_f64(f64::from(self.speed)).max(Duration::from_millis(100));
        Some(self.clock.until(next, self.speed).min(tick))
    }

    fn go_on(&mut self) {
        if let Some(seek) = &self.seeking {
            let goal = seek.goal;
            if self.player.is_at(goal) || !self.player.step() {
                self.seeking = None;
                self.arrive(goal);
            }
            return;
        }
        if !self.playing {
            return;
        }
        if let Some(next) = self.player.next_time()
            && self.clock.until(next, self.speed).is_zero()
        {
            self.player.step();
            if self.clock.lag(next, self.speed) > LAG_MAX {
                self.set_clock();
            }
        } else if let Some(now) = self.now() {
            self.player.elapse(now);
        }
    }

    fn obey(&mut self, order: Order) {
        let taken = self.player.here().taken;
        match order {
            Order::Toggle => {
                self.playing = !self.playing;
                self.set_clock();
            }
            Order::Faster => self.set_speed(SPEEDS.into_iter().find(|&speed| speed > self.speed)),
            Order::Slower => self.set_speed(SPEEDS.into_iter().rev().find(|&speed| speed < self.speed)),
            Order::StepForward => {
                self.playing = false;
                self.go(Goal::Taken(taken + 1));
            }
            Order::StepBack => {
                self.playing = false;
                self.go(Goal::Taken(taken.saturating_sub(1).max(1)));
            }
            Order::Jump(by) => {
                if let Some(time) = self.now().and_then(|now| now.checked_add_signed(by)) {
                    // A jump on leads on, even out of a gap longer than itself.
                    let next = self.player.next_time().filter(|_| by > TimeDelta::zero());
                    self.go(Goal::Time(next.map_or(time, |next| next.max(time))));
                }
            }
            Order::Seek(time) => self.go(Goal::Time(time)),
            Order::Visit(time) => {
                self.playing = false;
                self.go(Goal::Time(time));
            }
            Order::Cancel => {
                self.seeking = None;
                self.set_clock();
            }
            // A recording is played as it was configured.
            Order::Apply(_) => {}
            Order::Alarm(AlarmOrder { number, wish }) => {
                self.answer = (number, self.player.obey(&wish).err().map(|refusal| refusal.to_string()));
            }
            Order::Mark(wish) => self.marks.obey(wish),
        }
    }

    fn set_speed(&mut self, speed: Option<u32>) {
        self.set_clock_at(self.now());
        self.speed = speed.unwrap_or(self.speed);
    }

    /// Sets out; a goal before the first frame is the first frame.
    fn go(&mut self, goal: Goal) {
        let start = self.player.here().time;
        let from = self.player.here().taken;
        match self.player.leap(goal) {
            Ok(()) => self.trouble = None,
            Err(error) => self.trouble = Some(format!("cannot be read again: {error}")),
        }
        if self.player.here().taken == 0 {
            self.player.step();
        }
        let from = from.min(self.player.here().taken);
        let start = start.min(self.player.here().time);
        self.seeking = (!self.player.is_at(goal)).then_some(Seek { goal, from, start });
        if self.seeking.is_none() {
            self.arrive(goal);
        }
    }

    /// In a silence between two frames, alarms know how long it has lasted.
    fn arrive(&mut self, goal: Goal) {
        if let Goal::Time(time) = goal
            && self.player.next_time().is_some()
            && self.player.here().time < Some(time)
        {
            self.player.elapse(time);
        }
        self.set_clock();
    }

    fn set_clock(&mut self) {
        self.set_clock_at(self.player.here().time);
    }

    fn set_clock_at(&mut self, recorded: Option<DateTime<Utc>>) {
        self.clock = Clock { real: Instant::now(), recorded };
    }

    /// Where the clock of the recording stands.
    fn now(&self) -> Option<DateTime<Utc>> {
        let here = self.player.here().time;
        if self.playing && self.seeking.is_none() { here.max(self.clock.now(self.speed)) } else { here }
    }

    fn send(&mut self) {
        self.sent = Some(Instant::now());
        let now = self.now();
        let at_end = self.player.next_time().is_none();
        let here = self.player.here();
        let playback = Playback {
            playing: self.playing,
            speed: self.speed,
            now: if at_end { here.time } else { now },
            taken: here.taken,
            seeking: self.seeking.as_ref().map(|seek| seek.progress(here.taken, here.time)),
            at_end,
            survey: self.survey.borrow().clone(),
            marks: self.marks.report().clone(),
        };
        let trouble = self.trouble.iter().map(|trouble| InputReport {
            name: self.name.clone(),
            standing: trouble.clone(),
            findings: Vec::new(),
        });
        let inputs = trouble.chain(report::inputs(self.player.monitor())).collect();
        let feed = FeedReport { inputs, frames: here.taken as u64, ..FeedReport::default() };
        let chronicle = here.chronicle.clone();
        let (answered, refusal) = self.answer.clone();
        let alarms = AlarmReport { alarms: here.alarms.clone(), answered, refusal, ..AlarmReport::default() };
        self.parcels.send_replace(Some(Parcel {
            chronicle,
            alarms,
            scene: Scene::default(),
            feed,
            origin: Origin::Replay(playback),
        }));
    }
}

impl Seek {
    fn progress(&self, taken: usize, time: Option<DateTime<Utc>>) -> Seeking {
        let share = |done: f64, whole: f64| (done / whole.max(1.0)).clamp(0.0, 1.0);
        match (self.goal, self.start, time) {
            (Goal::Time(goal), Some(start), Some(time)) => {
                let done = share((time - start).as_seconds_f64(), (goal - start).as_seconds_f64());
                Seeking { to: Some(goal), done }
            }
            (Goal::Time(goal), ..) => Seeking { to: Some(goal), done: 0.0 },
            (Goal::Taken(goal), ..) => {
                Seeking { to: None, done: share((taken - self.from) as f64, goal.saturating_sub(self.from) as f64) }
            }
        }
    }
}

impl Clock {
    fn now(&self, speed: u32) -> Option<DateTime<Utc>> {
        let passed = TimeDelta::from_std(self.real.elapsed()).unwrap_or(TimeDelta::MAX);
        self.recorded?.checked_add_signed(passed.checked_mul(i32::try_from(speed).unwrap_or(i32::MAX))?)
    }

    /// Real time until a recorded time; zero when it has come.
    fn until(&self, time: DateTime<Utc>, speed: u32) -> Duration {
        let recorded = self.now(speed).map_or(TimeDelta::zero(), |now| time - now);
        recorded.to_std().map_or(Duration::ZERO, |recorded| recorded / speed.max(1))
    }

    /// Real time since a recorded time came.
    fn lag(&self, time: DateTime<Utc>, speed: u32) -> Duration {
        let recorded = self.now(speed).map_or(TimeDelta::zero(), |now| now - time);
        recorded.to_std().map_or(Duration::ZERO, |recorded| recorded / speed.max(1))
    }
}

#[cfg(test)]
mod tests {
    use std::{fs, sync::mpsc::sync_channel, thread};

    use chrono_tz::Tz;
    use futures::executor::block_on;

    use super::*;
    use crate::screen::connection::{Mark, MarkWish, Surveyor, player::tests::player};

    #[test]
    fn a_visit_leads_to_the_frame_and_stays_there_and_marks_are_kept() {
        let (player, path) = player("visit");
        let survey = Surveyor::new(player.beginning(), TimeDelta::seconds(10), Tz::UTC).start();
        let (sender, mut parcels) = watch::channel(None);
        let (orders, taken) = sync_channel(8);
        let mut replay = Replay::new(player, survey, sender, taken);
        let running = thread::spawn(move || {
            replay.begin(None, 3600, true);
            replay.run();
        });
        let start: DateTime<Utc> = "2031-03-14T05:00:00Z".parse().unwrap();
        let (frame, between) = (start + TimeDelta::seconds(1200), start + TimeDelta::seconds(1201));
        for time in [frame, between, frame] {
            orders.send(Order::Visit(time)).unwrap();
            let there = |parcel: &Option<Parcel>| {
                let Some(Parcel { origin: Origin::Replay(playback), .. }) = parcel else { return false };
                !playback.playing && playback.seeking.is_none() && playback.now == Some(frame)
            };
            block_on(parcels.wait_for(there)).unwrap();
        }
        let mark = Mark { time: frame, corridor: None, note: "here".into() };
        orders.send(Order::Mark(MarkWish::Set(mark.clone()))).unwrap();
        let marked = |parcel: &Option<Parcel>| {
            let Some(Parcel { origin: Origin::Replay(playback), .. }) = parcel else { return false };
            *playback.marks.marks == [mark.clone()] && playback.survey.ended
        };
        block_on(parcels.wait_for(marked)).unwrap();
        drop(orders);
        running.join().unwrap();
        fs::remove_file(path.with_extension("marks.json")).unwrap();
        fs::remove_file(path).unwrap();
    }
}
