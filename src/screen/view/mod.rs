//! Pure functions of the state onto a frame.

mod actions;
mod alarm_line;
mod alarms;
mod banner;
mod card;
mod change;
mod compare;
mod corridor;
mod curves;
mod data;
mod difference;
mod digits;
mod events;
mod figures;
mod footer;
mod header;
mod help;
mod messages;
mod network;
mod outages;
mod overview;
mod row;
mod ruler;
mod sources;
mod subject;
mod text;
mod theme;
mod timebar;
mod trend;

use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    text::Line,
    widgets::Paragraph,
};

pub use theme::Theme;

use super::state::{App, Drawn, Page, Target};

/// The smallest terminal that is drawn on.
const SMALLEST: (u16, u16) = (40, 10);

/// Draws everything, and says what the drawing found out.
pub fn draw(frame: &mut Frame, app: &App, theme: Theme) -> Drawn {
    let area = frame.area();
    if area.width < SMALLEST.0 || area.height < SMALLEST.1 {
        let text = format!("{}×{} is too small: tautline needs {}×{}", area.width, area.height, SMALLEST.0, SMALLEST.1);
        let lines = text::wrap(&text, usize::from(area.width), 0).into_iter().map(Line::from).collect::<Vec<_>>();
        frame.render_widget(Paragraph::new(lines), area);
        return Drawn::default();
    }
    let banner = banner::line(app, theme, usize::from(area.width));
    let [head, alarm, warn, body, time, foot] = Layout::vertical([
        Constraint::Length(1),
        Constraint::Length(1),
        Constraint::Length(u16::from(banner.is_some())),
        Constraint::Fill(1),
        Constraint::Length(timebar::height(app, area)),
        Constraint::Length(1),
    ])
    .areas(area);

    frame.render_widget(header::line(app, theme, usize::from(head.width)), head);
    frame.render_widget(alarm_line::line(app, theme, usize::from(alarm.width)), alarm);
    if let Some(banner) = banner {
        frame.render_widget(banner, warn);
    }
    let mut drawn = match app.page {
        Page::Overview => overview::draw(frame, body, app, theme),
        Page::Corridor => corridor::draw(frame, body, app, theme),
        Page::Alarms => alarms::draw(frame, body, app, theme),
        Page::Events => events::draw(frame, body, app, theme),
        Page::Compare => scrolled(frame, body, app.scroll, compare::lines(app, theme, body)),
        Page::Change => scrolled(frame, body, app.scroll, change::lines(app, theme, usize::from(body.width))),
        Page::Messages => scrolled(frame, body, app.scroll, messages::lines(app, theme, body)),
        Page::Help => scrolled(frame, body, app.scroll, help::lines(theme, usize::from(body.width))),
    };
    drawn.targets.push((alarm, Target::Alarms));
    if let Some(playback) = app.playback() {
        drawn.targets.extend(timebar::draw(frame, time, app, playback, theme));
    }
    frame.render_widget(footer::line(app, theme, usize::from(foot.width)), foot);
    drawn
}

/// Lines that may be more than fit, from the first one shown.
fn scrolled(frame: &mut Frame, area: Rect, scroll: usize, lines: Vec<Line>) -> Drawn {
    let rows_shown = usize::from(area.height);
    let scroll_max = lines.len().saturating_sub(rows_shown);
    let shown: Vec<_> = lines.into_iter().skip(scroll.min(scroll_max)).take(rows_shown).collect();
    frame.render_widget(Paragraph::new(shown), area);
    Drawn { rows_shown, scroll_max, ..Drawn::default() }
}

/// One row of an area; empty where the area has no such row.
fn row(area: Rect, index: u16) -> Rect {
    Rect { y: area.y.saturating_add(index), height: 1, ..area }.intersection(area)
}
