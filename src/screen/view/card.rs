//! A corridor of the overview where there is room: the headroom in big digits beside the ruler.

use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    text::{Line, Span},
};

use super::{
    Theme, digits, figures,
    row::{best_action, cursor, set_by, trust, why_blind},
    ruler::{self, Ruler},
    text, trend,
};
use crate::screen::state::{App, Track, worst_outage};

/// Rows that a card takes, the blank one under it included.
pub const HEIGHT: u16 = 7;
/// Columns of the digits.
const DIGITS: u16 = 26;

/// Draws one.
pub fn draw(frame: &mut Frame, area: Rect, track: &Track, chosen: bool, app: &App, theme: Theme) {
    frame.render_widget(title(track, chosen, app, theme, usize::from(area.width)), super::row(area, 0));
    let inner = Rect { y: area.y + 1, height: area.height.saturating_sub(1), ..area };
    let [_, numbers, picture] =
        Layout::horizontal([Constraint::Length(3), Constraint::Length(DIGITS), Constraint::Fill(1)]).areas(inner);
    let assessment = &track.latest;

    let big = digits::rows(&figures::headroom(assessment.headroom_mw));
    let spread = assessment.headroom_sd_mw.map_or(String::new(), |sd| format!(" ±{}", figures::mw(Some(sd.ceil()))));
    let left = big
        .into_iter()
        .map(|line| Line::styled(line, theme.strong()))
        .chain([Line::raw(format!("MW headroom{spread}")), Line::raw(set_by(assessment, usize::from(DIGITS) - 1))]);
    for (index, line) in (0..).zip(left) {
        frame.render_widget(line, super::row(numbers, index));
    }

    let width = usize::from(picture.width);
    let (ruler, caption) = match Ruler::new(assessment, worst_outage(assessment)) {
        Some(ruler) => (ruler.line(width, theme), ruler.caption()),
        None => (Line::raw(text::cut(&why_blind(assessment), width)), String::new()),
    };
    let strip = trend::strip(&track.history, width.saturating_sub(58));
    let strip_name = if strip.trim().is_empty() { "" } else { "  headroom, minute by minute" };
    let corridor = app.grid.corridors.iter().find(|corridor| corridor.name == assessment.corridor);
    let best = match best_action(assessment, corridor, width.saturating_sub(6)) {
        best if best.is_empty() && assessment.headroom_mw.is_none() => String::new(),
        best if best.is_empty() => "no single action is needed or at hand".into(),
        best => format!("best: {best}"),
    };
    let right = [
        ruler::scale(width, theme),
        ruler,
        Line::styled(text::cut(&caption, width), theme.quiet()),
        Line::from(vec![
            Span::raw(text::left(&trend::words(track), 26)),
            Span::raw(strip),
            Span::styled(strip_name, theme.quiet()),
        ]),
        Line::raw(text::cut(&best, width)),
    ];
    for (index, line) in (0..).zip(right) {
        frame.render_widget(line, super::row(picture, index));
    }
}

pub fn title(track: &Track, chosen: bool, app: &App, theme: Theme, width: usize) -> Line<'static> {
    let assessment = &track.latest;
    let state = assessment.state;
    let since = figures::duration(assessment.time - track.since);
    let left = vec![
        Span::raw(cursor(chosen)),
        Span::styled(theme.mark(state), theme.badge(state)),
        Span::styled(format!(" {} ", text::cut(&assessment.corridor, 40)), theme.strong()),
        Span::styled(format!(" {} ", theme.word(state)), theme.badge(state)),
        Span::styled(format!(" for {since} "), theme.quiet()),
    ];
    let (trust, trusted) = trust(assessment);
    let right = vec![
        Span::raw(flow(track, app)),
        Span::styled(" ── ", theme.quiet()),
        Span::styled(trust, if trusted { theme.quiet() } else { theme.caution() }),
    ];
    let used: usize = left.iter().chain(&right).map(Span::width).sum();
    let rule = Span::styled("─".repeat(width.saturating_sub(used + 1)) + " ", theme.quiet());
    left.into_iter().chain([rule]).chain(right).collect()
}

/// Transfer with its direction.
pub fn flow(track: &Track, app: &App) -> String {
    let assessment = &track.latest;
    let (Some(exporter), Some(transfer)) = (&assessment.exporter, assessment.transfer_mw) else {
        return format!("{} MW", figures::NONE);
    };
    let corridor = app.grid.corridors.iter().find(|corridor| corridor.name == assessment.corridor);
    let importer = corridor.and_then(|corridor| corridor.buses.iter().take(2).find(|bus| bus.name != *exporter));
    let importer = importer.map_or(figures::NONE.into(), |bus| text::cut(&bus.name, 20));
    format!("{} MW {} → {importer}", figures::mw(Some(transfer)), text::cut(exporter, 20))
}
