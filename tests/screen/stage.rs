//! Sets up a screen with made-up corridors and draws it on a terminal that is only a buffer.

use std::{sync::Arc, time::Instant};

use chrono::TimeDelta;
use chrono_tz::Tz;
use crossterm::event::{KeyCode, KeyEvent, KeyModifiers};
use ratatui::{Terminal, backend::TestBackend, buffer::Buffer};
use tautline::{
    alarm::{Board, CorridorBoard, Definition, Kind, built_in},
    desk::Assessment,
    screen::{
        connection::{AlarmReport, Alarms, FeedReport, InputReport, Order, Origin, Parcel, Playback, Scene},
        state::{App, Chronicle, Strip},
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
    let mut seen = Strip::default();
    for minute in 0..=HISTORY_S / 60 {
        let state = parcel.chronicle.worst().unwrap();
        seen.take(sample::time(60 * minute), if minute % 40 < 30 { tautline::desk::State::Ample } else { state });
    }
    parcel.origin = Origin::Replay(Playback {
        playing: true,
        speed: 60,
        now: parcel.chronicle.time(),
        extent: Some((sample::time(0), sample::time(86_400))),
        taken: 3600,
        seeking: None,
        at_end: false,
        seen: Arc::new(seen),
    });
    app
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
