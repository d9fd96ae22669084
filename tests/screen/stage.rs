//! Sets up a screen with made-up corridors and draws it on a terminal that is only a buffer.

use std::{sync::Arc, time::Instant};

use chrono::TimeDelta;
use chrono_tz::Tz;
use crossterm::event::{KeyCode, KeyEvent, KeyModifiers};
use ratatui::{Terminal, backend::TestBackend, buffer::Buffer};
use tautline::{
    alarm::{Board, CorridorBoard, Definition, Kind, Priority, built_in},
    desk::{Assessment, State},
    events::EventKind,
    screen::{
        connection::{
            AlarmReport, Alarms, FeedReport, InputReport, Mark, MarkReport, Order, Origin, Parcel, Playback, Scene,
        },
        state::{App, Chronicle, Moment, MomentKind, Strip, Survey},
        view::{self, Theme},
    },
};

use super::sample;

#[allow(clippy::needless_pass_by_value, reason = "reads better where it is called")]
/// A screen that watches these corridors live; each frame is ten minutes of them, then as given.
pub fn live(assessments: Vec<Assessment>) -> App {
    let names: Vec<_> = assessments.iter().map(|assessment| &*assessment.corridor).collect();
    let mut app = App::new(sample::grid(&names), Tz::UTC, TimeDelta::seconds(10));
    let (chronicle, alarms) = played(&app, &assessments);
    let alarms = AlarmReport { alarms, ..AlarmReport::default() };
    app.receive(Parcel { chronicle, alarms, scene: Scene::default(), feed: feed(), origin: Origin::Live });
    app.clock = Instant::now();
    app
}

/// A screen that replays the same.
pub fn replay(assessments: Vec<Assessment>) -> App {
    let mut app = live(assessments);
    let parcel = app.parcel.as_mut().unwrap();
    parcel.origin = Origin::Replay(Playback {
        playing: true,
        speed: 60,
        now: parcel.chronicle.time(),
        taken: 3600,
        seeking: None,
        at_end: false,
        survey: Arc::new(survey(&parcel.chronicle)),
        marks: MarkReport {
            marks: Arc::new(vec![mark(5400, "before the works at Velm"), mark(40_000, "")]),
            place: "in days/day.marks.json".into(),
            ..MarkReport::default()
        },
    });
    app
}

pub fn mark(second: i64, note: &str) -> Mark {
    Mark { time: sample::time(second), corridor: Some("Skarn-Velm".into()), note: note.into() }
}

/// A day of which three quarters are gone through: abnormal for ten minutes of every forty, with a moment of each kind.
fn survey(chronicle: &Chronicle) -> Survey {
    let (mut worst, mut states) = (Strip::default(), Vec::new());
    states.resize_with(chronicle.tracks.len(), Strip::default);
    for minute in 0..=18 * 60 {
        let time = sample::time(60 * minute);
        for (strip, track) in states.iter_mut().zip(&chronicle.tracks) {
            let state = if minute % 40 < 30 { State::Ample } else { track.latest.state };
            strip.take(time, state);
            worst.take(time, state);
        }
    }
    let mut survey = Survey::default();
    survey.extent = Some((sample::time(0), sample::time(86_400)));
    survey.until = Some(sample::time(64_800));
    (survey.worst, survey.states) = (worst, states);
    let (low, of_day) = (|headroom_mw, of_day| MomentKind::Low { headroom_mw, of_day }, true);
    for (second, corridor, kind, text) in [
        (1800, Some("Skarn-Velm"), MomentKind::Event(EventKind::Trip), "SV3 opened"),
        (1800, Some("Skarn-Velm"), MomentKind::Raised(Priority::High), "headroom thin (high): alarm, 80.0"),
        (2700, Some("Skarn-Velm"), MomentKind::Event(EventKind::Return), "SV3 closed"),
        (3000, Some("Skarn-Velm"), MomentKind::Event(EventKind::Alarm), "headroom thin (high): return to normal"),
        (12_000, Some("Orrin-Tesk"), low(-40.0, of_day), "lowest of the day: −40 ±36 MW (SV2 out, angle)"),
        (14_000, Some("Skarn-Velm"), low(20.0, of_day), "lowest of the day: +20 ±36 MW (SV2 out, angle)"),
        (20_000, Some("Skarn-Velm"), low(60.0, !of_day), "lowest of this dip: +60 ±36 MW (SV2 out, angle)"),
        (30_000, None, MomentKind::Event(EventKind::Gap), "no frame for 3 min"),
        (33_000, Some("Orrin-Tesk"), MomentKind::Event(EventKind::Bypass), "SV2-SC bypassed"),
        (36_000, Some("Orrin-Tesk"), MomentKind::Event(EventKind::Insertion), "SV2-SC inserted"),
        (50_000, Some("Hald-Brenn"), MomentKind::Event(EventKind::Meter), "Velm.kv is missing"),
        (60_000, Some("Skarn-Velm"), MomentKind::Event(EventKind::Step), "step: Velm moved by −12.4 kV (99 %)"),
    ] {
        let (time, corridor, text) = (sample::time(second), corridor.map(Into::into), text.into());
        survey.add(Moment { time, corridor, kind, state: None, text });
    }
    survey
}

const HISTORY_S: i64 = 7200;

fn played(app: &App, assessments: &[Assessment]) -> (Chronicle, Alarms) {
    let mut chronicle = Chronicle::default();
    // A frame a minute would be silence.
    let heard = |definition: &Definition| definition.kind != Kind::DataAge;
    let definitions = |corridor| built_in(corridor).into_iter().filter(heard).collect::<Vec<_>>();
    let corridors = app.grid.corridors.iter().map(|corridor| CorridorBoard::new(corridor, &definitions(corridor)));
    let mut alarms = Alarms::new(Board { corridors: corridors.collect() });
    for minute in 0..=HISTORY_S / 60 {
        let fade = (HISTORY_S / 60 - minute) as f64;
        let mut frame = assessments.to_vec();
        for assessment in &mut frame {
            assessment.time = sample::time(60 * minute);
            if let Some(headroom) = &mut assessment.headroom_mw {
                *headroom += 4.0 * fade + 15.0 * (fade / 9.0).sin();
                if minute < HISTORY_S / 60 {
                    assessment.state = tautline::desk::State::Ample;
                }
            }
        }
        alarms.observe(&frame);
        chronicle.take(frame);
    }
    (chronicle, alarms)
}

fn feed() -> FeedReport {
    FeedReport {
        inputs: vec![InputReport {
            name: "tcp://127.0.0.1:4711".into(),
            standing: "reading, 7200 frames".into(),
            findings: vec!["3 malformed lines skipped".into()],
        }],
        recorded: None,
        unrecorded: None,
        kept: Some(InputReport {
            name: "grid.learned.json".into(),
            standing: "written 06:58:20 UTC".into(),
            findings: Vec::new(),
        }),
        frames: 7200,
        arrived: Some(Instant::now()),
        ended: false,
    }
}

/// Draws, and lets the state know what the drawing found out.
pub fn draw(app: &mut App, width: u16, height: u16, colour: bool) -> Buffer {
    app.size = ratatui::layout::Size::new(width, height);
    let mut terminal = Terminal::new(TestBackend::new(width, height)).unwrap();
    let mut drawn = None;
    terminal.draw(|frame| drawn = Some(view::draw(frame, app, Theme { colour }))).unwrap();
    app.drawn = drawn.unwrap();
    terminal.backend().buffer().clone()
}

/// The text of a drawing, line by line.
pub fn text(buffer: &Buffer) -> String {
    let width = usize::from(buffer.area.width.max(1));
    let lines = buffer.content.chunks(width).map(|line| {
        let mut text = String::new();
        let mut covered = 0;
        for cell in line {
            if covered > 0 {
                covered -= 1;
                continue;
            }
            text += cell.symbol();
            covered = unicode_width::UnicodeWidthStr::width(cell.symbol()).saturating_sub(1);
        }
        text.trim_end().to_string()
    });
    lines.collect::<Vec<_>>().join("\n")
}

/// Presses keys: words as they are typed, names in angle brackets.
pub fn press(app: &mut App, keys: &str) -> Vec<Order> {
    let mut orders = Vec::new();
    for key in keys.split(' ') {
        let code = match key {
            "<space>" => KeyCode::Char(' '),
            "<enter>" => KeyCode::Enter,
            "<esc>" => KeyCode::Esc,
            "<tab>" => KeyCode::Tab,
            "<back-tab>" => KeyCode::BackTab,
            "<up>" => KeyCode::Up,
            "<down>" => KeyCode::Down,
            "<left>" => KeyCode::Left,
            "<right>" => KeyCode::Right,
            "<home>" => KeyCode::Home,
            "<end>" => KeyCode::End,
            "<page-up>" => KeyCode::PageUp,
            "<page-down>" => KeyCode::PageDown,
            "<delete>" => KeyCode::Delete,
            "<backspace>" => KeyCode::Backspace,
            word => {
                for char in word.chars() {
                    orders.extend(app.key(KeyEvent::new(KeyCode::Char(char), KeyModifiers::NONE)));
                }
                continue;
            }
        };
        orders.extend(app.key(KeyEvent::new(code, KeyModifiers::NONE)));
    }
    orders
}
