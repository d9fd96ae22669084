//! A review for other programs: one JSON object with everything that is known.

use std::{
    collections::BTreeMap,
    io::{self, Write},
};

use chrono::{DateTime, NaiveDate, SecondsFormat, Utc};
use serde::{Serialize, Serializer};

use super::{
    Paper,
    compare::{HELD_PCT, STATES},
    definitions::DEFINITIONS,
};
use crate::{
    desk::{Criterion, State},
    events::Event,
    report::CAUTION,
    review::{AlarmCount, Beginning, Brief, Course, FileNote, Least, MeterNote, SourceNote, Tallied},
};

#[derive(Serialize)]
struct Whole<'a> {
    program: &'static str,
    caution: &'static str,
    definitions: BTreeMap<&'static str, &'static str>,
    time_zone: &'static str,
    what_if: &'a [String],
    first: Option<Time>,
    last: Option<Time>,
    frames: u64,
    data_minutes: f64,
    without_data_minutes: f64,
    availability: Option<f64>,
    files: &'a [FileNote],
    findings: Vec<Finding<'a>>,
    corridors: Vec<OneCorridor<'a>>,
    days: Vec<OneDay<'a>>,
    events: &'a [Event],
    events_left_out: u64,
}

#[derive(Serialize)]
struct Finding<'a> {
    date: NaiveDate,
    text: &'a str,
}

#[derive(Serialize)]
struct OneCorridor<'a> {
    corridor: &'a str,
    from: Option<&'a str>,
    to: Option<&'a str>,
    thin_mw: Option<f64>,
    was: OneCourse<'a>,
    would_have_been: Option<OneCourse<'a>>,
    sources: Option<Sources<'a>>,
    meters: Vec<Meter<'a>>,
}

#[derive(Serialize)]
struct Sources<'a> {
    first: &'a [SourceNote; 2],
    last: &'a [SourceNote; 2],
}

#[derive(Serialize)]
struct Meter<'a> {
    channel: &'a str,
    missing_minutes: f64,
    set_aside_minutes: f64,
}

#[derive(Serialize)]
struct OneCourse<'a> {
    frames: u64,
    minutes: BTreeMap<&'static str, f64>,
    /// Known state, as part of the time.
    availability: Option<f64>,
    transfer_low_mw: Option<f64>,
    transfer_mean_mw: Option<f64>,
    transfer_high_mw: Option<f64>,
    energy_mwh: f64,
    without_balance: Option<WithoutBalance>,
    least_headroom: Option<&'a Least>,
    set_by: Vec<SetBy<'a>>,
    headroom_held_mw: Vec<Held>,
    duration_curve: Vec<AtLeast>,
    alarms: &'a [AlarmCount],
    slot_s: i64,
    course: Vec<OneSlot>,
}

#[derive(Serialize)]
struct WithoutBalance {
    first: Time,
    minutes: f64,
}

#[derive(Serialize)]
struct SetBy<'a> {
    outage: Option<&'a str>,
    criterion: Criterion,
    minutes: f64,
    share: f64,
}

#[derive(Serialize)]
struct Held {
    share: f64,
    headroom_mw: Option<i32>,
}

#[derive(Serialize)]
struct AtLeast {
    headroom_mw: i32,
    share: f64,
}

#[derive(Serialize)]
struct OneSlot {
    time: Option<Time>,
    state: State,
    transfer_low_mw: Option<f64>,
    transfer_high_mw: Option<f64>,
    headroom_low_mw: Option<f64>,
    headroom_high_mw: Option<f64>,
}

#[derive(Serialize)]
struct OneDay<'a> {
    date: NaiveDate,
    beginning: Beginning,
    frames: u64,
    data_minutes: f64,
    corridors: Vec<CorridorsDay<'a>>,
}

#[derive(Serialize)]
struct CorridorsDay<'a> {
    corridor: &'a str,
    was: InBrief<'a>,
    would_have_been: Option<InBrief<'a>>,
}

#[derive(Serialize)]
struct InBrief<'a> {
    minutes: BTreeMap<&'static str, f64>,
    minutes_without_balance: f64,
    transfer_low_mw: Option<f64>,
    transfer_mean_mw: Option<f64>,
    transfer_high_mw: Option<f64>,
    least_headroom: Option<&'a Least>,
    headroom_held_mw: [Held; 2],
    alarms: u64,
}

struct Time(DateTime<Utc>);

impl Serialize for Time {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(&self.0.to_rfc3339_opts(SecondsFormat::AutoSi, true))
    }
}

/// Writes it, on one line.
pub fn write(paper: &Paper, mut to: impl Write) -> io::Result<()> {
    let review = paper.review;
    let whole = Whole {
        program: concat!("tautline ", env!("CARGO_PKG_VERSION")),
        caution: CAUTION,
        definitions: DEFINITIONS.into_iter().collect(),
        time_zone: paper.zone.name(),
        what_if: paper.changes,
        first: review.span.map(|(first, _)| Time(first)),
        last: review.span.map(|(_, last)| Time(last)),
        frames: review.frames,
        data_minutes: minutes(review.covered_ms),
        without_data_minutes: minutes(review.silent_ms),
        availability: review.availability(),
        files: &review.files,
        findings: review.findings.iter().map(|(date, text)| Finding { date: *date, text }).collect(),
        corridors: corridors(paper),
        days: days(paper),
        events: &review.events,
        events_left_out: review.events_left_out,
    };
    serde_json::to_writer(&mut to, &whole)?;
    to.write_all(b"\n")
}

fn corridors<'a>(paper: &Paper<'a>) -> Vec<OneCorridor<'a>> {
    let one = |corridor: &'a crate::review::CorridorReview| {
        let configured = paper.configured(corridor);
        let bus = |bus: usize| configured.map(|known| &*known.buses[bus].name);
        let meter = |(channel, note): (&'a std::sync::Arc<str>, &MeterNote)| Meter {
            channel,
            missing_minutes: minutes(note.missing_ms),
            set_aside_minutes: minutes(note.suspect_ms),
        };
        OneCorridor {
            corridor: &corridor.corridor,
            from: bus(0),
            to: bus(1),
            thin_mw: configured.map(|known| known.thin_mw),
            was: course(paper, &corridor.was),
            would_have_been: corridor.what_if.as_ref().map(|what_if| course(paper, what_if)),
            sources: corridor.sources.as_ref().map(|[first, last]| Sources { first, last }),
            meters: corridor.meters.iter().map(meter).collect(),
        }
    };
    paper.review.corridors.iter().map(one).collect()
}

fn course<'a>(paper: &Paper, course: &'a Course) -> OneCourse<'a> {
    let known_ms = course.state_ms.total_ms() - course.state_ms.ms(&State::Blind);
    let total_ms = course.durations.total_ms().max(1) as f64;
    let shares = course.binding_ms.shares().into_iter();
    let slots = course.series.slots.iter();
    OneCourse {
        frames: course.frames,
        minutes: minutes_by_state(&course.state_ms),
        availability: paper.review.part(known_ms),
        transfer_low_mw: course.transfer_mw.map(|[low, _]| low),
        transfer_mean_mw: course.mean_transfer_mw(),
        transfer_high_mw: course.transfer_mw.map(|[_, high]| high),
        energy_mwh: course.energy_mwh,
        without_balance: course
            .unbalanced
            .map(|unbalanced| WithoutBalance { first: Time(unbalanced.first), minutes: minutes(unbalanced.ms) }),
        least_headroom: course.lowest(),
        set_by: shares
            .map(|share| SetBy {
                outage: share.of.outage.as_deref(),
                criterion: share.of.criterion,
                minutes: minutes(share.ms),
                share: share.part,
            })
            .collect(),
        headroom_held_mw: HELD_PCT.map(|pct| held(f64::from(pct) / 100.0, course)).into(),
        duration_curve: course
            .durations
            .curve()
            .map(|(headroom_mw, ms)| AtLeast { headroom_mw, share: ms as f64 / total_ms })
            .collect(),
        alarms: &course.alarms,
        slot_s: course.series.slot_s,
        course: slots
            .map(|slot| OneSlot {
                time: DateTime::from_timestamp(slot.at_s, 0).map(Time),
                state: slot.state,
                transfer_low_mw: slot.transfer_mw.map(|[low, _]| low),
                transfer_high_mw: slot.transfer_mw.map(|[_, high]| high),
                headroom_low_mw: slot.headroom_mw.map(|[low, _]| low),
                headroom_high_mw: slot.headroom_mw.map(|[_, high]| high),
            })
            .collect(),
    }
}

fn days<'a>(paper: &Paper<'a>) -> Vec<OneDay<'a>> {
    let one = |day: &'a crate::review::DayFigures| OneDay {
        date: day.date,
        beginning: day.beginning,
        frames: day.frames,
        data_minutes: minutes(day.covered_ms),
        corridors: paper
            .review
            .corridors
            .iter()
            .zip(&day.corridors)
            .map(|(corridor, (was, would))| CorridorsDay {
                corridor: &corridor.corridor,
                was: brief(was),
                would_have_been: would.as_ref().map(brief),
            })
            .collect(),
    };
    paper.review.days.iter().map(one).collect()
}

fn brief(brief: &Brief) -> InBrief<'_> {
    let [median, mostly] = brief.held_mw;
    InBrief {
        minutes: minutes_by_state(&brief.state_ms),
        minutes_without_balance: minutes(brief.unbalanced_ms),
        transfer_low_mw: brief.transfer_mw.map(|[low, _]| low),
        transfer_mean_mw: brief.mean_transfer_mw,
        transfer_high_mw: brief.transfer_mw.map(|[_, high]| high),
        least_headroom: brief.least.as_ref(),
        headroom_held_mw: [Held { share: 0.5, headroom_mw: median }, Held { share: 0.95, headroom_mw: mostly }],
        alarms: brief.alarms,
    }
}

fn held(share: f64, course: &Course) -> Held {
    Held { share, headroom_mw: course.held_for(share) }
}

fn minutes_by_state(state_ms: &Tallied<State>) -> BTreeMap<&'static str, f64> {
    STATES.into_iter().map(|state| (state.word(), minutes(state_ms.ms(&state)))).collect()
}

fn minutes(ms: i64) -> f64 {
    ms as f64 / 60_000.0
}
