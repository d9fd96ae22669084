//! The alarm page: what it shows, which alarm has the cursor, and what keys do there.

use std::ops::ControlFlow;

use chrono::TimeDelta;
use crossterm::event::KeyCode;

use super::{App, Page, Typing};
use crate::{
    alarm::{Action, Alarm, AlarmId, Priority, State},
    screen::connection::{AlarmKey, AlarmOrder, AlarmReport, Order, Seen, Wish},
};

/// What the screen remembers of the alarm page.
#[derive(Debug, Default)]
pub struct AlarmPage {
    /// The alarm with the cursor; `None`: the first.
    pub chosen: Option<AlarmKey>,
    /// What the list is narrowed to; empty: everything.
    pub filter: String,
    /// Whether normal alarms are listed too.
    pub all: bool,
    /// Whether the history of the chosen alarm is shown instead of the list.
    pub history: bool,
    /// Orders that are not answered yet, and the alarms they are about.
    pending: Vec<(u64, Vec<AlarmKey>)>,
    /// Number of the last order.
    ordered: u64,
    /// A bell is to be rung.
    bell: bool,
}

/// What is being typed on the alarm page.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Prompt {
    /// What the list is narrowed to; it applies as it is typed.
    Filter,
    /// For how long and why to shelve.
    Shelve,
    /// Why it goes out of service.
    OutOfService,
    /// A note.
    Note,
}

impl App {
    /// Everything known of alarms; `None` before anything came.
    pub fn alarm_report(&self) -> Option<&AlarmReport> {
        self.parcel.as_ref().map(|parcel| &parcel.alarms)
    }

    /// The alarms listed: those that wait to be acknowledged first, and the newest of them on top.
    pub fn alarm_rows(&self) -> Vec<AlarmId> {
        let Some(report) = self.alarm_report() else { return Vec::new() };
        let board = &report.alarms.board;
        let mut rows = board.abnormal();
        if self.alarms.all {
            let normal = board.alarms().filter(|(_, alarm)| alarm.standing.state == State::Normal);
            rows.extend(normal.map(|(id, _)| id));
        }
        let wanted = self.alarms.filter.to_lowercase();
        let fits = |id: &AlarmId| {
            let (Some(alarm), Some(corridor)) = (board.get(*id), board.corridors.get(id.corridor)) else {
                return false;
            };
            let definition = &alarm.definition;
            [alarm.standing.state.word(), definition.priority.word()].iter().any(|word| word.starts_with(&wanted))
                || [&**corridor.corridor(), &definition.name].iter().any(|name| name.to_lowercase().contains(&wanted))
        };
        if !wanted.is_empty() {
            rows.retain(fits);
        }
        rows
    }

    /// The alarm with the cursor, of those listed, and its place among them.
    pub fn chosen_alarm(&self, rows: &[AlarmId]) -> Option<(usize, AlarmId)> {
        let board = &self.alarm_report()?.alarms.board;
        let chosen = self.alarms.chosen.as_ref().and_then(|key| key.find(board));
        let place = chosen.and_then(|id| rows.iter().position(|row| *row == id)).unwrap_or(0);
        Some((place, *rows.get(place)?))
    }

    /// The key of the alarm with the cursor, as it was drawn last: what the operator saw is what he acts on.
    fn seen_alarm(&self) -> Option<&Seen> {
        self.drawn.alarms.get(self.drawn.alarm_cursor)
    }

    /// Whether an order about an alarm waits for its answer.
    pub fn is_pending(&self, key: &AlarmKey) -> bool {
        self.alarms.pending.iter().any(|(_, keys)| keys.contains(key))
    }

    /// Whether something blinks, so that the picture changes by itself.
    pub fn blinks(&self) -> bool {
        self.settings.blink && self.alarm_report().is_some_and(|report| report.alarms.calls())
    }

    /// Whether what blinks is at its brighter: every other second, by this computer's clock.
    pub fn is_lit(&self) -> bool {
        !self.settings.blink || self.clock.saturating_duration_since(self.started).as_secs().is_multiple_of(2)
    }

    /// Whether the bell is to be rung now; once for all that was raised since the last time.
    pub fn rings(&mut self) -> bool {
        std::mem::take(&mut self.alarms.bell)
    }

    /// Takes in what became of orders, and what is to be heard. To be called before the parcel is replaced.
    pub(super) fn receive_alarms(&mut self, report: &AlarmReport) {
        let waited = self.alarms.pending.iter().any(|(number, _)| *number == report.answered);
        self.alarms.pending.retain(|(number, _)| *number > report.answered);
        if waited && report.refusal.is_some() {
            self.notice.clone_from(&report.refusal);
        }
        // The cursor stays where the operator saw it when others come in above.
        if self.page == Page::Alarms && self.alarms.chosen.is_none() {
            self.alarms.chosen = self.seen_alarm().map(|seen| seen.key.clone());
        }
        if let (Some(before), None) = (self.alarm_report(), self.playback()) {
            let (was, is) = (before.alarms.raised, report.alarms.raised);
            let rung = |priority: &Priority| is[*priority as usize] > was[*priority as usize];
            self.alarms.bell |= self.settings.bell.iter().any(rung);
        }
    }

    /// An order found no way out: nothing of it was done.
    pub fn refused(&mut self) {
        self.events.asked = None;
        self.jumps.landed = None;
        self.alarms.pending.retain(|(number, _)| *number != self.alarms.ordered);
        self.notice = Some("That was not done: too much is waiting. Press it again.".into());
    }

    fn order(&mut self, keys: Vec<AlarmKey>, wish: Wish) -> Order {
        self.alarms.ordered += 1;
        let number = self.alarms.ordered;
        self.alarms.pending.push((number, keys));
        Order::Alarm(AlarmOrder { number, wish })
    }

    /// Answers a key on the alarm page; those that mean the same everywhere go on.
    pub(super) fn alarm_key(&mut self, code: KeyCode) -> ControlFlow<Option<Order>> {
        let seen = self.seen_alarm().cloned();
        let KeyCode::Char(key) = code else {
            return match code {
                KeyCode::Enter => ControlFlow::Break(seen.and_then(|seen| self.visit(&seen))),
                KeyCode::Tab | KeyCode::BackTab => {
                    ControlFlow::Break(seen.and_then(|seen| self.turn_history(seen.key)))
                }
                KeyCode::Esc if self.alarms.history => {
                    self.alarms.history = false;
                    ControlFlow::Break(None)
                }
                KeyCode::Esc if !self.alarms.filter.is_empty() => {
                    self.alarms.filter.clear();
                    ControlFlow::Break(None)
                }
                _ => ControlFlow::Continue(()),
            };
        };
        let order = match key {
            '/' if !self.alarms.history => self.ask_about(Prompt::Filter),
            'v' if !self.alarms.history => {
                self.alarms.all = !self.alarms.all;
                None
            }
            'Y' if !self.alarms.history => {
                let shown = self.drawn.alarms.clone();
                self.acknowledge(shown, None)
            }
            'y' => seen.and_then(|seen| {
                let next = self.drawn.alarms.get(self.drawn.alarm_cursor + 1).map(|next| next.key.clone());
                self.acknowledge(vec![seen], next)
            }),
            'z' if seen.is_some() => self.ask_about(Prompt::Shelve),
            'o' if seen.is_some() => self.ask_about(Prompt::OutOfService),
            'n' if seen.is_some() => self.ask_about(Prompt::Note),
            'u' => seen.and_then(|seen| self.bring_back(seen.key)),
            _ => return ControlFlow::Continue(()),
        };
        ControlFlow::Break(order)
    }

    fn ask_about(&mut self, prompt: Prompt) -> Option<Order> {
        self.alarms.chosen = self.seen_alarm().map(|seen| seen.key.clone());
        self.typing = Some(Typing::Alarm(prompt, String::new()));
        None
    }

    fn listed(&self, key: &AlarmKey) -> Option<&Alarm> {
        self.alarm_report()?.alarms.get(key)
    }

    fn acknowledge(&mut self, mut seen: Vec<Seen>, next: Option<AlarmKey>) -> Option<Order> {
        seen.retain(|seen| self.listed(&seen.key).is_some_and(|alarm| alarm.standing.state.calls()));
        if seen.is_empty() {
            self.notice = Some("Nothing here waits to be acknowledged.".into());
            return None;
        }
        if !self.alarms.history {
            self.alarms.chosen = next;
        }
        let keys = seen.iter().map(|seen| seen.key.clone()).collect();
        Some(self.order(keys, Wish::Acknowledge(seen)))
    }

    fn bring_back(&mut self, key: AlarmKey) -> Option<Order> {
        let action = match self.listed(&key)?.standing.state {
            State::Shelved => Action::Unshelve,
            State::OutOfService => Action::ReturnToService,
            state => {
                self.notice =
                    Some(format!("It is {state}: only what is shelved or out of service can be brought back."));
                return None;
            }
        };
        Some(self.order(vec![key.clone()], Wish::Act(key, action)))
    }

    /// Shows or hides the history of an alarm.
    fn turn_history(&mut self, key: AlarmKey) -> Option<Order> {
        self.alarms.history = !self.alarms.history;
        self.scroll = 0;
        self.alarms.chosen = Some(key.clone());
        let is_asked = self.alarms.history && self.playback().is_none();
        is_asked.then(|| self.order(Vec::new(), Wish::History(key)))
    }

    /// Opens the corridor of an alarm; in a replay at the moment at which it was raised.
    pub(super) fn visit(&mut self, seen: &Seen) -> Option<Order> {
        let corridor = self.grid.corridors.iter().position(|corridor| corridor.name == seen.key.corridor)?;
        self.selected = corridor;
        self.filter.clear();
        self.open(Page::Corridor);
        self.playback().and(seen.raised).map(Order::Seek)
    }

    /// Moves the cursor of the list.
    pub(super) fn walk_alarms(&mut self, by: isize) {
        let rows = self.alarm_rows();
        let Some((here, _)) = self.chosen_alarm(&rows) else { return };
        let place = here.saturating_add_signed(by).min(rows.len().saturating_sub(1));
        let board = self.alarm_report().map(|report| report.alarms.board.clone());
        self.alarms.chosen = board.and_then(|board| AlarmKey::of(&board, *rows.get(place)?));
    }

    /// Does what was typed; what cannot be understood stays to be mended.
    pub(super) fn alarm_typed(&mut self, prompt: Prompt, text: &str) -> Option<Order> {
        let text = text.trim();
        let key = self.alarms.chosen.clone()?;
        let wish = match prompt {
            Prompt::Filter => return None,
            Prompt::Shelve => match shelving(text) {
                Ok((span, reason)) => Wish::Shelve { key: key.clone(), span, reason: reason.into() },
                Err(why) => {
                    self.typing = Some(Typing::Alarm(prompt, text.into()));
                    self.notice = Some(why.into());
                    return None;
                }
            },
            Prompt::OutOfService => Wish::Act(key.clone(), Action::RemoveFromService { reason: text.into() }),
            Prompt::Note => Wish::Note(key.clone(), text.into()),
        };
        Some(self.order(vec![key], wish))
    }
}

/// A time and a reason: `30m switching at Velm`, `2h …`, or minutes without a unit.
fn shelving(text: &str) -> Result<(TimeDelta, &str), &'static str> {
    let wrong = "Write how long and why: 30m switching at Velm, or 2h and a reason; 24h at most.";
    let (span, reason) = text.split_once(char::is_whitespace).ok_or(wrong)?;
    let digits = span.trim_end_matches(['m', 'h']);
    let unit_min = match &span[digits.len()..] {
        "" | "m" => 1,
        "h" => 60,
        _ => return Err(wrong),
    };
    let count: u32 = digits.parse().map_err(|_| wrong)?;
    let minutes = i64::from(count) * unit_min;
    if minutes == 0 || minutes > 24 * 60 {
        return Err("An alarm can be shelved for 1 minute to 24 hours; take it out of service (o) for longer.");
    }
    Ok((TimeDelta::minutes(minutes), reason.trim()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shelvings_are_read_as_people_write_them() {
        for (text, minutes, reason) in [
            ("30m switching at Velm", 30, "switching at Velm"),
            ("2h  works", 120, "works"),
            ("45 test", 45, "test"),
            ("24h x", 1440, "x"),
        ] {
            assert_eq!(shelving(text), Ok((TimeDelta::minutes(minutes), reason)), "{text}");
        }
        for text in [
            "",
            "30m",
            "works",
            "m works",
            "30s works",
            "30mh works",
            "0m works",
            "25h works",
            "-5m works",
            "99999999999h x",
        ] {
            assert!(shelving(text).is_err(), "{text}");
        }
    }
}
