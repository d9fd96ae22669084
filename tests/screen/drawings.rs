//! Every page as it is drawn, at three sizes, for corridors in every state.

use ratatui::style::{Color, Modifier};
use tautline::screen::{
    connection::{AlarmReport, FeedReport, Order, Origin, Parcel, Scene},
    state::{App, Chronicle},
};

use crate::{
    sample,
    stage::{self, draw, live, press, replay, text},
};

pub const SIZES: [(u16, u16); 3] = [(80, 24), (120, 40), (200, 60)];

pub fn snapshot(name: &str, app: App) {
    snapshot_at(name, app, &SIZES);
}

pub fn snapshot_at(name: &str, mut app: App, sizes: &[(u16, u16)]) {
    for &(width, height) in sizes {
        let drawing = text(&draw(&mut app, width, height, true));
        let mut settings = insta::Settings::clone_current();
        settings.set_snapshot_path("snapshots");
        settings.set_prepend_module_to_snapshot(false);
        settings.set_omit_expression(true);
        settings.bind(|| insta::assert_snapshot!(format!("{name}-{width}x{height}"), drawing));
    }
}

fn after(mut app: App, keys: &str) -> App {
    draw(&mut app, 80, 24, true);
    press(&mut app, keys);
    app
}

fn mixed() -> Vec<tautline::desk::Assessment> {
    let mut thin = sample::thin();
    thin.corridor = "Lund-Marr".into();
    vec![sample::ample(), thin, sample::spent(), sample::blind()]
}

#[test]
fn overview() {
    snapshot("overview-ample", live(vec![sample::ample(), sample::carrying("Hald-Brenn", 640.0)]));
    snapshot("overview-mixed", live(mixed()));
    snapshot("overview-replay", replay(mixed()));
    snapshot("overview-worst-first", after(replay(mixed()), "s"));
}

#[test]
fn overview_of_many() {
    let many = (0..500).map(|place| sample::carrying(&format!("Corridor {place:03}"), 600.0 + 3.0 * f64::from(place)));
    let mut app = live(many.collect());
    snapshot("overview-many", after(app, "<page-down> <page-down> j"));
    app = live((0..500).map(|place| sample::carrying(&format!("Corridor {place:03}"), 900.0)).collect());
    snapshot("overview-filter", after(app, "/07"));
}

#[test]
fn corridor() {
    snapshot("corridor-ample", after(live(mixed()), "<enter>"));
    snapshot("corridor-spent", after(live(mixed()), "j j <enter>"));
    snapshot("corridor-blind", after(live(mixed()), "j j j <enter>"));
    snapshot("corridor-only-one", replay(vec![sample::thin()]));
    snapshot("corridor-other-outage", after(live(vec![sample::thin()]), "<down>"));
}

#[test]
fn parts_of_the_corridor_page() {
    for (tabs, name) in ["curves", "actions", "sources", "network", "data"].iter().enumerate() {
        let mut app = live(vec![sample::thin()]);
        for _ in 0..=tabs {
            press(&mut app, "<tab>");
        }
        snapshot_at(&format!("part-{name}"), app, &SIZES[..1]);
    }
    let mut spent = live(vec![sample::spent()]);
    press(&mut spent, "<tab>");
    snapshot_at("part-curves-lost", spent, &SIZES[..1]);
}

#[test]
fn other_pages() {
    snapshot("help", after(live(mixed()), "?"));
    snapshot("messages", after(live(mixed()), "m"));
}

#[test]
fn separation_is_told() {
    let mut only = sample::ample();
    let outage = &mut only.outages[0];
    (outage.separates, outage.picture, outage.angle_deg, outage.kv) = (true, None, None, None);
    outage.limit_mw = tautline::desk::OutageLimits { separation: Some(0.0), ..Default::default() };
    only.binding =
        Some(tautline::desk::Binding { outage: Some("SV1".into()), criterion: tautline::desk::Criterion::Separation });
    only.headroom_mw = Some(-1284.2);
    only.state = tautline::desk::State::Spent;
    snapshot("corridor-separates", live(vec![only]));
}

#[test]
fn names_from_outside_do_no_harm() {
    let mut hostile = sample::thin();
    hostile.corridor = "\u{1b}[31mSkarn\u{202e}mleV\u{7}".into();
    hostile.exporter = Some("東西線\u{85}".into());
    hostile.outages[0].name = "SV\u{0}1 \u{200f}東西線東西線東西線".into();
    hostile.fit.suspects = vec!["SV1\n.to\r.mw\u{9b}2J".into()];
    hostile.actions[0].action = "close \u{1b}]0;x\u{7}".into();
    let mut wide = sample::ample();
    wide.corridor = "東京湾横断連絡送電線路第二".into();
    for keys in ["", "<enter>", "<enter> <tab>", "<enter> <tab> <tab> <tab> <tab> <tab>", "m"] {
        let mut app = after(live(vec![hostile.clone(), wide.clone()]), keys);
        for (width, height) in SIZES {
            let buffer = draw(&mut app, width, height, true);
            let harmful = |c: char| {
                c.is_control()
                    || matches!(c, '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
            };
            assert!(!buffer.content.iter().any(|cell| cell.symbol().contains(harmful)), "{keys} at {width}×{height}");
        }
    }
    snapshot("overview-hostile", live(vec![hostile, wide]));
}

#[test]
fn nothing_to_show_is_explained() {
    let grid = sample::grid(&["Skarn-Velm", "Hald-Brenn"]);
    let new = || App::new(grid.clone(), chrono_tz::Tz::UTC, chrono::TimeDelta::seconds(10));
    snapshot("waiting", new());

    let mut ended = new();
    let feed = FeedReport { ended: true, ..FeedReport::default() };
    ended.receive(Parcel {
        chronicle: Chronicle::default(),
        alarms: AlarmReport::default(),
        scene: Scene::default(),
        feed,
        origin: Origin::Live,
    });
    assert!(text(&draw(&mut ended, 80, 24, true)).contains("ended without a single frame"));

    let mut silent = live(vec![sample::ample()]);
    silent.clock += std::time::Duration::from_secs(75);
    let drawing = text(&draw(&mut silent, 80, 24, true));
    assert!(drawing.contains("NO DATA FOR 75 s: this is how it stood at 07:00:00"), "{drawing}");

    let mut unrecorded = live(vec![sample::ample()]);
    unrecorded.parcel.as_mut().unwrap().feed.unrecorded = Some("recording fails: its file was deleted".into());
    let drawing = text(&draw(&mut unrecorded, 80, 24, true));
    assert!(drawing.contains("FRAMES ARE NOT KEPT, recording fails: its file was deleted. Messages (m)"), "{drawing}");

    let mut over = live(vec![sample::ample()]);
    over.parcel.as_mut().unwrap().feed.ended = true;
    assert!(text(&draw(&mut over, 80, 24, true)).contains("THE FEED HAS ENDED"));
    assert!(!over.ticks() && silent.ticks(), "an ended feed has no age to show");
}

#[test]
fn a_tiny_terminal_is_told_so() {
    let mut app = live(mixed());
    assert!(text(&draw(&mut app, 39, 24, true)).starts_with("39×24 is too small"));
    assert!(text(&draw(&mut app, 80, 9, true)).starts_with("80×9 is too small"));
    assert!(text(&draw(&mut app, 40, 10, true)).starts_with("tautline"));
}

#[test]
fn states_read_without_colour() {
    let mut app = live(mixed());
    for (width, height) in SIZES {
        let buffer = draw(&mut app, width, height, false);
        assert!(buffer.content.iter().all(|cell| cell.fg == Color::Reset && cell.bg == Color::Reset));
        let text = text(&buffer);
        for (mark, word) in [("·", "ample"), ("!", "THIN"), ("✕", "SPENT"), ("?", "BLIND")] {
            let line = text.lines().skip(1).find(|line| line.contains(word)).unwrap();
            assert!(line.contains(mark), "{line}");
        }
    }
}

#[test]
fn colours_come_in_pairs_and_only_for_the_abnormal() {
    let mut calm = live(vec![sample::ample(), sample::carrying("Hald-Brenn", 700.0)]);
    let coloured = |app: &mut App| {
        draw(app, 120, 40, true)
            .content
            .into_iter()
            .filter(|c| c.fg != Color::Reset || c.bg != Color::Reset)
            .collect::<Vec<_>>()
    };
    assert!(coloured(&mut calm).is_empty());
    let alarming = coloured(&mut live(mixed()));
    assert!(!alarming.is_empty());
    assert!(alarming.iter().all(|cell| cell.fg != Color::Reset && cell.bg != Color::Reset));
    assert!(alarming.iter().all(|cell| !cell.modifier.intersects(Modifier::SLOW_BLINK | Modifier::RAPID_BLINK)));
}

#[test]
fn clicks_reach_what_was_drawn() {
    use crossterm::event::{KeyModifiers, MouseButton, MouseEvent, MouseEventKind};
    let click = |app: &mut App, column, row| {
        let kind = MouseEventKind::Down(MouseButton::Left);
        app.mouse(MouseEvent { kind, column, row, modifiers: KeyModifiers::NONE })
    };
    let mut app = replay(mixed());
    draw(&mut app, 80, 24, true);
    assert_eq!(click(&mut app, 20, 8), None);
    assert_eq!((app.selected, app.page), (1, tautline::screen::state::Page::Overview));
    click(&mut app, 20, 8);
    assert_eq!(app.page, tautline::screen::state::Page::Corridor);
    let drawing = text(&draw(&mut app, 80, 24, true));
    let row = drawing.lines().position(|line| line.contains("SV3     ")).unwrap();
    click(&mut app, 10, u16::try_from(row).unwrap());
    assert_eq!(app.outage.as_deref(), Some("SV3"));
    let Some(Order::Seek(time)) = click(&mut app, 50, 22) else { panic!("the time bar was not hit") };
    assert!(time > sample::time(3600) && time < sample::time(86_400), "{time}");
    let _ = stage::press(&mut app, "<esc>");
}
