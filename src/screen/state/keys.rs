use std::{ops::ControlFlow, sync::Arc};

use chrono::TimeDelta;
use crossterm::event::{KeyCode, KeyEvent, KeyEventKind, KeyModifiers};

use super::{App, Export, Page, Panel, Prompt, Sort, Typing, parse_time};
use crate::screen::connection::Order;

/// Keys that move us in a recording, which a live feed does not have.
const OF_A_REPLAY: &str = " +=-_.,><)(}{tnewWrRdDxX'\"";

/// Longest line that can be typed.
const TYPED_MAX: usize = 200;

/// Every key, with what it does: the help page prints this.
pub const KEYS: [(&str, &[(&str, &str)]); 5] = [
    (
        "Everywhere",
        &[
            ("↑ ↓  k j", "previous, next: corridor, outage or line"),
            ("PgUp PgDn", "a screenful up, down"),
            ("Home End  g G", "first, last"),
            ("Enter", "open the corridor under the cursor"),
            ("Esc  ← h", "back; on the overview Esc also drops the filter"),
            ("Tab  Shift-Tab", "corridor page: next, previous part"),
            ("[ ]", "corridor page: previous, next corridor"),
            ("b", "corridor page: back to the outage that sets the headroom"),
            ("s", "overview: as configured, or worst first"),
            ("/", "overview: show only names that contain, or a state that begins with, what you type"),
            ("a", "alarms"),
            ("m", "messages"),
            ("A", "hold the present moment as A"),
            ("B", "A beside the present: what changed between them"),
            (
                "p",
                "write what is on the screen to a file: j the corridor’s record as JSON, t the page as text, s as SVG",
            ),
            ("c", "what a changed configuration file would change; Enter there applies it"),
            ("?", "this help"),
            ("q  Ctrl-C", "quit"),
            ("Ctrl-Z", "suspend; `fg` brings it back"),
        ],
    ),
    (
        "In a replay",
        &[
            ("Space", "play, pause"),
            ("+ -", "faster, slower (1 to 3600 recorded seconds in a second)"),
            (". ,", "one frame on, back"),
            ("> <", "1 minute on, back"),
            (") (", "10 minutes on, back"),
            ("} {", "1 hour on, back"),
            ("t", "go to a time: 14:03, 14:03:20 or 2031-03-14T14:03:20Z"),
            ("Esc", "while seeking: stop there"),
            ("e", "events and marks of the whole recording"),
            (
                "w W",
                "next, previous switching, state, direction or gap: on a corridor’s page its own, elsewhere all; so below",
            ),
            ("r R", "next, previous alarm raised"),
            ("d D", "next, previous lowest headroom: of a dip below the thin threshold, or of a day"),
            ("x X", "the lowest headroom of all; back to where the last jump set out"),
            ("' \"", "next, previous mark"),
            ("n", "mark this moment, with a note or without"),
        ],
    ),
    (
        "On the alarm page",
        &[
            ("y", "acknowledge the alarm under the cursor, and go to the next"),
            ("Y", "acknowledge all that are in sight"),
            ("z", "shelve it: for how long (at most 24h) and why"),
            ("o", "take it out of service, and why"),
            ("u", "bring back what is shelved or out of service"),
            ("n", "put a note on it"),
            ("Tab", "its history, and back"),
            ("Enter", "open its corridor; in a replay at the moment it was raised"),
            (
                "/",
                "show only corridors and alarms that contain, or a state or priority that begins with, what you type",
            ),
            ("v", "normal alarms too, or only those that are not"),
        ],
    ),
    (
        "On the page of events and marks",
        &[
            ("Enter", "go there, and open the corridor"),
            ("v V", "next, previous kinds"),
            ("/", "show only corridors and texts that contain, or kinds that begin with, each word you type"),
            ("n", "mark it with a note, or mend the note of a mark"),
            ("Del", "take a mark away"),
            ("u", "bring it back"),
        ],
    ),
    (
        "Mouse",
        &[
            (
                "click",
                "choose a corridor, an outage, an alarm, a part, a place on the time bar or a sign at it; again to open",
            ),
            ("click", "the line of alarms at the top: the alarm page"),
            ("wheel", "move up, down"),
        ],
    ),
];

impl App {
    /// Answers a key.
    pub fn key(&mut self, key: KeyEvent) -> Option<Order> {
        if key.kind == KeyEventKind::Release {
            return None;
        }
        (self.notice, self.said) = (None, None);
        let order = self.answer(key)?;
        self.note_order(&order);
        Some(order)
    }

    fn answer(&mut self, key: KeyEvent) -> Option<Order> {
        if key.modifiers.contains(KeyModifiers::CONTROL) {
            self.leaving |= key.code == KeyCode::Char('c');
            return None;
        }
        if self.typing.is_some() {
            return self.type_key(key.code);
        }
        if self.page == Page::Alarms
            && let ControlFlow::Break(order) = self.alarm_key(key.code)
        {
            return order;
        }
        if self.page == Page::Events
            && let ControlFlow::Break(order) = self.event_key(key.code)
        {
            return order;
        }
        match key.code {
            KeyCode::Char('q') => self.leaving = true,
            KeyCode::Char('?') => self.toggle(Page::Help),
            KeyCode::Char('a') => self.toggle(Page::Alarms),
            KeyCode::Char('m') => self.toggle(Page::Messages),
            KeyCode::Char('c') => self.toggle(Page::Change),
            KeyCode::Char('A') => self.hold(),
            KeyCode::Char('B') => self.toggle(Page::Compare),
            KeyCode::Char('p') => return self.ask(Typing::Export),
            KeyCode::Enter if self.page == Page::Change => return self.apply(),
            KeyCode::Up | KeyCode::Char('k') => self.go(-1),
            KeyCode::Down | KeyCode::Char('j') => self.go(1),
            KeyCode::PageUp => self.go(-self.screenful()),
            KeyCode::PageDown => self.go(self.screenful()),
            KeyCode::Home | KeyCode::Char('g') => self.go(isize::MIN / 2),
            KeyCode::End | KeyCode::Char('G') => self.go(isize::MAX / 2),
            KeyCode::Enter | KeyCode::Right | KeyCode::Char('l') if self.page == Page::Overview => {
                self.open(Page::Corridor);
            }
            KeyCode::Esc if self.playback().is_some_and(|playback| playback.seeking.is_some()) => {
                return Some(Order::Cancel);
            }
            KeyCode::Esc | KeyCode::Left | KeyCode::Char('h') => self.back(key.code == KeyCode::Esc),
            KeyCode::Char('s') if self.page == Page::Overview => {
                self.sort = if self.sort == Sort::Configured { Sort::WorstFirst } else { Sort::Configured };
            }
            KeyCode::Char('/') if self.page == Page::Overview => self.typing = Some(Typing::Filter),
            KeyCode::Tab if self.page == Page::Corridor => self.show(self.panel.turned(self.size, false)),
            KeyCode::BackTab if self.page == Page::Corridor => self.show(self.panel.turned(self.size, true)),
            KeyCode::Char('[') if matches!(self.page, Page::Corridor | Page::Compare) => self.neighbour(-1),
            KeyCode::Char(']') if matches!(self.page, Page::Corridor | Page::Compare) => self.neighbour(1),
            KeyCode::Char('b') if self.page == Page::Corridor => self.outage = None,
            code => return self.replay_key(code),
        }
        None
    }

    fn replay_key(&mut self, code: KeyCode) -> Option<Order> {
        let KeyCode::Char(key) = code else { return None };
        if self.playback().is_none() {
            if OF_A_REPLAY.contains(key) {
                self.notice = Some("That key is for a replay; this feed is live.".into());
            }
            return None;
        }
        Some(match key {
            ' ' => Order::Toggle,
            '+' | '=' => Order::Faster,
            '-' | '_' => Order::Slower,
            '.' => Order::StepForward,
            ',' => Order::StepBack,
            '>' => Order::Jump(TimeDelta::minutes(1)),
            '<' => Order::Jump(TimeDelta::minutes(-1)),
            ')' => Order::Jump(TimeDelta::minutes(10)),
            '(' => Order::Jump(TimeDelta::minutes(-10)),
            '}' => Order::Jump(TimeDelta::hours(1)),
            '{' => Order::Jump(TimeDelta::hours(-1)),
            't' => return self.ask(Typing::Time(String::new())),
            'n' => return self.ask(self.note_of_present()?),
            'e' => {
                self.toggle(Page::Events);
                return None;
            }
            _ => return self.jump_key(key),
        })
    }

    pub(super) fn ask(&mut self, what: Typing) -> Option<Order> {
        self.typing = Some(what);
        None
    }

    fn type_key(&mut self, code: KeyCode) -> Option<Order> {
        let typed = match self.typing.as_mut()? {
            Typing::Filter => &mut self.filter,
            Typing::Alarm(Prompt::Filter, _) => &mut self.alarms.filter,
            Typing::Events => &mut self.events.filter,
            Typing::Mark(mark) => &mut mark.note,
            Typing::Export => {
                self.typing = None;
                self.export = Export::of_key(code);
                return None;
            }
            Typing::Time(text) | Typing::Alarm(_, text) => text,
        };
        match code {
            KeyCode::Char(char) if typed.chars().count() < TYPED_MAX && !char.is_control() => typed.push(char),
            KeyCode::Backspace => drop(typed.pop()),
            KeyCode::Esc => match self.typing.take() {
                Some(Typing::Filter) => self.filter.clear(),
                Some(Typing::Alarm(Prompt::Filter, _)) => self.alarms.filter.clear(),
                Some(Typing::Events) => self.events.filter.clear(),
                _ => {}
            },
            KeyCode::Enter => match self.typing.take()? {
                Typing::Time(text) => {
                    let near = self.playback()?.now?;
                    match parse_time(&text, self.zone, near) {
                        Ok(time) => return Some(Order::Seek(time)),
                        Err(why) => self.notice = Some(why),
                    }
                }
                Typing::Alarm(prompt, text) => return self.alarm_typed(prompt, &text),
                Typing::Mark(mark) => return Some(self.set_mark(mark, "is set")),
                Typing::Filter | Typing::Events | Typing::Export => {}
            },
            KeyCode::Up => self.go(-1),
            KeyCode::Down => self.go(1),
            _ => {}
        }
        self.keep_cursor_in_sight();
        None
    }

    /// Moves by so many rows or lines, whatever the page holds.
    pub(super) fn go(&mut self, by: isize) {
        match self.page {
            Page::Overview => self.move_in(&self.rows(), by),
            Page::Events => self.walk_events(by),
            Page::Alarms if !self.alarms.history => self.walk_alarms(by),
            Page::Corridor if self.walks_outages() => self.walk_outages(by),
            _ => {
                let end = self.drawn.scroll_max;
                self.scroll = self.scroll.min(end).saturating_add_signed(by).min(end);
            }
        }
    }

    /// Whether the arrows go through the outages, rather than through lines.
    pub fn walks_outages(&self) -> bool {
        let page = self.panel.page(self.size);
        page.contains(&Panel::Outages) || page.contains(&Panel::Curves)
    }

    fn walk_outages(&mut self, by: isize) {
        let Some(track) = self.track(self.selected) else { return };
        let outages = &track.latest.outages;
        let here = self.outage(&track.latest).and_then(|here| outages.iter().position(|o| o.name == here.name));
        let next = moved(here.unwrap_or(0), by, outages.len());
        self.outage = outages.get(next).map(|outage| outage.name.clone());
    }

    fn neighbour(&mut self, by: isize) {
        self.move_in(&self.rows(), by);
        self.outage = None;
        self.scroll = 0;
    }

    fn move_in(&mut self, rows: &[usize], by: isize) {
        let here = rows.iter().position(|&row| row == self.selected).unwrap_or(0);
        if let Some(&row) = rows.get(moved(here, by, rows.len())) {
            self.selected = row;
        }
    }

    fn keep_cursor_in_sight(&mut self) {
        let rows = self.rows();
        if !rows.contains(&self.selected) {
            self.selected = rows.first().copied().unwrap_or(self.selected);
        }
    }

    fn screenful(&self) -> isize {
        isize::try_from(self.drawn.rows_shown.max(1)).unwrap_or(1)
    }

    /// Applies what is shown, if it can be applied.
    fn apply(&mut self) -> Option<Order> {
        let number = self.change().filter(|change| change.is_sound).map(|change| change.number)?;
        self.back(true);
        Some(Order::Apply(number))
    }

    pub(super) fn show(&mut self, panel: Panel) {
        self.panel = panel;
        self.scroll = 0;
    }

    pub(super) fn open(&mut self, page: Page) {
        if page == Page::Corridor {
            self.outage = None;
            self.panel = Panel::Outages;
        }
        self.alarms.history = false;
        self.page = page;
        self.scroll = 0;
    }

    pub(super) fn toggle(&mut self, page: Page) {
        if self.page == page {
            self.back(true);
        } else {
            if matches!(self.page, Page::Overview | Page::Corridor) {
                self.under = self.page;
            }
            self.open(page);
        }
    }

    fn back(&mut self, drop_filter: bool) {
        self.scroll = 0;
        match self.page {
            Page::Overview if drop_filter => self.filter.clear(),
            Page::Overview => {}
            Page::Corridor => self.page = Page::Overview,
            Page::Alarms | Page::Events | Page::Compare | Page::Change | Page::Messages | Page::Help => {
                self.page = self.under;
            }
        }
    }

    /// The name of the outage looked at.
    pub fn outage_name(&self) -> Option<Arc<str>> {
        self.outage(&self.track(self.selected)?.latest).map(|outage| outage.name.clone())
    }
}

fn moved(here: usize, by: isize, length: usize) -> usize {
    here.saturating_add_signed(by).min(length.saturating_sub(1))
}
