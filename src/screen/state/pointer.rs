use std::sync::Arc;

use chrono::{DateTime, Utc};
use crossterm::event::{MouseButton, MouseEvent, MouseEventKind};
use ratatui::layout::{Position, Rect};

use super::{App, Moment, Page, Panel};
use crate::screen::connection::{Order, Seen};

/// What a drawing found out that keys and the mouse need to know.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Drawn {
    /// First row of the list that was shown.
    pub first_row: usize,
    /// Rows of the list that fit.
    pub rows_shown: usize,
    /// Furthest that a long page scrolls.
    pub scroll_max: usize,
    /// Alarms in sight, as they were.
    pub alarms: Vec<Seen>,
    /// Which of them has the cursor.
    pub alarm_cursor: usize,
    /// What can be clicked.
    pub targets: Vec<(Rect, Target)>,
}

/// Something to click.
#[derive(Debug, Clone, PartialEq)]
pub enum Target {
    /// A corridor of the overview.
    Corridor(usize),
    /// An outage of the list.
    Outage(Arc<str>),
    /// The line of alarms.
    Alarms,
    /// An alarm of the list.
    Alarm(Seen),
    /// A tab or a panel.
    Panel(Panel),
    /// A moment of a recording.
    Moment(Arc<Moment>),
    /// A stretch of time, from the left edge to the right.
    Time(DateTime<Utc>, DateTime<Utc>),
}

impl App {
    /// Answers the mouse.
    pub fn mouse(&mut self, mouse: MouseEvent) -> Option<Order> {
        match mouse.kind {
            MouseEventKind::ScrollUp => self.go(-3),
            MouseEventKind::ScrollDown => self.go(3),
            MouseEventKind::Down(MouseButton::Left) => {
                let order = self.click(Position::new(mouse.column, mouse.row))?;
                self.note_order(&order);
                return Some(order);
            }
            _ => {}
        }
        None
    }

    fn click(&mut self, position: Position) -> Option<Order> {
        let (area, target) = self.drawn.targets.iter().find(|(area, _)| area.contains(position))?.clone();
        match target {
            Target::Corridor(index) if index == self.selected => self.open(Page::Corridor),
            Target::Corridor(index) => self.selected = index,
            Target::Outage(name) => self.outage = Some(name),
            Target::Alarms if self.page == Page::Alarms => {}
            Target::Alarms => self.toggle(Page::Alarms),
            Target::Alarm(seen) if self.alarms.chosen.as_ref() == Some(&seen.key) => return self.visit(&seen),
            Target::Alarm(seen) => self.alarms.chosen = Some(seen.key),
            Target::Panel(panel) => self.show(panel),
            Target::Moment(moment) if self.page == Page::Events && self.events.chosen.as_ref() != Some(&moment) => {
                self.events.chosen = Some(moment);
            }
            Target::Moment(moment) if self.page == Page::Events => return Some(self.go_to_listed(&moment)),
            Target::Moment(moment) => return Some(self.visit_moment(&moment, "")),
            Target::Time(from, until) => {
                let share = f64::from(position.x - area.x) / f64::from(area.width.max(1));
                let whole_ms = (until - from).num_milliseconds() as f64;
                #[allow(clippy::cast_possible_truncation, reason = "within the recording")]
                return Some(Order::Seek(from + chrono::TimeDelta::milliseconds((share * whole_ms) as i64)));
            }
        }
        None
    }
}
