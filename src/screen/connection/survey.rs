//! Goes through a whole recording once, beside the screen, for its time bar, its events and its minima.

use std::{
    sync::Arc,
    thread,
    time::{Duration, Instant},
};

use chrono::{DateTime, NaiveDate, TimeDelta, Utc};
use chrono_tz::Tz;
use tokio::sync::watch;

use super::{Beginning, Recording};
use crate::{
    alarm::{Board, Transition},
    desk::{Assessment, Desk, State},
    events::{Event, Teller, gap, reason},
    feed::{Channels, Holder},
    screen::state::{Moment, MomentKind, Survey},
};

/// Partial results go out so far apart,
const PARTS_APART: Duration = Duration::from_millis(200);
/// and are thought of after so many frames.
const FRAMES_BETWEEN: usize = 32;
/// Two dips of the headroom with less than this between them are one.
const DIPS_APART: TimeDelta = TimeDelta::minutes(10);
/// The survey gives way to whatever else wants the processor.
#[cfg(target_os = "linux")]
const NICE: i32 = 10;

/// What goes through a recording.
pub struct Surveyor {
    recording: Recording,
    channels: Arc<Channels>,
    desk: Desk,
    holder: Holder,
    board: Board,
    max_age: TimeDelta,
    zone: Tz,
    tellers: Vec<Teller>,
    dips: Vec<Dips>,
    survey: Survey,
    last: Option<DateTime<Utc>>,
}

impl Surveyor {
    /// At the beginning of a recording; days are those of a zone.
    pub fn new(beginning: Beginning, max_age: TimeDelta, zone: Tz) -> Self {
        let Beginning { recording, channels, desk, holder, board } = beginning;
        Self {
            recording,
            channels,
            desk: desk.plain(),
            holder,
            board,
            max_age,
            zone,
            tellers: Vec::new(),
            dips: Vec::new(),
            survey: Survey::default(),
            last: None,
        }
    }

    /// Goes through it on a thread of its own, which ends when nobody wants to know any more.
    pub fn start(self) -> watch::Receiver<Arc<Survey>> {
        let (sender, receiver) = watch::channel(Arc::default());
        thread::spawn(move || {
            // On Linux this is about the thread alone. Where it is refused, the survey is only less polite.
            #[cfg(target_os = "linux")]
            let _refused = rustix::process::setpriority_process(None, NICE);
            self.run(&sender);
        });
        receiver
    }

    fn run(mut self, sender: &watch::Sender<Arc<Survey>>) {
        if let Err(error) = self.go_through(sender) {
            self.survey.trouble = Some(error.to_string().into());
        }
        self.survey.ended = true;
        let _nobody_is_there = sender.send(Arc::new(self.finished()));
    }

    fn go_through(&mut self, sender: &watch::Sender<Arc<Survey>>) -> std::io::Result<()> {
        self.survey.extent = self.recording.extent(&self.channels, || sender.is_closed())?;
        let mut sent: Option<Instant> = None;
        for (count, frame) in self.recording.open(&self.channels)?.enumerate() {
            if count.is_multiple_of(FRAMES_BETWEEN) && sent.is_none_or(|sent| sent.elapsed() > PARTS_APART) {
                if sender.send(Arc::new(self.finished())).is_err() {
                    break;
                }
                sent = Some(Instant::now());
            }
            if let Some(gap) = self.last.and_then(|last| gap(last, frame.time, self.max_age)) {
                self.survey.add(gap.into());
            }
            self.last = Some(frame.time);
            self.survey.until = Some(frame.time);
            if let Some(snapshot) = self.holder.take(&frame) {
                let assessments = self.desk.assess(&snapshot);
                self.take(&assessments);
                let mut transitions = snapshot.aside.as_deref().map_or(Vec::new(), |aside| self.board.take_up(aside));
                transitions.extend(self.board.observe(&assessments));
                self.tell(&transitions);
            }
        }
        Ok(())
    }

    fn take(&mut self, assessments: &[Assessment]) {
        let survey = &mut self.survey;
        survey.states.resize_with(assessments.len(), Default::default);
        for (index, assessment) in assessments.iter().enumerate() {
            if index == self.tellers.len() {
                if assessment.state != State::Ample {
                    survey.add(Event::first(assessment).into());
                }
                self.tellers.push(Teller::new(assessment));
                self.dips.push(Dips::default());
            }
            self.tellers[index].take(assessment).into_iter().for_each(|event| survey.add(event.into()));
            self.dips[index].take(assessment, self.zone).into_iter().for_each(|low| survey.add(low));
            survey.states[index].take(assessment.time, assessment.state);
        }
        if let Some(worst) = assessments.iter().max_by_key(|assessment| assessment.state.severity()) {
            survey.worst.take(worst.time, worst.state);
        }
    }

    fn tell(&mut self, transitions: &[Transition]) {
        for transition in transitions {
            let mut moment = Moment::from(Event::of_alarm(transition));
            if transition.is_annunciated() {
                moment.kind = MomentKind::Raised(transition.priority);
            }
            self.survey.add(moment);
        }
    }

    /// As far as it is, with the lows that may still become lower.
    fn finished(&self) -> Survey {
        let mut survey = self.survey.clone();
        self.dips.iter().flat_map(Dips::open).for_each(|low| survey.add(low));
        survey
    }
}

/// Finds where the headroom of one corridor was at its lowest: once for each stretch in which it was thin or spent, and
/// once for each day.
#[derive(Debug, Default)]
struct Dips {
    stretch: Option<Stretch>,
    day: Option<(NaiveDate, Low)>,
}

#[derive(Debug)]
struct Stretch {
    low: Low,
    last: DateTime<Utc>,
}

#[derive(Debug, Clone)]
struct Low {
    headroom_mw: f64,
    moment: Moment,
}

impl Dips {
    /// Takes an assessment in; what is lowest for good.
    fn take(&mut self, assessment: &Assessment, zone: Tz) -> Vec<Moment> {
        let mut found = Vec::new();
        let Some(headroom_mw) = assessment.headroom_mw else { return found };
        let time = assessment.time;
        if let Some(stretch) = self.stretch.take_if(|stretch| time - stretch.last > DIPS_APART) {
            found.push(stretch.low.moment);
        }
        let date = time.with_timezone(&zone).date_naive();
        if let Some((_, low)) = self.day.take_if(|(day, _)| *day != date) {
            found.push(low.moment);
        }
        let low = |of_day, words: &str| Low {
            headroom_mw,
            moment: Moment {
                time,
                corridor: Some(assessment.corridor.clone()),
                kind: MomentKind::Low { headroom_mw, of_day },
                state: Some(assessment.state),
                text: format!("{words}{}", reason(assessment)),
            },
        };
        let is_lower = |low: Option<&Low>| low.is_none_or(|low| headroom_mw < low.headroom_mw);
        if is_lower(self.day.as_ref().map(|(_, low)| low)) {
            self.day = Some((date, low(true, "lowest of the day")));
        }
        if matches!(assessment.state, State::Thin | State::Spent) {
            match &mut self.stretch {
                Some(stretch) => {
                    stretch.last = time;
                    if is_lower(Some(&stretch.low)) {
                        stretch.low = low(false, "lowest of this dip");
                    }
                }
                None => self.stretch = Some(Stretch { low: low(false, "lowest of this dip"), last: time }),
            }
        }
        found
    }

    /// Those that are lowest so far.
    fn open(&self) -> impl Iterator<Item = Moment> {
        let stretch = self.stretch.as_ref().map(|stretch| stretch.low.moment.clone());
        stretch.into_iter().chain(self.day.iter().map(|(_, low)| low.moment.clone()))
    }
}

#[cfg(test)]
mod tests {
    use std::fs;

    use futures::executor::block_on;

    use super::*;
    use crate::{
        events::EventKind,
        screen::{connection::player::tests::player, state::sample},
    };

    #[test]
    fn it_finds_what_playing_through_would_find() {
        let (mut player, path) = player("survey");
        let mut survey = Surveyor::new(player.beginning(), TimeDelta::seconds(10), Tz::UTC).start();
        let survey = block_on(survey.wait_for(|survey| survey.ended)).unwrap().clone();
        let first = player.next_time().unwrap();
        while player.step() {}
        let here = player.here();
        assert_eq!(survey.extent, Some((first, here.time.unwrap())));
        assert!(survey.until == here.time && survey.trouble.is_none());
        let told: Vec<_> = here.chronicle.events.iter().cloned().map(Moment::from).collect();
        let is_told = |moment: &&Arc<Moment>| {
            !matches!(moment.kind, MomentKind::Raised(_) | MomentKind::Low { .. })
                && !matches!(moment.kind, MomentKind::Event(EventKind::Alarm | EventKind::Step))
        };
        assert_eq!(survey.moments.iter().filter(is_told).map(|moment| Moment::clone(moment)).collect::<Vec<_>>(), told);
        assert!(told.len() > 5, "the frames should tell of switching");
        let raised = survey.moments.iter().filter(|moment| matches!(moment.kind, MomentKind::Raised(_))).count();
        assert_eq!(raised as u64, here.alarms.raised.iter().sum::<u64>());
        assert_eq!(survey.states, [here.chronicle.tracks[0].strip.clone()]);
        let lowest = survey.moments.iter().find(|moment| matches!(moment.kind, MomentKind::Low { of_day: true, .. }));
        assert!(lowest.is_some_and(|lowest| lowest.text.starts_with("lowest of the day: ")), "{lowest:?}");
        fs::remove_file(path).unwrap();
    }

    #[test]
    fn it_ends_when_nobody_wants_to_know() {
        let (player, path) = player("survey-left");
        let mut surveyor = Surveyor::new(player.beginning(), TimeDelta::seconds(10), Tz::UTC);
        let (sender, _) = watch::channel(Arc::default());
        surveyor.go_through(&sender).unwrap();
        assert_eq!((surveyor.survey.extent, surveyor.survey.until), (None, None));
        fs::remove_file(path).unwrap();
    }

    #[test]
    fn what_cannot_be_read_is_told() {
        let (player, path) = player("survey-gone");
        fs::remove_file(path).unwrap();
        let mut survey = Surveyor::new(player.beginning(), TimeDelta::seconds(10), Tz::UTC).start();
        let survey = block_on(survey.wait_for(|survey| survey.ended)).unwrap().clone();
        assert!(survey.trouble.is_some() && survey.moments.is_empty());
    }

    /// Seconds into the sample day at which the headroom of a course is lowest, and whether of the day.
    fn lows(seconds: i64, course: impl Fn(i64) -> f64) -> Vec<(i64, bool)> {
        let (mut dips, mut survey) = (Dips::default(), Survey::default());
        for second in (0..seconds).step_by(10) {
            dips.take(&sample::at(second, course(second)), Tz::UTC).into_iter().for_each(|low| survey.add(low));
        }
        dips.open().for_each(|low| survey.add(low));
        let of_day = |low: &Moment| matches!(low.kind, MomentKind::Low { of_day: true, .. });
        survey.moments.iter().map(|low| ((low.time - sample::time(0)).num_seconds(), of_day(low))).collect()
    }

    /// A dip of a thousand seconds around a time.
    fn dip(second: i64, around: i64, lowest_mw: f64) -> Option<f64> {
        let away_s = (second - around).abs();
        (away_s < 500).then(|| lowest_mw + away_s as f64 / 100.0)
    }

    #[test]
    fn every_dip_has_one_lowest_point_and_every_day_one() {
        assert_eq!(lows(3600, |second| 300.0 - second as f64 / 100.0), [(3590, true)], "without a dip");
        let falling = |second| dip(second, 1500, 50.0).or(dip(second, 4500, 20.0)).unwrap_or(300.0);
        assert_eq!(lows(7200, falling), [(1500, false), (4500, true)]);
        let rising = |second| dip(second, 1500, 20.0).or(dip(second, 4500, 50.0)).unwrap_or(300.0);
        assert_eq!(lows(7200, rising), [(1500, true), (4500, false)]);
    }

    #[test]
    fn days_end_at_midnight_and_dips_do_not() {
        // The sample day begins at five in the morning.
        let midnight = 19 * 3600;
        let over_midnight = |second| dip(second, midnight - 100, 50.0).unwrap_or(300.0);
        assert_eq!(lows(midnight + 3600, over_midnight), [(midnight - 100, true), (midnight, true)]);
    }

    #[test]
    fn hovering_at_the_threshold_is_one_dip() {
        let deepest = |second| if second == 1800 { 20.0 } else { 0.0 };
        let hovering = |second: i64| 100.0 + 8.0 * (second as f64 * 0.05).sin() - deepest(second);
        assert_eq!(lows(3600, hovering), [(1800, true)]);
    }
}
