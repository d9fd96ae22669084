use std::{io, iter::Peekable, sync::Arc};

use chrono::{DateTime, Utc};

use super::{Alarms, Recording, Wish};
use crate::{
    alarm::{Board, Refusal},
    desk::Desk,
    feed::{Channels, Holder, Monitor, Recorded},
    screen::state::Chronicle,
};

/// Frames between two kept places, at first.
const SPACING: usize = 256;

/// A place in a recording with everything remembered there: going on from it gives what playing up to it gave.
#[derive(Debug, Clone)]
pub struct Place {
    /// Frames taken to get here.
    pub taken: usize,
    /// Time of the last of them.
    pub time: Option<DateTime<Utc>>,
    /// What the corridors came to.
    pub chronicle: Chronicle,
    /// How their alarms stand.
    pub alarms: Alarms,
    holder: Holder,
    desk: Desk,
}

/// All that a recording is played from.
#[derive(Debug, Clone)]
pub struct Beginning {
    /// The recording.
    pub recording: Recording,
    /// What its frames hold.
    pub channels: Arc<Channels>,
    /// What assesses them.
    pub desk: Desk,
    /// What holds values between them.
    pub holder: Holder,
    /// The alarms.
    pub board: Board,
}

/// Where to go.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Goal {
    /// Just past the last frame at or before this time.
    Time(DateTime<Utc>),
    /// Past so many frames.
    Taken(usize),
}

/// Plays a recording frame by frame, and goes back by way of places kept.
#[derive(Debug)]
pub struct Player {
    channels: Arc<Channels>,
    recording: Recording,
    frames: Peekable<Recorded>,
    monitor: Monitor,
    here: Place,
    /// In ascending order, the very first included.
    kept: Vec<Place>,
    kept_max: usize,
    spacing: usize,
}

impl Player {
    /// At the start of a recording.
    pub fn new(
        recording: Recording,
        channels: Arc<Channels>,
        holder: Holder,
        desk: Desk,
        board: Board,
    ) -> io::Result<Self> {
        let frames = recording.open(&channels)?;
        let (monitor, frames) = (frames.monitor().clone(), frames.peekable());
        // A place holds what every corridor remembers, which may be a few hundred kilobytes each.
        let kept_max = (400 / desk.corridors.len().max(1)).clamp(8, 96);
        let here =
            Place { taken: 0, time: None, chronicle: Chronicle::default(), alarms: Alarms::new(board), holder, desk };
        let kept = vec![here.clone()];
        Ok(Self { channels, recording, frames, monitor, here, kept, kept_max, spacing: SPACING })
    }

    /// Everything as it was before the first frame.
    pub fn beginning(&self) -> Beginning {
        let Place { desk, holder, alarms, .. } = self.kept[0].clone();
        let board = Board::clone(&alarms.board);
        Beginning { recording: self.recording.clone(), channels: self.channels.clone(), desk, holder, board }
    }

    /// Where we are.
    pub fn here(&self) -> &Place {
        &self.here
    }

    /// How the reading goes.
    pub fn monitor(&self) -> &Monitor {
        &self.monitor
    }

    /// Time of the next frame; `None` at the end.
    pub fn next_time(&mut self) -> Option<DateTime<Utc>> {
        self.frames.peek().map(|frame| frame.time)
    }

    /// Takes the next frame; `false` at the end.
    pub fn step(&mut self) -> bool {
        let Some(frame) = self.frames.next() else { return false };
        let here = &mut self.here;
        here.taken += 1;
        here.time = Some(frame.time);
        if let Some(snapshot) = here.holder.take(&frame) {
            let assessments = here.desk.assess(&snapshot);
            snapshot.aside.iter().for_each(|aside| here.alarms.take_up(aside));
            here.alarms.observe(&assessments);
            here.chronicle.take(assessments);
        }
        self.keep();
        true
    }

    /// Takes in that time has passed without a frame.
    pub fn elapse(&mut self, now: DateTime<Utc>) {
        self.here.alarms.elapse(now);
    }

    /// Does something with alarms. What was kept of the recording beyond here knows nothing of it, and is forgotten.
    pub fn obey(&mut self, wish: &Wish) -> Result<(), Refusal> {
        self.here.alarms.obey(wish, None)?;
        let taken = self.here.taken;
        self.kept.retain(|place| place.taken <= taken);
        Ok(())
    }

    fn keep(&mut self) {
        let taken = self.here.taken;
        if !taken.is_multiple_of(self.spacing) || self.kept.last().is_some_and(|last| last.taken >= taken) {
            return;
        }
        self.kept.push(self.here.clone());
        if self.kept.len() > self.kept_max {
            self.spacing *= 2;
            let spacing = self.spacing;
            self.kept.retain(|place| place.taken.is_multiple_of(spacing));
        }
    }

    fn is_behind(&self, goal: Goal) -> bool {
        match goal {
            Goal::Time(time) => self.here.time.is_some_and(|here| time < here),
            Goal::Taken(taken) => taken < self.here.taken,
        }
    }

    /// Whether going on leads no nearer: we are there, or past it, or at the end.
    pub fn is_at(&mut self, goal: Goal) -> bool {
        match goal {
            Goal::Time(time) => self.next_time().is_none_or(|next| next > time),
            Goal::Taken(taken) => self.here.taken >= taken || self.next_time().is_none(),
        }
    }

    /// Goes to the kept place from which the goal is nearest, where that is better than going on from here.
    pub fn leap(&mut self, goal: Goal) -> io::Result<()> {
        let before = |place: &&Place| match goal {
            Goal::Time(time) => place.time.is_none_or(|at| at <= time),
            Goal::Taken(taken) => place.taken <= taken,
        };
        let nearest = self.kept.iter().rev().find(before).unwrap_or(&self.kept[0]);
        if !self.is_behind(goal) && nearest.taken <= self.here.taken {
            return Ok(());
        }
        let already = if nearest.taken < self.here.taken {
            let frames = self.recording.open(&self.channels)?;
            (self.monitor, self.frames) = (frames.monitor().clone(), frames.peekable());
            0
        } else {
            self.here.taken
        };
        self.here = nearest.clone();
        self.frames.by_ref().take(self.here.taken - already).for_each(drop);
        Ok(())
    }
}

#[cfg(test)]
pub(super) mod tests {
    use std::{fmt::Write, fs, path::PathBuf};

    use chrono::TimeDelta;

    use super::*;
    use crate::{config::Config, feed::Holder};

    const START: &str = "2031-03-14T05:00:00Z";

    /// A thousand frames, two seconds apart, of one slowly loaded circuit pair that is switched now and then.
    fn recorded() -> String {
        let start: DateTime<Utc> = START.parse().unwrap();
        (0..1000).fold(String::new(), |mut lines, second| {
            let time = (start + TimeDelta::seconds(2 * second)).to_rfc3339();
            let closed = u8::from(second % 300 > 20);
            let mw = 300.0 + 0.3 * second as f64;
            let _ = writeln!(
                lines,
                r#"{{"time":"{time}","values":{{"Skarn.kv":404.0,"Velm.kv":400.5,"A.closed":{closed},"A.from.mw":{},"B.from.mw":{mw}}}}}"#,
                mw * f64::from(closed),
            );
            lines
        })
    }

    pub fn player(name: &str) -> (Player, PathBuf) {
        let config = Config::parse(
            r#"
            [grid]
            frequency_hz = 50
            [[corridor]]
            name = "Skarn-Velm"
            from = { bus = "Skarn", nominal_kv = 400, source = { r_ohm = 1.5, x_ohm = 22.0, spread = 0.3 } }
            to = { bus = "Velm", nominal_kv = 400, source = { r_ohm = 1.0, x_ohm = 14.0, spread = 0.3 } }
            circuit = [
                { name = "A", r_ohm = 7.0, x_ohm = 75.0, b_us = 880 },
                { name = "B", r_ohm = 7.0, x_ohm = 75.0, b_us = 880 },
            ]
            "#,
            "test.toml",
        )
        .unwrap();
        let path = std::env::temp_dir().join(format!("tautline-{}-{name}.jsonl", std::process::id()));
        fs::write(&path, recorded()).unwrap();
        let channels = Arc::new(Channels::new(&config));
        let holder = Holder::new(&channels, TimeDelta::seconds(10));
        let desk = Desk::detailed(&config, &channels);
        (Player::new(Recording::Files(vec![path.clone()]), channels, holder, desk, Board::new(&config)).unwrap(), path)
    }

    fn go(player: &mut Player, goal: Goal) {
        player.leap(goal).unwrap();
        while !player.is_at(goal) {
            player.step();
        }
    }

    /// Everything that can be seen of a place.
    fn seen(player: &Player) -> String {
        let here = player.here();
        let tracks: Vec<_> = here.chronicle.tracks.iter().map(|track| format!("{track:?}")).collect();
        format!("{} {:?} {tracks:?} {:?} {:?}", here.taken, here.time, here.chronicle.events, here.alarms)
    }

    #[test]
    fn every_way_to_a_place_leads_to_the_same() {
        let (mut straight, path) = player("straight");
        go(&mut straight, Goal::Taken(700));
        assert!(straight.here().chronicle.events.len() > 2, "the frames should tell of switching");
        let expected = seen(&straight);

        let (mut astray, other) = player("astray");
        let at = straight.here().time.unwrap();
        let between = at + TimeDelta::milliseconds(500);
        for detour in [Goal::Taken(999), Goal::Taken(10), Goal::Taken(703), Goal::Time(START.parse().unwrap())] {
            for goal in [Goal::Taken(700), Goal::Time(at), Goal::Time(between)] {
                go(&mut astray, detour);
                go(&mut astray, goal);
                assert_eq!(seen(&astray), expected, "by way of {detour:?} to {goal:?}");
            }
        }
        for path in [path, other] {
            fs::remove_file(path).unwrap();
        }
    }

    #[test]
    fn it_stays_within_the_recording_and_keeps_few_places() {
        let (mut player, path) = player("within");
        go(&mut player, Goal::Time("2040-01-01T00:00:00Z".parse().unwrap()));
        assert_eq!(player.here().taken, 1000);
        assert!(!player.step());
        go(&mut player, Goal::Time("2000-01-01T00:00:00Z".parse().unwrap()));
        assert_eq!(player.here().taken, 0);
        player.kept_max = 2;
        player.spacing = 16;
        player.kept.truncate(1);
        go(&mut player, Goal::Taken(1000));
        assert!(player.kept.len() <= 3, "{}", player.kept.len());
        assert_eq!(player.kept[0].taken, 0);
        fs::remove_file(path).unwrap();
    }
}
