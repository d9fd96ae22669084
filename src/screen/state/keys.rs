use std::{ops::ControlFlow, sync::Arc};

use chrono::TimeDelta;
use crossterm::event::{KeyCode, KeyEvent, KeyEventKind, KeyModifiers};

use super::{App, Page, Panel, Prompt, Sort, Typing, parse_time};
use crate::screen::connection::Order;

/// Longest line that can be typed.
const TYPED_MAX: usize = 200;

/// Every key, with what it does: the help page prints this.
pub const KEYS: [(&str, &[(&str, &str)]); 4] = [
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
        "Mouse",
        &[
            (
                "click",
                "choose a corridor, an outage, an alarm, a part, a place on the time bar; again to open the corridor",
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
        self.notice = None;
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
        match key.code {
            KeyCode::Char('q') => self.leaving = true,
            KeyCode::Char('?') => self.toggle(Page::Help),
            KeyCode::Char('a') => self.toggle(Page::Alarms),
            KeyCode::Char('m') => self.toggle(Page::Messages),
            KeyCode::Char('c') => self.toggle(Page::Change),
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
            KeyCode::Char('[') if self.page == Page::Corridor => self.neighbour(-1),
            KeyCode::Char(']') if self.page == Page::Corridor => self.neighbour(1),
            KeyCode::Char('b') if self.page == Page::Corridor => self.outage = None,
            code => return self.replay_key(code),
        }
        None
    }

    fn replay_key(&mut self, code: KeyCode) -> Option<Order> {
        let KeyCode::Char(key) = code else { return None };
        let order = match key {
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
            't' if self.playback().is_some() => {
                self.typing = Some(Typing::Time(String::new()));
                return None;
            }
            _ => return None,
        };
        if self.playback().is_none() {
            self.notice = Some("That key is for a replay; this feed is live.".into());
            return None;
        }
        Some(order)
    }

    fn type_key(&mut self, code: KeyCode) -> Option<Order> {
        let typed = match self.typing.as_mut()? {
            Typing::Filter => &mut self.filter,
            Typing::Alarm(Prompt::Filter, _) => &mut self.alarms.filter,
            Typing::Time(text) | Typing::Alarm(_, text) => text,
        };
        match code {
            KeyCode::Char(char) if typed.chars().count() < TYPED_MAX && !char.is_control() => typed.push(char),
            KeyCode::Backspace => drop(typed.pop()),
            KeyCode::Esc => match self.typing.take() {
                Some(Typing::Filter) => self.filter.clear(),
                Some(Typing::Alarm(Prompt::Filter, _)) => self.alarms.filter.clear(),
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
                Typing::Filter => {}
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
            Page::Alarms | Page::Change | Page::Messages | Page::Help => self.page = self.under,
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
