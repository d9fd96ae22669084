//! A replay as an instrument: jumps, marks, the list of events, two moments side by side, what is written to a file.

use std::sync::Arc;

use chrono::TimeDelta;
use ratatui::style::{Color, Modifier};
use tautline::{
    desk::{Assessment, SwitchKind},
    screen::{
        connection::{Mark, MarkWish, Order, Origin, Playback, Seeking},
        export,
        state::{App, Export, Kinds, Moment, MomentKind, Page},
    },
};

use crate::{
    drawings::{SIZES, snapshot, snapshot_at},
    sample,
    stage::{draw, live, mark, press, replay, text},
};

fn corridors() -> Vec<Assessment> {
    vec![sample::ample(), sample::spent(), sample::blind()]
}

/// Two hours into the sample day, after some keys.
fn after(keys: &str) -> App {
    let mut app = replay(corridors());
    draw(&mut app, 120, 40, true);
    for key in keys.split(' ').filter(|key| !key.is_empty()) {
        press(&mut app, key);
        draw(&mut app, 120, 40, true);
    }
    app
}

fn playback(app: &mut App) -> &mut Playback {
    match &mut app.parcel.as_mut().unwrap().origin {
        Origin::Replay(playback) => playback,
        Origin::Live => panic!("not a replay"),
    }
}

fn visits(seconds: &[i64]) -> Vec<Order> {
    seconds.iter().map(|second| Order::Visit(sample::time(*second))).collect()
}

#[test]
fn jumps_go_from_moment_to_moment() {
    // On the overview everything is within reach, on the page of a corridor what is about it or about all.
    for (keys, seconds) in [
        ("w w w w w", &[30_000, 33_000, 36_000][..]),
        ("W W W", &[2700, 1800]),
        ("W w w", &[2700, 30_000, 33_000]),
        ("<enter> w w", &[30_000]),
        ("R R", &[1800]),
        ("r", &[]),
        ("d d d d", &[12_000, 14_000, 20_000]),
        ("d d D", &[12_000, 14_000, 12_000]),
        ("<enter> d d d", &[14_000, 20_000]),
        ("x", &[12_000]),
        ("<enter> x", &[14_000]),
        ("j j <enter> x", &[]),
        ("' '", &[40_000]),
        ("\" \"", &[5400]),
        ("x x X X", &[12_000, 12_000, 7200, 12_000]),
        ("X", &[]),
    ] {
        assert_eq!(press(&mut after(""), keys), visits(seconds), "{keys}");
    }
}

#[test]
fn several_jumps_need_not_wait_for_each_other_but_other_ways_are_followed() {
    let mut app = after("");
    assert_eq!(
        press(&mut app, "w > w"),
        [visits(&[30_000]), vec![Order::Jump(TimeDelta::minutes(1))], visits(&[30_000])].concat()
    );
    let mut app = after("");
    assert_eq!(press(&mut app, "w n x <enter> w").last(), visits(&[33_000]).last(), "a mark moves nobody");
}

#[test]
fn a_jump_says_where_it_leads_and_puts_the_cursor_there() {
    let mut app = after("w w");
    assert_eq!(app.corridor().map(|corridor| &*corridor.name), Some("Orrin-Tesk"));
    assert!(text(&draw(&mut app, 80, 24, true)).contains("14:10:00 Orrin-Tesk, bypass: SV2-SC bypassed"));
    playback(&mut app).seeking = Some(Seeking { to: Some(sample::time(33_000)), done: 0.4 });
    assert!(text(&draw(&mut app, 80, 24, true)).contains("40 % done"), "the way there comes first");
    let mut app = after("r");
    assert!(
        text(&draw(&mut app, 80, 24, true)).contains("There is no later alarm raised so far, 75 % are gone through.")
    );
    let mut app = after("<enter> j W");
    assert_eq!((app.page, app.outage.as_deref()), (Page::Corridor, Some("SV3")), "the page stays");
    assert!(text(&draw(&mut app, 80, 24, true)).contains("05:45:00 Skarn-Velm, return: SV3 closed"));
}

#[test]
fn marks_are_asked_for_and_shown_once_they_are_there() {
    let here = |corridor: Option<&str>, note: &str| {
        let mark = Mark { time: sample::time(7200), corridor: corridor.map(Into::into), note: note.into() };
        vec![Order::Mark(MarkWish::Set(mark))]
    };
    for (keys, orders) in [
        ("n <enter>", here(None, "")),
        ("<enter> n a <space> note <enter>", here(Some("Skarn-Velm"), "a note")),
        ("n never <esc>", vec![]),
        // On the list the cursor is at the latest moment up to the present, which is a mark.
        ("e n ! <enter>", vec![Order::Mark(MarkWish::Set(mark(5400, "before the works at Velm!")))]),
        ("e k n odd <enter>", vec![Order::Mark(MarkWish::Set(mark(3000, "odd")))]),
        ("e <delete>", vec![Order::Mark(MarkWish::Remove(sample::time(5400)))]),
        (
            "e <backspace> u u",
            vec![
                Order::Mark(MarkWish::Remove(sample::time(5400))),
                Order::Mark(MarkWish::Set(mark(5400, "before the works at Velm"))),
            ],
        ),
        ("e k <delete> u", vec![]),
    ] {
        let mut app = after("");
        assert_eq!(press(&mut app, keys), orders, "{keys}");
    }
    let mut app = after("n <enter>");
    assert!(!text(&draw(&mut app, 120, 40, true)).contains("is set"), "it is not there yet");
    for (trouble, said) in [
        (None, "The mark at 07:00:00 is set; marks are in days/day.marks.json."),
        (Some("kept in memory only, days/day.marks.json cannot be written"), "is set; kept in memory only"),
    ] {
        let mut app = after("n <enter>");
        let mut parcel = app.parcel.clone().unwrap();
        if let Origin::Replay(playback) = &mut parcel.origin {
            playback.marks.answered += 1;
            playback.marks.trouble = trouble.map(Into::into);
        }
        app.receive(parcel);
        assert!(text(&draw(&mut app, 120, 40, true)).contains(said), "{said}");
    }
}

#[test]
fn the_list_is_narrowed_by_kinds_and_words() {
    let shown = |keys: &str| {
        let app = after(keys);
        app.event_rows().iter().map(|moment| moment.kind.word()).collect::<Vec<_>>()
    };
    assert_eq!(shown("e").len(), 13);
    assert_eq!(shown("e v"), ["trip", "return", "bypass", "insertion"]);
    assert_eq!(shown("e v v v"), ["raised", "alarm"]);
    assert_eq!(shown("e V"), shown("e v v v v v v v v"));
    assert_eq!(shown("e V").len(), 14);
    assert_eq!(shown("e V V"), ["mark", "mark"]);
    assert_eq!(shown("e /ret <enter>"), ["return", "alarm"], "the word of a kind begins so, or the text has it");
    assert_eq!(shown("e /orrin <space> sc <enter>"), ["bypass", "insertion"]);
    assert_eq!(shown("e /orrin <enter> <esc>").len(), 13);
    assert_eq!(after("e /orrin <enter> <esc>").page, Page::Events);
    assert_eq!(after("e <esc>").page, Page::Overview);
    assert_eq!(after("<enter> e e").page, Page::Corridor);
    assert_eq!(after("e v").events.kinds, Kinds::Switching);
}

#[test]
fn enter_and_clicks_lead_from_the_list_to_the_moment() {
    use crossterm::event::{KeyModifiers, MouseButton, MouseEvent, MouseEventKind};
    let mut app = after("e G k k k");
    assert_eq!(press(&mut app, "<enter>"), visits(&[33_000]));
    assert_eq!((app.page, app.selected), (Page::Corridor, 1));
    let mut gap = after("e /gap <enter>");
    assert_eq!(press(&mut gap, "<enter>"), visits(&[30_000]));
    assert_eq!(gap.page, Page::Overview, "a gap is of no corridor");

    let click = |app: &mut App, column, row| {
        let kind = MouseEventKind::Down(MouseButton::Left);
        app.mouse(MouseEvent { kind, column, row, modifiers: KeyModifiers::NONE })
    };
    let mut app = after("e");
    assert_eq!(click(&mut app, 20, 3), None);
    draw(&mut app, 120, 40, true);
    assert_eq!(click(&mut app, 20, 3), Some(Order::Visit(sample::time(1800))));
    let mut app = after("");
    let signs = text(&draw(&mut app, 120, 40, true)).lines().nth(37).unwrap().to_owned();
    let column = signs.chars().position(|sign| sign == 'G').unwrap();
    assert_eq!(click(&mut app, u16::try_from(column).unwrap(), 37), Some(Order::Visit(sample::time(30_000))));
}

/// Something of everything changes after the moment held.
fn held() -> App {
    let mut app = after("A");
    let mut now = corridors();
    now[0] = sample::carrying("Skarn-Velm", 1900.0);
    let switches = Arc::make_mut(&mut now[0].switches);
    for switch in switches.iter_mut().filter(|switch| *switch.name == *"SV3" || switch.kind == SwitchKind::Bank) {
        switch.on = false;
    }
    now[0].sources[0].x_ohm = 21.4;
    now[0].fit.suspects = vec!["SV1.to.mw".into()];
    now[0].outages.remove(3);
    let time = sample::time(9000);
    for assessment in &mut now {
        assessment.time = time;
    }
    let mut parcel = app.parcel.clone().unwrap();
    parcel.alarms.alarms.observe(&now);
    parcel.chronicle.take(now);
    app.receive(parcel);
    press(&mut app, "B");
    app
}

#[test]
fn two_moments_stand_side_by_side_and_what_differs_comes_first() {
    let mut app = held();
    let drawing = text(&draw(&mut app, 120, 40, true));
    let line = |what: &str| {
        drawing.lines().position(|line| line.contains(what)).unwrap_or_else(|| panic!("{what}: {drawing}"))
    };
    assert!(drawing.contains("A 14 Mar 07:00:00   now 14 Mar 07:30:00   30 min later"), "{drawing}");
    let unchanged = line(" unchanged");
    for differs in
        ["transfer, MW", "  SV3 ", "SV2-SC ", "angle between the buses", "SV1 out: margin", "Skarn: X, Ω", "set aside"]
    {
        assert!(line(differs) < unchanged, "{differs}: {drawing}");
    }
    assert!(line("exporter") > unchanged, "{drawing}");
    let changed = drawing.lines().find(|line| line.contains("transfer, MW")).unwrap();
    let words: Vec<_> = changed.split_whitespace().collect();
    assert_eq!(words[2..], ["1284", "1900", "+616"], "{changed}");

    press(&mut app, "] A");
    let drawing = text(&draw(&mut app, 120, 40, true));
    assert!(drawing.contains("the same moment") && drawing.contains("Nothing differs."), "{drawing}");
    let mut watched = live(corridors());
    press(&mut watched, "A B");
    assert!(text(&draw(&mut watched, 80, 24, true)).contains("the same moment"), "live, too");
}

#[test]
fn what_is_on_the_screen_goes_to_a_file_as_it_stands() {
    for (keys, what) in [
        ("p j", Some(Export::Record)),
        ("p t", Some(Export::Text)),
        ("p s", Some(Export::Picture)),
        ("p <esc>", None),
        ("p q", None),
    ] {
        for mut app in [after(""), live(corridors())] {
            assert_eq!(press(&mut app, keys), [], "{keys}");
            assert_eq!((app.export, app.leaving, &app.typing), (what, false, &None), "{keys}");
        }
    }
    let mut app = after("<enter>");
    let mut line = Vec::new();
    tautline::report::jsonl::write(&app.track(0).unwrap().latest, &mut line).unwrap();
    assert_eq!(export::record(&app), Some(line));
    let page = draw(&mut app, 120, 40, true);
    assert_eq!(export::text(&page).trim_end(), text(&page).trim_end());

    let mut hostile = sample::spent();
    hostile.corridor = "<script>&\"\u{1b}]0;x\u{7}".into();
    for (width, height) in SIZES {
        let svg = export::svg(&draw(&mut replay(vec![hostile.clone(), sample::ample()]), width, height, true));
        assert!(svg.starts_with("<svg ") && svg.ends_with("</svg>\n"));
        assert!(svg.contains("&lt;script&gt;") && !svg.contains("<script"), "{svg}");
        assert!(!svg.chars().any(|char| char.is_control() && char != '\n'));
        assert_eq!(svg.matches("<text").count(), svg.matches("</text>").count());
    }
    app.exported(Err("nothing was written to the current directory: it is full".into()));
    assert!(text(&draw(&mut app, 80, 24, true)).contains("nothing was written"));
}

#[test]
fn signs_read_without_colour_and_the_corridor_with_the_cursor_stands_out() {
    let mut app = after("");
    for (width, height) in SIZES {
        let buffer = draw(&mut app, width, height, false);
        assert!(buffer.content.iter().all(|cell| cell.fg == Color::Reset && cell.bg == Color::Reset));
        let row = if height >= 30 { height - 3 } else { height - 2 };
        let cells: Vec<_> = (0..width).map(|x| &buffer[(x, row)]).collect();
        let cell = |sign: &str| cells.iter().find(|cell| cell.symbol() == sign);
        let trip = cell("T").unwrap_or_else(|| panic!("{}", text(&buffer)));
        assert!(trip.modifier.contains(Modifier::BOLD) && !trip.modifier.contains(Modifier::DIM));
        if height >= 30 {
            assert!(cell("B").unwrap().modifier.contains(Modifier::DIM), "that is of another corridor");
        }
    }
}

#[test]
fn texts_from_recordings_and_marks_do_no_harm() {
    let hostile = "\u{1b}[2J\u{202e}東西線\u{7}\n";
    for keys in ["e", "e n", "x", "e k", "A B"] {
        let mut app = after("");
        let playback = playback(&mut app);
        playback.marks.marks = Arc::new(vec![mark(5400, hostile)]);
        playback.marks.place = hostile.into();
        let low = MomentKind::Low { headroom_mw: f64::NEG_INFINITY, of_day: true };
        let survey = Arc::make_mut(&mut playback.survey);
        survey.trouble = Some(hostile.into());
        let (corridor, text) = (Some(hostile.into()), hostile.into());
        survey.add(Moment { time: sample::time(7000), corridor, kind: low, state: None, text });
        press(&mut app, keys);
        for (width, height) in SIZES {
            let buffer = draw(&mut app, width, height, true);
            let harmful = |c: char| c.is_control() || ('\u{202a}'..='\u{202e}').contains(&c);
            assert!(!buffer.content.iter().any(|cell| cell.symbol().contains(harmful)), "{keys} at {width}×{height}");
        }
    }
}

#[test]
fn drawings() {
    snapshot("events", after("e"));
    snapshot("events-filtered", after("e /skarn <enter>"));
    snapshot("events-note", after("e n"));
    snapshot("jump", after("<enter> x"));
    snapshot("compare", held());
    snapshot_at("compare-nothing", after("B"), &SIZES[..1]);
    snapshot_at("export", after("p"), &SIZES[..1]);
}
