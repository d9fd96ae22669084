use std::{
    sync::Arc,
    time::{Duration, Instant},
};

use chrono::{TimeDelta, Utc};
use tokio::{
    sync::{mpsc, watch},
    time::{Interval, MissedTickBehavior, interval},
};

use super::{Duty, FeedReport, Keeper, Order, Origin, Parcel, Revision, Scene, Setting, report};
use crate::{
    alarm::Act,
    desk::Desk,
    events::Event,
    feed::{Channels, Feed, Frame, Holder},
    recording::{Present, Recorder},
    screen::state::Chronicle,
};

/// Frames taken in one go at most.
const BATCH_FRAMES: usize = 64;
/// How often to look at the inputs and the time when no frame comes.
const LOOK_AGAIN: Duration = Duration::from_secs(1);

/// A live feed at work: assesses every frame, keeps the alarms, and sends what comes of it.
pub struct Live {
    /// Where frames come from.
    pub feed: Feed,
    /// What assesses them.
    pub desk: Desk,
    /// What holds values between them.
    pub holder: Holder,
    /// What they read.
    pub channels: Arc<Channels>,
    /// What is in force, and the file it came from.
    pub revision: Revision,
    /// The alarms.
    pub duty: Duty,
    /// Keeps what is learned.
    pub keeper: Option<Keeper>,
    /// Records the frames.
    pub recorder: Option<Recorder>,
    /// Where what came of it goes.
    pub parcels: watch::Sender<Option<Parcel>>,
    /// What the operator asks for.
    pub orders: mpsc::Receiver<Order>,
}

/// What a live feed came to so far.
#[derive(Default)]
struct Sofar {
    chronicle: Chronicle,
    feed: FeedReport,
    setting: Option<Arc<Setting>>,
    /// What was learned from a feed that has ended is kept.
    kept: bool,
}

impl Sofar {
    /// Adds to the messages.
    fn tell(&mut self, text: String) {
        let time = self.chronicle.time().unwrap_or_else(Utc::now);
        self.chronicle.note(Event::of_program(time, text));
    }
}

/// What woke it up.
enum Woken {
    Order(Order),
    Frames(Option<Vec<Frame>>),
    Time,
    Left,
}

impl Live {
    /// Watches until the screen is gone; returns why something could not be kept.
    pub async fn run(mut self) -> Vec<String> {
        let mut second = interval(LOOK_AGAIN);
        second.set_missed_tick_behavior(MissedTickBehavior::Skip);
        let mut sofar = Sofar::default();
        loop {
            match self.wait(&mut second, sofar.feed.ended).await {
                Woken::Left => break,
                Woken::Order(Order::Alarm(order)) => {
                    let acts = self.duty.obey(&order);
                    self.record(acts);
                }
                Woken::Order(Order::Apply(number)) => self.apply(number, &mut sofar),
                Woken::Order(_) => {}
                Woken::Frames(None) => sofar.feed.ended = true,
                Woken::Frames(Some(frames)) => self.take(&mut sofar, frames),
                Woken::Time => {
                    self.let_time_pass(&sofar);
                    self.look(&mut sofar);
                }
            }
            self.keep(&mut sofar);
            sofar.feed.inputs = report::inputs(self.feed.monitor());
            self.send(&sofar);
        }
        self.duty.end();
        let learned = self.keeper.and_then(|mut keeper| keeper.save(&self.desk).map(Into::into));
        let recorded = self.recorder.and_then(|recorder| report::unrecorded(&recorder.end()));
        learned.into_iter().chain(recorded).collect()
    }

    /// Orders first: a flood of frames must not keep the operator waiting.
    async fn wait(&mut self, second: &mut Interval, ended: bool) -> Woken {
        tokio::select! {
            biased;
            () = self.parcels.closed() => Woken::Left,
            order = self.orders.recv() => order.map_or(Woken::Left, Woken::Order),
            _ = second.tick() => Woken::Time,
            frames = self.feed.next_batch(BATCH_FRAMES), if !ended => Woken::Frames(frames),
        }
    }

    /// A frame as its recording has it, where there is one. What an input says besides frames is not taken up.
    fn recorded(&mut self, frame: Frame) -> Frame {
        let frame = Frame { aside: None, ..frame };
        let Some(recorder) = &mut self.recorder else { return frame };
        let board = &self.duty.report().alarms.board;
        recorder.take(&frame, &Present { holder: &self.holder, desk: &self.desk, board })
    }

    fn record(&mut self, acts: impl IntoIterator<Item = Act>) {
        if let Some(recorder) = &mut self.recorder {
            recorder.act(acts);
        }
    }

    fn take(&mut self, sofar: &mut Sofar, frames: Vec<Frame>) {
        let mut entries = Vec::new();
        for frame in frames {
            sofar.feed.frames += 1;
            sofar.feed.arrived = Some(Instant::now());
            let frame = self.recorded(frame);
            if let Some(snapshot) = self.holder.take(&frame) {
                snapshot.start().into_iter().for_each(|start| self.duty.begin_at(start));
                let assessments = self.desk.assess(&snapshot);
                entries.extend(self.duty.observe(&assessments));
                sofar.chronicle.take(assessments);
            }
        }
        self.duty.write(entries);
    }

    /// Without frames the frames' time goes on by this computer's clock.
    fn let_time_pass(&mut self, sofar: &Sofar) {
        let passed = sofar.feed.arrived.map(|arrived| arrived.elapsed()).filter(|passed| *passed >= LOOK_AGAIN);
        let passed = passed.and_then(|passed| TimeDelta::from_std(passed).ok());
        match sofar.chronicle.time().zip(passed).and_then(|(time, passed)| time.checked_add_signed(passed)) {
            Some(now) => {
                let act = self.duty.elapse(now);
                self.record(act);
            }
            None => self.duty.write(Vec::new()),
        }
    }

    /// Looks at the configuration file.
    fn look(&mut self, sofar: &mut Sofar) {
        if !self.revision.look() {
            return;
        }
        let Some(change) = self.revision.change().cloned() else { return };
        if change.is_sound && self.revision.running().screen.apply_changes {
            self.apply(change.number, sofar);
        } else if !change.is_sound {
            let text = format!("the changed configuration file is refused: {}", change.lines.join(" "));
            sofar.tell(text);
        }
    }

    /// Takes a change into force, whole: between two frames, of which none is lost.
    fn apply(&mut self, number: u64, sofar: &mut Sofar) {
        let Some(change) = self.revision.change().cloned() else { return };
        let Some(before) = self.revision.apply(number) else { return };
        let config = self.revision.running();
        let max_age = config.feed.max_age();
        self.channels = Arc::new(self.channels.extended(config));
        self.feed.rewire(&self.channels);
        self.holder.rewire(&self.channels, max_age);
        let desk = std::mem::replace(&mut self.desk, Desk { corridors: Vec::new() });
        self.desk = desk.reconfigured(&before, config, &self.channels);
        if let Some(snapshot) = self.holder.snapshot() {
            // A look ahead that leaves no trace: the frame itself was taken already.
            sofar.chronicle.reconfigure(self.desk.clone().assess(&snapshot));
        }
        self.duty.reconfigure(config, &change.lines);
        if let Some(recorder) = &mut self.recorder {
            recorder.reconfigure(config, self.revision.text(), &self.channels);
        }
        sofar.setting = Some(Arc::new(Setting {
            grid: Arc::new(config.grid.clone()),
            zone: config.time_zone,
            max_age,
            screen: config.screen.clone(),
        }));
        sofar.tell(format!("the configuration has changed: {}", change.lines.join("; ")));
    }

    /// Keeps what was learned, and passes on what there is to say of it, and of the recording, once there is a time to say
    /// it at.
    fn keep(&mut self, sofar: &mut Sofar) {
        if let Some(recorder) = &mut self.recorder {
            sofar.feed.recorded = Some(report::recording(recorder));
            sofar.feed.unrecorded = recorder.status().trouble;
            if sofar.chronicle.time().is_some() {
                recorder.take_news().into_iter().for_each(|text| sofar.tell(text));
            }
        }
        let Some(keeper) = &mut self.keeper else { return };
        if sofar.feed.ended && !sofar.kept {
            sofar.kept = true;
            keeper.save(&self.desk);
        } else {
            keeper.look(&self.desk);
        }
        if let Some(time) = sofar.chronicle.time() {
            for text in keeper.take_news() {
                sofar.chronicle.note(Event::of_program(time, text));
            }
        }
        sofar.feed.kept = Some(keeper.report());
    }

    fn send(&self, sofar: &Sofar) {
        let parcel = Parcel {
            chronicle: sofar.chronicle.clone(),
            alarms: self.duty.report().clone(),
            feed: sofar.feed.clone(),
            scene: Scene { setting: sofar.setting.clone(), change: self.revision.change().cloned() },
            origin: Origin::Live,
        };
        self.parcels.send_replace(Some(parcel));
    }
}
