//! The alarm page and the line of alarms: what keys ask for, and how it is drawn.

use std::sync::Arc;

use chrono::TimeDelta;
use ratatui::style::Color;
use tautline::{
    alarm::{Action, State},
    journal::Status,
    screen::{
        connection::{AlarmKey, Change, Order, Origin, Wish},
        state::{App, Page},
    },
};

use crate::{
    drawings::{SIZES, snapshot},
    sample,
    stage::{draw, live, press, replay, text},
};

/// Corridors in every state, on the alarm page.
fn app() -> App {
    opened(live(corridors()), "a")
}

fn corridors() -> Vec<tautline::desk::Assessment> {
    let mut thin = sample::thin();
    thin.corridor = "Lund-Marr".into();
    vec![sample::ample(), thin, sample::spent(), sample::blind()]
}

fn opened(mut app: App, keys: &str) -> App {
    draw(&mut app, 80, 24, true);
    for key in keys.split(' ') {
        press(&mut app, key);
        draw(&mut app, 80, 24, true);
    }
    app
}

/// Presses keys, does what they order as a connection would, and draws.
fn answered(mut app: App, keys: &str) -> App {
    for order in press(&mut app, keys) {
        answer(&mut app, &order);
    }
    draw(&mut app, 80, 24, true);
    app
}

fn answer(app: &mut App, order: &Order) {
    let Order::Alarm(order) = order else { return };
    let mut parcel = app.parcel.clone().unwrap();
    let outcome = parcel.alarms.alarms.obey(&order.wish, Some("nilsen"));
    (parcel.alarms.answered, parcel.alarms.refusal) = (order.number, outcome.err().map(|refusal| refusal.to_string()));
    app.receive(parcel);
}

fn chosen(app: &App) -> (AlarmKey, State) {
    let seen = &app.drawn.alarms[app.drawn.alarm_cursor];
    let state = app.alarm_report().unwrap().alarms.get(&seen.key).unwrap().standing.state;
    (seen.key.clone(), state)
}

fn wishes(app: &mut App, keys: &str) -> Vec<Wish> {
    let wish = |order| if let Order::Alarm(order) = order { Some(order.wish) } else { None };
    press(app, keys).into_iter().filter_map(wish).collect()
}

#[test]
fn keys_ask_for_what_they_should() {
    let first = chosen(&app()).0;
    let reason = || "switching at Velm".to_owned();
    let table: [(&str, Vec<Wish>); 8] = [
        (
            "z 30m <space> switching <space> at <space> Velm <enter>",
            vec![Wish::Shelve { key: first.clone(), span: TimeDelta::minutes(30), reason: reason() }],
        ),
        ("z 30m <enter>", vec![]),
        ("z 30m <space> x <esc>", vec![]),
        (
            "o switching <space> at <space> Velm <enter>",
            vec![Wish::Act(first.clone(), Action::RemoveFromService { reason: reason() })],
        ),
        ("n seen <space> before <enter>", vec![Wish::Note(first.clone(), "seen before".into())]),
        ("<tab>", vec![Wish::History(first.clone())]),
        ("u", vec![]),
        ("v", vec![]),
    ];
    for (keys, expected) in table {
        let mut app = app();
        assert_eq!(wishes(&mut app, keys), expected, "{keys}");
    }
}

#[test]
fn one_is_acknowledged_and_the_cursor_goes_on() {
    let app = app();
    let (first, state) = chosen(&app);
    assert_eq!(state, State::Unacknowledged);
    let app = answered(app, "y");
    assert_ne!(chosen(&app).0, first);
    let report = app.alarm_report().unwrap();
    assert_eq!(report.alarms.get(&first).unwrap().standing.state, State::Acknowledged);
    assert_eq!(report.alarms.log.back().unwrap().by.as_deref(), Some("nilsen"));
}

#[test]
fn all_in_sight_are_acknowledged_and_no_other() {
    let mut app = live((0..40).map(|place| sample::carrying(&format!("Corridor {place:02}"), 2290.0)).collect());
    app = opened(app, "a");
    let before = app.alarm_report().unwrap().alarms.board.summary().unacknowledged.iter().sum::<usize>();
    let in_sight = app.drawn.alarms.len();
    assert!(before > in_sight && in_sight > 5, "{before} {in_sight}");
    let app = answered(app, "Y");
    let after = app.alarm_report().unwrap().alarms.board.summary().unacknowledged.iter().sum::<usize>();
    assert_eq!(before - after, in_sight);
}

#[test]
fn shelved_and_out_of_service_come_back() {
    let key = chosen(&app()).0;
    for (keys, put_away) in [("z 30m <space> works <enter>", State::Shelved), ("o works <enter>", State::OutOfService)]
    {
        let app = answered(app(), keys);
        assert_eq!(chosen(&app), (key.clone(), put_away), "{keys}");
        assert!(text(&draw(&mut answered(app, "u"), 80, 24, true)).contains("UNACKNOWLEDGED"), "{keys}");
    }
}

#[test]
fn what_is_asked_for_is_not_shown_as_done() {
    let mut app = app();
    let orders = press(&mut app, "y k");
    let drawing = text(&draw(&mut app, 80, 24, true));
    assert!(drawing.contains("asked for, not done yet"), "{drawing}");
    answer(&mut app, &orders[0]);
    let mut parcel = app.parcel.clone().unwrap();
    parcel.alarms.journal =
        Some(Status { trouble: Some("database or disk is full".into()), waiting: 1, ..Status::default() });
    parcel.alarms.unwritten = Arc::new(app.drawn.alarms.iter().map(|seen| seen.key.clone()).collect());
    app.receive(parcel);
    let drawing = text(&draw(&mut app, 80, 24, true));
    assert!(drawing.contains("done, but not in the journal yet"), "{drawing}");
    assert!(drawing.contains("JOURNAL NOT WRITTEN: 1 wait"), "{drawing}");
}

#[test]
fn an_alarm_raised_anew_is_not_acknowledged_unseen() {
    let mut app = app();
    let orders = press(&mut app, "y");
    let Order::Alarm(order) = &orders[0] else { panic!("no order") };
    let Wish::Acknowledge(seen) = &order.wish else { panic!("no acknowledgement") };
    let mut older = seen.clone();
    older[0].raised = older[0].raised.map(|raised| raised - TimeDelta::minutes(5));
    let mut alarms = app.alarm_report().unwrap().alarms.clone();
    assert_eq!(alarms.obey(&Wish::Acknowledge(older), None), Ok(Vec::new()));
    assert_eq!(alarms.obey(&Wish::Acknowledge(seen.clone()), None).unwrap().len(), 1);
}

#[test]
fn enter_leads_to_the_corridor_and_in_a_replay_to_the_moment() {
    let mut watched = app();
    let key = chosen(&watched).0;
    assert_eq!(press(&mut watched, "<enter>"), []);
    assert_eq!(watched.page, Page::Corridor);
    assert_eq!(watched.corridor().unwrap().name, key.corridor);

    let mut replayed = opened(replay(corridors()), "a");
    let raised = replayed.drawn.alarms[0].raised.unwrap();
    assert_eq!(press(&mut replayed, "<enter>"), [Order::Seek(raised)]);
}

#[test]
fn the_filter_takes_names_states_and_priorities() {
    for (typed, fits) in [("orrin", "Orrin-Tesk"), ("urg", "urgent"), ("unack", "UNACKNOWLEDGED"), ("blind", "blind")] {
        let mut app = app();
        press(&mut app, &format!("/ {typed} <enter>"));
        let drawing = text(&draw(&mut app, 80, 24, true));
        let rows = app.alarm_rows().len();
        assert!(rows > 0, "{typed}");
        assert_eq!(drawing.lines().skip(3).take(rows).filter(|line| line.contains(fits)).count(), rows, "{drawing}");
    }
}

#[test]
fn only_chosen_priorities_ring_and_only_live() {
    for (origin_is_live, bell, rings) in [
        (true, vec![tautline::alarm::Priority::Urgent], true),
        (true, vec![tautline::alarm::Priority::Low], false),
        (false, vec![tautline::alarm::Priority::Urgent], false),
    ] {
        let mut app = if origin_is_live { live(corridors()) } else { replay(corridors()) };
        app.settings.bell = bell;
        assert!(!app.rings(), "nothing was raised since it was opened");
        let mut parcel = app.parcel.clone().unwrap();
        parcel.alarms.alarms.raised[3] += 1;
        app.receive(parcel.clone());
        assert_eq!(app.rings(), rings);
        app.receive(parcel);
        assert!(!app.rings(), "it rings once");
    }
}

#[test]
fn it_blinks_once_in_two_seconds_unless_told_not_to() {
    let mut app = app();
    let start = app.clock;
    let at = |app: &mut App, ms: u64| {
        app.clock = start + std::time::Duration::from_millis(ms);
        draw(app, 80, 24, true).content.into_iter().filter(|cell| cell.bg != Color::Reset).count()
    };
    let [lit, dark, again] = [0, 1000, 2000].map(|ms| at(&mut app, ms));
    assert!(lit > dark && lit == again, "{lit} {dark} {again}");
    assert!(app.ticks());
    app.settings.blink = false;
    assert_eq!(at(&mut app, 1000), lit);
}

#[test]
fn drawings() {
    snapshot("alarms", app());
    snapshot("alarms-replay", opened(replay(corridors()), "a j"));
    snapshot("alarms-history", answered(answered(answered(app(), "y k"), "n seen <space> before <enter>"), "<tab>"));
    snapshot("alarms-shelved", answered(app(), "z 30m <space> switching <enter>"));
    snapshot("alarms-none", opened(live(vec![sample::ample()]), "a"));
    let many = (0..500).map(|place| sample::carrying(&format!("Corridor {place:03}"), 2290.0));
    snapshot("alarms-many", opened(live(many.collect()), "a <page-down> j"));
}

#[test]
fn a_change_is_shown_and_applied_as_shown() {
    for (is_sound, lines, ordered) in [
        (true, vec!["Skarn-Velm: thin threshold, MW 100 → 150".to_owned()], vec![Order::Apply(7)]),
        (false, vec!["1 error in grid.toml".to_owned(), "grid.toml:4: thin_mw: must be a number".to_owned()], vec![]),
    ] {
        let mut app = live(corridors());
        let mut parcel = app.parcel.clone().unwrap();
        parcel.scene.change = Some(Arc::new(Change { number: 7, is_sound, lines }));
        app.receive(parcel);
        let mut app = opened(app, "c");
        assert_eq!(press(&mut app, "<enter>"), ordered);
        snapshot(if is_sound { "change" } else { "change-refused" }, opened(app, if is_sound { "c" } else { "j" }));
    }
}

#[test]
fn it_reads_without_colour() {
    let mut app = app();
    for (width, height) in SIZES {
        let buffer = draw(&mut app, width, height, false);
        assert!(buffer.content.iter().all(|cell| cell.fg == Color::Reset && cell.bg == Color::Reset));
        assert!(text(&buffer).contains("▲ UNACKNOWLEDGED urgent"), "{}", text(&buffer));
    }
}

#[test]
fn a_click_on_the_line_opens_the_page() {
    use crossterm::event::{KeyModifiers, MouseButton, MouseEvent, MouseEventKind};
    let mut app = live(corridors());
    draw(&mut app, 80, 24, true);
    let click = |app: &mut App, row| {
        let kind = MouseEventKind::Down(MouseButton::Left);
        let order = app.mouse(MouseEvent { kind, column: 10, row, modifiers: KeyModifiers::NONE });
        draw(app, 80, 24, true);
        order
    };
    click(&mut app, 1);
    assert_eq!(app.page, Page::Alarms);
    let second = app.drawn.alarms[1].key.clone();
    click(&mut app, 4);
    assert_eq!(app.alarms.chosen.as_ref(), Some(&second));
    click(&mut app, 4);
    assert_eq!(app.page, Page::Corridor);
    assert!(matches!(app.parcel.unwrap().origin, Origin::Live));
}
