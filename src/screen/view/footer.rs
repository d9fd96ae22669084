use ratatui::text::{Line, Span};
use unicode_width::UnicodeWidthStr;

use super::{Theme, text};
use crate::screen::state::{App, Page, Prompt, Typing};

/// What is being typed, else the keys of this page that fit.
pub fn line(app: &App, theme: Theme, width: usize) -> Line<'static> {
    let nothing = String::new();
    let prompt = match &app.typing {
        Some(Typing::Filter) => Some(("show names with, or states", &app.filter, "Enter keeps it, Esc drops it")),
        Some(Typing::Time(text)) => {
            Some(("go to (14:03, 14:03:20, 2031-03-14T14:03Z)", text, "Enter goes, Esc does not"))
        }
        Some(Typing::Alarm(Prompt::Filter, _)) => {
            Some(("show names with, states or priorities", &app.alarms.filter, "Enter keeps it, Esc drops it"))
        }
        Some(Typing::Alarm(Prompt::Shelve, text)) => {
            Some(("shelve for and why (30m switching at Velm)", text, "Enter does, Esc does not"))
        }
        Some(Typing::Alarm(Prompt::OutOfService, text)) => {
            Some(("out of service because", text, "Enter does, Esc does not"))
        }
        Some(Typing::Alarm(Prompt::Note, text)) => Some(("note", text, "Enter keeps it, Esc does not")),
        Some(Typing::Events) => {
            Some(("show those with", &app.events.filter, "Enter keeps it, Esc drops it; a kind’s word, names, texts"))
        }
        Some(Typing::Mark(mark)) => Some(("note", &mark.note, "Enter sets the mark, Esc does not")),
        Some(Typing::Export) => {
            Some(("to a file", &nothing, "j record as JSON · t page as text · s page as SVG · Esc nothing"))
        }
        None => None,
    };
    if let Some((what, typed, then)) = prompt {
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
            ("Enter", "go there"),
            ("n", "mark, mend"),
            ("v", "kinds"),
            ("/", "find"),
            ("Del", "take mark away"),
            ("Esc", "back"),
            ("?", "help"),
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
