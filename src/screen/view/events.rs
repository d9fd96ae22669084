//! The page of events and marks.

use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    style::Style,
    text::{Line, Span},
    widgets::Paragraph,
};

use super::{Theme, figures, overview::first_in_sight, row::cursor, subject::paragraph, text};
use crate::screen::state::{App, Drawn, Moment, MomentKind, Survey, Target};

/// Cursor, place, time, state, sign and word, and all gaps.
const FIXED: usize = 36;
/// Lines about the moment with the cursor.
const ABOUT: u16 = 4;

/// Draws the page.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, theme: Theme) -> Drawn {
    let Some(playback) = app.playback() else {
        frame.render_widget(Line::raw("  Only a recording can be gone through; this feed is live."), area);
        return Drawn::default();
    };
    let about = if area.height >= 16 { ABOUT } else { 0 };
    let [heading, list, lower] =
        Layout::vertical([Constraint::Length(1), Constraint::Fill(1), Constraint::Length(about)]).areas(area);
    let rows = app.event_rows();
    let width = usize::from(area.width);
    frame.render_widget(
        Line::styled(text::cut(&heading_words(app, &playback.survey, rows.len()), width), theme.quiet()),
        heading,
    );
    if rows.is_empty() {
        let words =
            "None of these kinds with these words. v goes through the kinds, / takes other words, Esc drops them.";
        frame.render_widget(Paragraph::new(paragraph(words, width)), list);
        return Drawn::default();
    }
    let place = app.event_cursor(&rows);
    let rows_shown = usize::from(list.height).max(1);
    let first_row = first_in_sight(app.drawn.first_row, place, rows_shown, rows.len());
    let mut drawn = Drawn { first_row, rows_shown, ..Drawn::default() };
    let present = rows.partition_point(|row| Some(row.time) <= app.present()).checked_sub(1);
    for (index, (number, moment)) in (0u16..).zip(rows.iter().enumerate().skip(first_row).take(rows_shown)) {
        let at = super::row(list, index);
        let place = Place { chosen: number == place, present: Some(number) == present };
        frame.render_widget(line(app, moment, place, theme, width), at);
        drawn.targets.push((at, Target::Moment(moment.clone())));
    }
    if let Some(moment) = rows.get(place) {
        frame.render_widget(Paragraph::new(about_lines(app, moment, theme, width)), lower);
    }
    drawn
}

fn heading_words(app: &App, survey: &Survey, count: usize) -> String {
    let filter = &app.events.filter;
    let with = if filter.is_empty() { String::new() } else { format!(" with “{}”", text::cut(filter, 24)) };
    let so_far = match &survey.trouble {
        Some(trouble) => format!(" · the recording cannot be read on: {trouble}"),
        None if survey.ended => String::new(),
        None => format!(" · {:.0} % of the recording gone through", 100.0 * survey.done()),
    };
    let left_out =
        if survey.left_out > 0 { format!(" · {} more are not listed", survey.left_out) } else { String::new() };
    format!(" {count}: {}{with} (v){so_far}{left_out}", app.events.kinds.words())
}

#[derive(Clone, Copy)]
struct Place {
    /// It has the cursor.
    chosen: bool,
    /// It is the last one up to where we are.
    present: bool,
}

fn line(app: &App, moment: &Moment, place: Place, theme: Theme, width: usize) -> Line<'static> {
    let name_width = (width / 5).clamp(8, 24);
    let time = moment.time.with_timezone(&app.zone).format("%-d %b %H:%M:%S").to_string();
    let (sign, style) = theme.sign(moment.kind);
    let state = moment.state.map_or(Span::raw(" "), |state| Span::styled(theme.mark(state), theme.badge(state)));
    let is_own = moment.corridor.is_some() && moment.corridor.as_ref() == app.corridor().map(|corridor| &corridor.name);
    let strong = if place.chosen { theme.strong() } else { Style::new() };
    let words = moment_words(moment);
    Line::from(vec![
        Span::raw(cursor(place.chosen)),
        Span::styled(if place.present { "◆ " } else { "  " }, theme.strong()),
        Span::styled(text::right(&time, 15), theme.quiet()),
        Span::raw(" "),
        state,
        Span::raw(" "),
        Span::styled(sign, style),
        Span::styled(format!(" {}", text::left(moment.kind.word(), 9)), strong),
        Span::raw(" "),
        Span::styled(
            text::left(moment.corridor.as_deref().unwrap_or(figures::NONE), name_width),
            if is_own { theme.strong() } else { Style::new() },
        ),
        Span::styled(format!(" {}", text::cut(words, width.saturating_sub(FIXED + name_width))), strong),
    ])
}

fn moment_words(moment: &Moment) -> &str {
    if moment.kind == MomentKind::Mark && moment.text.is_empty() { "(no note)" } else { &moment.text }
}

fn about_lines(app: &App, moment: &Moment, theme: Theme, width: usize) -> Vec<Line<'static>> {
    let mut lines = vec![Line::styled("─".repeat(width), theme.quiet())];
    let words = format!("{}: {}", moment.corridor.as_deref().unwrap_or("all corridors"), moment_words(moment));
    lines.extend(paragraph(&words, width).into_iter().take(2));
    if let Some(playback) = app.playback() {
        let marks = &playback.marks;
        let kept = marks.trouble.as_ref().unwrap_or(&marks.place);
        let count = marks.marks.len();
        let words = format!(" {count} mark{}, {kept}", if count == 1 { "" } else { "s" });
        lines.resize(usize::from(ABOUT) - 1, Line::default());
        lines.push(Line::styled(text::cut(&words, width), theme.quiet()));
    }
    lines
}
