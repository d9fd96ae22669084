use ratatui::text::{Line, Span};
use unicode_width::UnicodeWidthStr;

use super::{Theme, text};
use crate::screen::state::{App, Page, Prompt, Typing};

/// What is asked for, what is typed so far, and what the keys do then.
fn prompt<'a>(app: &'a App, typing: &'a Typing) -> (&'static str, &'a str, &'static str) {
    match typing {
        Typing::Filter => ("show names with, or states", &app.filter, "Enter keeps it, Esc drops it"),
        Typing::Time(text) => ("go to (14:03, 14:03:20, 2031-03-14T14:03Z)", text, "Enter goes, Esc does not"),
        Typing::Alarm(Prompt::Filter, _) => {
            ("show names with, states or priorities", &app.alarms.filter, "Enter keeps it, Esc drops it")
        }
        Typing::Alarm(Prompt::Shelve, text) => {
            ("shelve for and why (30m switching at Velm)", text, "Enter does, Esc does not")
        }
        Typing::Alarm(Prompt::OutOfService, text) => ("out of service because", text, "Enter does, Esc does not"),
        Typing::Alarm(Prompt::Note, text) => ("note", text, "Enter keeps it, Esc does not"),
        Typing::Events => ("show kinds, names or texts with", &app.events.filter, "Enter keeps it, Esc drops it"),
        Typing::Mark(mark) => ("note", &mark.note, "Enter sets the mark, Esc does not"),
        Typing::Export => ("to a file as", "", "j the record, JSON · t text · s picture, SVG · Esc not"),
    }
}

/// What is being typed, else the keys of this page that fit.
pub fn line(app: &App, theme: Theme, width: usize) -> Line<'static> {
    if let Some((what, typed, then)) = app.typing.as_ref().map(|typing| prompt(app, typing)) {
        let left = vec![
            Span::styled(format!(" {what}: "), theme.strong()),
            Span::raw(text::clean(typed).into_owned()),
            Span::styled(" ", ratatui::style::Style::new().add_modifier(ratatui::style::Modifier::REVERSED)),
        ];
        return text::spread(left, vec![Span::styled(format!("  {then} "), theme.quiet())], width);
    }
    let page: &[(&str, &str)] = match app.page {
        Page::Overview => &[
            ("?", "help"),
            ("q", "quit"),
            ("↑↓", "choose"),
            ("Enter", "open"),
            ("s", "sort"),
            ("/", "find"),
            ("a", "alarms"),
            ("m", "messages"),
        ],
        Page::Corridor => &[
            ("?", "help"),
            ("Esc", "all corridors"),
            ("↑↓", if app.walks_outages() { "outage" } else { "scroll" }),
            ("Tab", "next part"),
            ("a", "alarms"),
            ("[ ]", "corridor"),
            ("m", "messages"),
        ],
        Page::Alarms if app.alarms.history => &[("Tab", "back"), ("↑↓", "scroll"), ("n", "note"), ("q", "quit")],
        Page::Alarms => &[
            ("y", "acknowledge"),
            ("Y", "all in sight"),
            ("z", "shelve"),
            ("Tab", "history"),
            ("Enter", "corridor"),
            ("u", "bring back"),
            ("o", "out of service"),
            ("n", "note"),
            ("/", "find"),
            ("v", "normal too"),
            ("Esc", "back"),
            ("?", "help"),
        ],
        Page::Events => &[
            ("?", "help"),
            ("Enter", "go there"),
            ("n", "mark, mend"),
            ("v", "kinds"),
            ("/", "find"),
            ("Del", "take mark away"),
            ("Esc", "back"),
        ],
        Page::Compare => &[
            ("A", "hold now"),
            ("[ ]", "corridor"),
            ("↑↓", "scroll"),
            ("Esc", "back"),
            ("p", "to a file"),
            ("?", "help"),
        ],
        Page::Change => &[("Enter", "apply it"), ("Esc", "back"), ("↑↓", "scroll"), ("q", "quit")],
        Page::Messages | Page::Help => &[("Esc", "back"), ("↑↓", "scroll"), ("q", "quit")],
    };
    let replay: &[(&str, &str)] = match app.playback() {
        Some(playback) if playback.playing => {
            &[("Space", "pause"), ("e", "events"), ("+ -", "speed"), ("t", "go to time"), (". ,", "step")]
        }
        Some(_) => {
            &[("Space", "play"), ("e", "events"), ("w W", "next, previous"), (". ,", "step"), ("t", "go to time")]
        }
        None => &[],
    };
    let mut spans = Vec::new();
    let mut used = 0;
    for (key, what) in page.iter().take(4).chain(replay).chain(page.iter().skip(4)) {
        let wide = key.width() + what.width() + 4;
        if used + wide <= width {
            used += wide;
            spans.push(Span::styled(format!(" {key}"), theme.strong()));
            spans.push(Span::styled(format!(" {what}  "), theme.quiet()));
        }
    }
    Line::from(spans)
}
