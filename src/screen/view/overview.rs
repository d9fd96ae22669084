//! All corridors: as cards where they fit, else in four lines each, in two, or in one on a wide screen.

use std::iter;

use ratatui::{Frame, layout::Rect, text::Line, widgets::Paragraph};

use super::{
    Theme, card, messages,
    row::{Columns, Form},
    ruler, text,
};
use crate::screen::state::{App, Drawn, Target};

/// Narrower than this, cards do not read.
const CARD_WIDTH: u16 = 100;
/// From this width a corridor fits on one line.
const LINE_WIDTH: u16 = 160;

/// Rows left over from which the latest messages are worth showing.
const NEWS_HEIGHT: u16 = 4;

/// Draws the overview.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, theme: Theme) -> Drawn {
    let rows = app.rows();
    if app.parcel.as_ref().is_none_or(|parcel| parcel.chronicle.tracks.is_empty()) {
        return waiting(frame, area, app);
    }
    if rows.is_empty() {
        let text = format!(
            "No corridor’s name contains “{}”, and no state begins with it. Esc shows all.",
            text::clean(&app.filter)
        );
        frame.render_widget(Paragraph::new(text), area);
        return Drawn::default();
    }
    let count = u16::try_from(rows.len()).unwrap_or(u16::MAX);
    let cards = area.width >= CARD_WIDTH && count.saturating_mul(card::HEIGHT) < area.height;
    let room = area.height.saturating_sub(2);
    let form = if count.saturating_mul(Form::Tall.height()) <= room + 1 {
        Form::Tall
    } else if area.width >= LINE_WIDTH && count.saturating_mul(Form::Pair.height()) > room {
        Form::Line
    } else {
        Form::Pair
    };
    let columns = Columns::new(usize::from(area.width), form);

    let heading =
        if cards { vec![Line::styled(format!("  {}", ruler::LEGEND), theme.quiet())] } else { columns.heading(theme) };
    let heading_height = u16::try_from(heading.len()).unwrap_or(0);
    frame.render_widget(Paragraph::new(heading), area);
    let list = Rect { y: area.y + heading_height, height: area.height.saturating_sub(heading_height), ..area };

    let height = if cards { card::HEIGHT } else { form.height() };
    let rows_shown = usize::from(list.height / height).max(1);
    let cursor = rows.iter().position(|&row| row == app.selected).unwrap_or(0);
    let first_row = first_in_sight(app.drawn.first_row, cursor, rows_shown, rows.len());

    let mut targets = Vec::new();
    for (place, &index) in (0u16..).zip(rows.iter().skip(first_row).take(rows_shown)) {
        let at = Rect { y: list.y + place * height, height, ..list }.intersection(list);
        let chosen = index == app.selected;
        match app.track(index) {
            Some(track) if cards => card::draw(frame, at, track, chosen, app, theme),
            Some(track) => frame
                .render_widget(Paragraph::new(columns.lines(track, app.grid.corridors.get(index), chosen, theme)), at),
            None => {
                let name = &app.grid.corridors[index].name;
                frame.render_widget(columns.waiting(name, chosen, theme), at);
            }
        }
        targets.push((at, Target::Corridor(index)));
    }
    let used = count.saturating_mul(height);
    let below = Rect { y: list.y.saturating_add(used), height: list.height.saturating_sub(used), ..list };
    let any_news = app.parcel.as_ref().is_some_and(|parcel| !parcel.chronicle.events.is_empty());
    if any_news && below.height >= NEWS_HEIGHT {
        let title = format!("─ latest messages {}", "─".repeat(usize::from(below.width).saturating_sub(19)));
        let news = messages::events(app, theme, usize::from(below.width)).take(usize::from(below.height) - 1);
        let lines: Vec<_> = iter::once(Line::styled(title, theme.quiet())).chain(news).collect();
        frame.render_widget(Paragraph::new(lines), below);
    }
    Drawn { first_row, rows_shown, targets, ..Drawn::default() }
}

/// The first row to show so that the cursor is in sight and as little as possible moves.
pub fn first_in_sight(before: usize, cursor: usize, shown: usize, count: usize) -> usize {
    before.clamp((cursor + 1).saturating_sub(shown), cursor).min(count.saturating_sub(shown))
}

fn waiting(frame: &mut Frame, area: Rect, app: &App) -> Drawn {
    let width = usize::from(area.width).saturating_sub(4);
    let ended = app.parcel.as_ref().is_some_and(|parcel| parcel.feed.ended);
    let mut lines = vec![
        String::new(),
        if ended { "The feed ended without a single frame." } else { "Waiting for the first frame." }.into(),
        String::new(),
        format!("Corridors in the configuration: {}.", app.grid.corridors.len()),
    ];
    let feed = app.parcel.as_ref().map(|parcel| &parcel.feed);
    for (what, report) in feed.iter().flat_map(|feed| feed.reports()) {
        lines.push(format!("  {what} {}: {}", text::clean(&report.name), report.standing));
        lines.extend(report.findings.iter().map(|finding| format!("    {}", text::clean(finding))));
    }
    lines.push(String::new());
    lines.extend(text::wrap(
        "If nothing comes: does the input run and send JSON lines (or CSV) with a time and the channel names of the \
         configuration? `tautline check` prints the corridors, m the messages. q quits.",
        width,
        0,
    ));
    let lines: Vec<_> = lines.iter().map(|line| Line::raw(format!("  {}", text::cut(line, width)))).collect();
    frame.render_widget(Paragraph::new(lines), area);
    Drawn::default()
}

#[cfg(test)]
mod tests {
    use super::first_in_sight;

    #[test]
    fn the_cursor_stays_in_sight_and_the_list_moves_little() {
        for (before, cursor, shown, count, first) in [
            (0, 0, 10, 500, 0),
            (0, 9, 10, 500, 0),
            (0, 10, 10, 500, 1),
            (5, 4, 10, 500, 4),
            (495, 499, 10, 500, 490),
            (7, 2, 10, 5, 0),
            (3, 0, 1, 0, 0),
        ] {
            assert_eq!(first_in_sight(before, cursor, shown, count), first, "{before} {cursor} {shown} {count}");
        }
    }
}
