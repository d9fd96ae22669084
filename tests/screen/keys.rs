//! What each key does, as a table.

use tautline::screen::{
    connection::Order::{self, Cancel, Faster, Jump, Seek, Slower, StepBack, StepForward, Toggle},
    state::{App, KEYS, Page, Panel, Sort},
};

use crate::{
    sample,
    stage::{draw, live, press, replay},
};

/// Three corridors on a terminal where everything is a page of its own.
fn app() -> App {
    let mut app = replay(vec![sample::ample(), sample::thin(), sample::spent()]);
    draw(&mut app, 80, 24, true);
    app
}

#[test]
fn keys_lead_where_they_should() {
    type Check = fn(&App) -> bool;
    let table: [(&str, Check); 32] = [
        ("", |a| a.page == Page::Overview && a.selected == 0),
        ("j", |a| a.selected == 1),
        ("<down> <down> <down> <down>", |a| a.selected == 2),
        ("j k k", |a| a.selected == 0),
        ("G", |a| a.selected == 2),
        ("<end> <home>", |a| a.selected == 0),
        ("<page-down>", |a| a.selected == 2),
        ("s", |a| a.sort == Sort::WorstFirst && a.rows() == [2, 1, 0] && a.selected == 0),
        ("s s", |a| a.sort == Sort::Configured),
        ("s j", |a| a.selected == 0),
        ("s k", |a| a.selected == 1),
        ("/orrin", |a| a.rows() == [2] && a.selected == 2 && a.typing.is_some()),
        ("/thi <enter>", |a| a.rows() == [1] && a.typing.is_none() && a.page == Page::Overview),
        ("/xyz", |a| a.rows().is_empty()),
        ("/xyz <esc>", |a| a.rows().len() == 3 && a.filter.is_empty()),
        ("/orrin <enter> <esc>", |a| a.rows().len() == 3),
        ("/orx <backspace> <enter>", |a| a.filter == "or"),
        ("j <enter>", |a| a.page == Page::Corridor && a.selected == 1 && a.outage.is_none()),
        ("j l", |a| a.page == Page::Corridor),
        ("<enter> <esc>", |a| a.page == Page::Overview),
        ("<enter> h", |a| a.page == Page::Overview),
        ("<enter> j", |a| a.outage.as_deref() == Some("SV3")),
        ("<enter> k", |a| a.outage.as_deref() == Some("SV1")),
        ("<enter> j b", |a| a.outage.is_none() && a.outage_name().as_deref() == Some("SV2")),
        ("<enter> <tab>", |a| a.panel == Panel::Curves),
        ("<enter> <back-tab>", |a| a.panel == Panel::Data),
        ("<enter> ] ]", |a| a.selected == 2 && a.page == Page::Corridor),
        ("<enter> ] [", |a| a.selected == 0),
        ("?", |a| a.page == Page::Help),
        ("<enter> ? <esc>", |a| a.page == Page::Corridor),
        ("<enter> m ? ?", |a| a.page == Page::Corridor),
        ("q", |a| a.leaving),
    ];
    for (keys, check) in table {
        let mut app = app();
        let orders = press(&mut app, keys);
        assert!(check(&app), "{keys}: {:?} {:?} {:?} {:?}", app.page, app.selected, app.outage, app.rows());
        assert_eq!(orders, [], "{keys}");
    }
}

#[test]
fn keys_give_orders_to_a_replay() {
    let minutes = |minutes| Jump(chrono::TimeDelta::minutes(minutes));
    let table: [(&str, &[Order]); 13] = [
        ("<space>", &[Toggle]),
        ("+ = - _", &[Faster, Faster, Slower, Slower]),
        (". ,", &[StepForward, StepBack]),
        ("> <", &[minutes(1), minutes(-1)]),
        (") (", &[minutes(10), minutes(-10)]),
        ("} {", &[minutes(60), minutes(-60)]),
        ("t 14:03 <enter>", &[Seek(sample::time(9 * 3600 + 180))]),
        ("t 14:0x3 <backspace> <backspace> 3:20 <enter>", &[Seek(sample::time(9 * 3600 + 200))]),
        ("t 2031-03-14T05:00:00Z <enter>", &[Seek(sample::time(0))]),
        ("t 14:03 <esc>", &[]),
        ("t noon <enter>", &[]),
        ("<enter> . m , ? <space>", &[StepForward, StepBack, Toggle]),
        ("/ . <esc>", &[]),
    ];
    for (keys, orders) in table {
        assert_eq!(press(&mut app(), keys), orders, "{keys}");
    }
    let mut wrong = app();
    press(&mut wrong, "t noon <enter>");
    assert!(wrong.notice.as_ref().is_some_and(|notice| notice.contains("“noon” is no time")));
}

#[test]
fn a_live_feed_takes_no_orders() {
    for key in ["<space>", "+", ".", "}", "t"] {
        let mut app = live(vec![sample::ample(), sample::thin()]);
        assert_eq!(press(&mut app, key), [], "{key}");
    }
}

#[test]
fn esc_cancels_a_seek_before_anything_else() {
    let mut app = app();
    let mut parcel = app.parcel.clone().unwrap();
    if let tautline::screen::connection::Origin::Replay(playback) = &mut parcel.origin {
        playback.seeking = Some(tautline::screen::connection::Seeking { to: None, done: 0.4 });
    }
    app.receive(parcel);
    press(&mut app, "<enter>");
    assert_eq!(press(&mut app, "<esc>"), [Cancel]);
    assert_eq!(app.page, Page::Corridor);
}

#[test]
fn long_pages_scroll_to_their_end_and_back() {
    let mut app = app();
    press(&mut app, "?");
    draw(&mut app, 80, 24, true);
    press(&mut app, "<end> j j");
    assert_eq!(app.scroll, app.drawn.scroll_max);
    assert!(app.scroll > 20);
    press(&mut app, "k");
    assert_eq!(app.scroll, app.drawn.scroll_max - 1);
}

/// The help page lists its keys in words; each single character and each named key in it must do something.
#[test]
fn every_key_of_the_help_page_works() {
    let mut tried = 0;
    for (_, keys) in &KEYS[..4] {
        for (names, what) in *keys {
            for name in names.split_whitespace() {
                let key = match name {
                    "↑" => "<up>",
                    "↓" => "<down>",
                    "←" => "<left>",
                    "PgUp" => "<page-up>",
                    "PgDn" => "<page-down>",
                    "Home" => "<home>",
                    "End" => "<end>",
                    "Enter" => "<enter>",
                    "Esc" => "<esc>",
                    "Tab" => "<tab>",
                    "Shift-Tab" => "<back-tab>",
                    "Space" => "<space>",
                    "Del" => "<delete>",
                    "Ctrl-C" | "Ctrl-Z" => continue,
                    single => single,
                };
                // Somewhere, from among a few starting points, the key changes the screen or gives an order.
                let works = [
                    "",
                    "j",
                    "/s <enter>",
                    "<enter> ]",
                    "<enter> ] k",
                    "<enter> <tab>",
                    "m",
                    "a",
                    "e",
                    "e n x <enter>",
                    "x",
                    "A",
                    "/",
                ]
                .iter()
                .any(|start| {
                    let mut app = app();
                    press(&mut app, start);
                    let before = crate::stage::text(&draw(&mut app, 80, 24, true));
                    let orders = press(&mut app, key);
                    !orders.is_empty() || app.leaving || before != crate::stage::text(&draw(&mut app, 80, 24, true))
                });
                assert!(works, "{name}: {what}");
                tried += 1;
            }
        }
    }
    assert!(tried > 30);
}
