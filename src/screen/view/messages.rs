use ratatui::{
    layout::Rect,
    text::{Line, Span},
};

use super::{Theme, figures, text};
use crate::screen::state::{App, EVENTS_KEPT};

/// What happened, newest first.
pub fn lines(app: &App, theme: Theme, area: Rect) -> Vec<Line<'static>> {
    let width = usize::from(area.width);
    let mut lines = Vec::new();
    if let Some(parcel) = &app.parcel {
        for (what, report) in parcel.feed.reports() {
            lines.push(Line::raw(text::cut(&format!(" {what} {}: {}", report.name, report.standing), width)));
            for finding in &report.findings {
                lines.extend(
                    text::wrap(&format!("! {finding}"), width.saturating_sub(4), 2)
                        .into_iter()
                        .map(|line| Line::raw(format!("   {line}"))),
                );
            }
        }
    }
    lines.push(Line::styled(
        format!(" Changes of state, of data and of switches, newest first; the last {EVENTS_KEPT} are kept."),
        theme.quiet(),
    ));
    let above = lines.len();
    lines.extend(events(app, theme, width));
    if lines.len() == above {
        lines.push(Line::raw(" Nothing yet."));
    }
    lines
}

/// Every event on a line, newest first.
pub fn events(app: &App, theme: Theme, width: usize) -> impl Iterator<Item = Line<'static>> {
    let name_width = (width / 5).clamp(8, 24);
    let events = app.parcel.iter().flat_map(|parcel| parcel.chronicle.events.iter().rev());
    events.map(move |event| {
        let time = event.time.with_timezone(&app.zone).format(" %-d %b %H:%M:%S").to_string();
        let mark = event.state.map_or(Span::raw(" "), |state| Span::styled(theme.mark(state), theme.badge(state)));
        let corridor = text::left(event.corridor.as_deref().unwrap_or(figures::NONE), name_width);
        Line::from(vec![
            Span::styled(text::left(&time, 17), theme.quiet()),
            mark,
            Span::raw(format!(" {corridor} {}", text::cut(&event.text, width.saturating_sub(name_width + 20)))),
        ])
    })
}
