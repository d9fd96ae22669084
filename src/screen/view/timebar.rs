//! The whole recording on one line, with what happened in it above, or on it where there is no room.

use std::sync::Arc;

use chrono::{DateTime, TimeDelta, Utc};
use ratatui::{
    Frame,
    layout::Rect,
    style::Style,
    text::{Line, Span},
};
use unicode_width::UnicodeWidthStr;

use super::{Theme, figures, row, text};
use crate::{
    desk::State,
    screen::{
        connection::Playback,
        state::{App, Moment, Page, Strip, Target},
    },
};

/// A terminal of this height has a line for signs.
const HEIGHT_FOR_SIGNS: u16 = 30;
/// Where there is none, only what weighs as much as this has its sign on the bar itself.
const WEIGHTY: u8 = 6;

/// Lines that it takes of a terminal.
pub fn height(app: &App, terminal: Rect) -> u16 {
    match app.playback() {
        None => 0,
        Some(_) if terminal.height < HEIGHT_FOR_SIGNS => 1,
        Some(_) => 2,
    }
}

/// Play or pause, speed, time, and the whole recording with its states and events.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, playback: &Playback, theme: Theme) -> Vec<(Rect, Target)> {
    let now = playback.now.map_or(figures::NONE.into(), |now| figures::clock(now, app.zone));
    let mark = if playback.seeking.is_some() {
        "»"
    } else if playback.playing {
        "▶"
    } else {
        "‖"
    };
    let head = format!(" {mark} ×{:<4} {now} ", playback.speed);
    let line = row(area, area.height.saturating_sub(1));
    let survey = &playback.survey;
    let Some((first, last)) = survey.extent else {
        let known = format!("{head} frame {} · measuring the recording…", playback.taken);
        frame.render_widget(Line::raw(known), line);
        return Vec::new();
    };
    let long = last - first > TimeDelta::hours(24);
    let label = |time: DateTime<Utc>| {
        time.with_timezone(&app.zone).format(if long { "%-d %b %H:%M" } else { "%H:%M" }).to_string()
    };
    let progress = if survey.ended { String::new() } else { format!(" {:.0} %", 100.0 * survey.done()) };
    let (left, right) = (format!("{} ", label(first)), format!(" {}{progress}", label(last)));
    let before = head.width() + left.width();
    let width = usize::from(area.width).saturating_sub(before + right.width() + 1);
    let bar = Bar { first, last, width };
    let at = Rect { x: area.x + u16::try_from(before).unwrap_or(0), width: u16::try_from(width).unwrap_or(0), ..area };

    let signs = bar.signs(app);
    let on_bar = area.height == 1;
    let mut spans = vec![Span::styled(head, theme.strong()), Span::styled(left, theme.quiet())];
    spans.extend(bar.cells(app, playback, if on_bar { &signs } else { &[] }, theme));
    spans.push(Span::styled(right, theme.quiet()));
    frame.render_widget(Line::from(spans), line);

    let mut targets = Vec::new();
    if !on_bar {
        let scope = own(app).map_or("all corridors", |(name, _)| name);
        let mut spans = vec![Span::styled(text::left(&format!(" {scope}"), before), theme.quiet())];
        spans.extend(signs.iter().map(|sign| sign.as_ref().map_or(Span::raw(" "), |sign| sign.span(theme))));
        frame.render_widget(Line::from(spans), row(area, 0));
        for (x, sign) in (at.x..).zip(&signs) {
            let here = Rect { x, width: 1, ..row(area, 0) }.intersection(area);
            targets.extend(sign.iter().map(|sign| (here, Target::Moment(sign.moment.clone()))));
        }
    }
    targets.push((Rect { width: at.width, x: at.x, ..line }.intersection(area), Target::Time(first, last)));
    targets
}

/// On the page of a corridor its name and its states.
fn own(app: &App) -> Option<(&str, Option<&Strip>)> {
    let corridor = app.corridor().filter(|_| app.page == Page::Corridor)?;
    Some((&corridor.name, app.playback().and_then(|playback| playback.survey.states.get(app.selected))))
}

/// A stretch of time on so many cells.
struct Bar {
    first: DateTime<Utc>,
    last: DateTime<Utc>,
    width: usize,
}

/// What weighs most in a cell.
struct Sign {
    moment: Arc<Moment>,
    /// Of the corridor with the cursor, or of all.
    is_near: bool,
}

impl Bar {
    fn whole_s(&self) -> i64 {
        (self.last - self.first).num_seconds().max(1)
    }

    fn time(&self, cell: usize) -> DateTime<Utc> {
        let width = i64::try_from(self.width.max(1)).unwrap_or(1);
        self.first + TimeDelta::seconds(self.whole_s() * i64::try_from(cell).unwrap_or(0) / width)
    }

    fn cell(&self, time: DateTime<Utc>) -> usize {
        let into_s = (time - self.first).num_seconds().clamp(0, self.whole_s());
        let cell = into_s * i64::try_from(self.width).unwrap_or(0) / self.whole_s();
        usize::try_from(cell).unwrap_or(0).min(self.width.saturating_sub(1))
    }

    fn signs(&self, app: &App) -> Vec<Option<Sign>> {
        let mut cells: Vec<Option<Sign>> = Vec::new();
        cells.resize_with(self.width, || None);
        let here = app.corridor().map(|corridor| &corridor.name);
        for moment in app.moments() {
            if weight(&moment) == 0 || moment.time < self.first || moment.time > self.last {
                continue;
            }
            let is_near = moment.corridor.is_none() || moment.corridor.as_ref() == here;
            let Some(cell) = cells.get_mut(self.cell(moment.time)) else { continue };
            let sign = Sign { moment, is_near };
            if cell.as_ref().is_none_or(|other| sign.weight() > other.weight()) {
                *cell = Some(sign);
            }
        }
        cells
    }

    fn cells(&self, app: &App, playback: &Playback, signs: &[Option<Sign>], theme: Theme) -> Vec<Span<'static>> {
        let survey = &playback.survey;
        let states = own(app).and_then(|(_, states)| states).unwrap_or(&survey.worst);
        let here = playback.now.map(|now| self.cell(now));
        let cell = |cell: usize| {
            let state = states.worst_between(self.time(cell), self.time(cell + 1));
            let (symbol, style) = match state {
                None if !survey.ended && survey.until.is_none_or(|until| until < self.time(cell)) => {
                    ("┈", theme.quiet())
                }
                None => ("─", theme.quiet()),
                Some(State::Ample) => ("━", Style::new()),
                Some(state) => (theme.mark(state), theme.badge(state)),
            };
            let sign = signs.get(cell).and_then(Option::as_ref);
            if here == Some(cell) {
                Span::styled("◆", style.patch(theme.strong()))
            } else if let Some(sign) = sign.filter(|sign| sign.is_near && weight(&sign.moment) >= WEIGHTY) {
                let of_sign = sign.span(theme);
                Span::styled(of_sign.content, if style.bg.is_some() { style } else { of_sign.style })
            } else {
                Span::styled(symbol, style)
            }
        };
        (0..self.width).map(cell).collect()
    }
}

impl Sign {
    /// What is near is worth more, but a trip elsewhere is worth more than a meter here.
    fn weight(&self) -> u8 {
        weight(&self.moment) + if self.is_near { 5 } else { 0 }
    }

    fn span(&self, theme: Theme) -> Span<'static> {
        let (sign, style) = theme.sign(self.moment.kind);
        Span::styled(sign, if self.is_near { style.patch(theme.strong()) } else { theme.quiet() })
    }
}

/// What is worth more of a cell than something else; nothing: states are on the bar, and steps are too many.
fn weight(moment: &Moment) -> u8 {
    use crate::{
        alarm::Priority::{High, Urgent},
        events::EventKind::{Act, Alarm, Bypass, Direction, Gap, Insertion, Meter, Program, Return, State, Step, Trip},
        screen::state::MomentKind::{Event, Low, Mark, Raised},
    };
    match moment.kind {
        Event(State | Step | Alarm | Act | Program) => 0,
        Event(Meter) => 1,
        Event(Direction) => 2,
        Low { of_day: false, .. } => 3,
        Event(Return | Insertion) => 4,
        Raised(Urgent | High) => 6,
        Raised(_) => 5,
        Low { of_day: true, .. } => 7,
        Event(Gap | Bypass) => 8,
        Event(Trip) => 9,
        Mark => 10,
    }
}
