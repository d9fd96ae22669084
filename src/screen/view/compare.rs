//! The moment held and the present, side by side: what differs first, the rest quietly.

use std::cmp::Reverse;

use chrono::TimeDelta;
use ratatui::{
    layout::Rect,
    style::Style,
    text::{Line, Span},
};

use super::{
    Theme,
    difference::{Difference, differences},
    figures,
    row::{cursor, headroom},
    subject::paragraph,
    text,
};
use crate::{
    desk::{Assessment, State},
    screen::state::{App, Held},
};

/// Corridors listed at least.
const CORRIDORS_MIN: usize = 3;

/// The page.
pub fn lines(app: &App, theme: Theme, area: Rect) -> Vec<Line<'static>> {
    let width = usize::from(area.width);
    let (Some(held), Some(now), Some(corridor)) = (&app.held, app.now(), app.corridor()) else {
        let words = "No moment is held yet. A holds the present one as A; wherever you go then, this page shows it beside the present: what changed between them.";
        return paragraph(words, width);
    };
    let mut lines = vec![times(app, held, &now, theme)];
    if app.grid.corridors.len() > 1 {
        lines.extend(corridors(app, held, &now, theme, area));
    }
    let columns = Columns::new(width);
    lines.push(columns.line([corridor.name.as_ref(), "A", "now", "change"], theme.strong()));
    let Some(all) = differences(held, &now, &corridor.name, theme) else {
        lines.extend(paragraph("This corridor was not there at one of the two moments.", width));
        return lines;
    };
    let (differing, same): (Vec<_>, Vec<_>) = all.into_iter().partition(Difference::differs);
    if differing.is_empty() {
        lines.extend(paragraph("Nothing differs.", width));
    }
    let row = |row: &Difference, style| {
        columns.line([&row.what, &row.values[0], &row.values[1], &row.change].map(String::as_str), style)
    };
    lines.extend(differing.iter().map(|different| row(different, Style::new())));
    lines.push(Line::styled(" unchanged", theme.quiet()));
    lines.extend(same.iter().map(|same| row(same, theme.quiet())));
    lines
}

fn times(app: &App, held: &Held, now: &Held, theme: Theme) -> Line<'static> {
    let at = |held: &Held| held.time.with_timezone(&app.zone).format("%-d %b %H:%M:%S").to_string();
    let apart = now.time - held.time;
    let order = if apart < TimeDelta::zero() { "earlier" } else { "later" };
    let apart =
        if apart.is_zero() { "the same moment".into() } else { format!("{} {order}", figures::duration(apart.abs())) };
    Line::from(vec![
        Span::styled(format!(" A {}", at(held)), theme.strong()),
        Span::styled(format!("   now {}", at(now)), theme.strong()),
        Span::raw(format!("   {apart}")),
    ])
}

/// The corridors that changed most, that with the cursor among them.
fn corridors(app: &App, held: &Held, now: &Held, theme: Theme, area: Rect) -> Vec<Line<'static>> {
    let mut pairs: Vec<_> = (now.assessments.iter().enumerate())
        .filter_map(|(index, is)| Some((index, held.assessment(&is.corridor)?.as_ref(), is.as_ref())))
        .collect();
    pairs.sort_by_key(|(_, was, is)| Reverse(importance(was, is)));
    let shown = CORRIDORS_MIN.max(usize::from(area.height) / 4);
    if let Some(place) = pairs.iter().position(|(index, ..)| *index == app.selected)
        && place >= shown
    {
        pairs.swap(place, shown - 1);
    }
    let width = usize::from(area.width);
    let name_width = (width / 4).clamp(10, 30);
    let line = |&(index, was, is): &(usize, &Assessment, &Assessment)| {
        let chosen = index == app.selected;
        let [before, after] = [was, is].map(|a| text::left(&theme.word(a.state), 5));
        let change = change_mw(was, is).filter(|change| *change != 0.0).map_or(String::new(), |change| {
            let sign = if change > 0.0 { "+" } else { "" };
            format!("{sign}{} MW", figures::mw(Some(change)))
        });
        Line::from(vec![
            Span::raw(cursor(chosen)),
            Span::styled(
                text::left(&is.corridor, name_width),
                if chosen { theme.strong() } else { theme.badge(State::Ample) },
            ),
            Span::raw(" "),
            Span::styled(before, theme.badge(was.state)),
            Span::raw(" → "),
            Span::styled(after, theme.badge(is.state)),
            Span::raw(format!("  {} → {}  {change}", text::right(&headroom(was), 11), text::left(&headroom(is), 11))),
        ])
    };
    let mut lines: Vec<_> = pairs.iter().take(shown).map(line).collect();
    if pairs.len() > shown {
        lines.push(Line::styled(format!("  and {} more, which changed less", pairs.len() - shown), theme.quiet()));
    }
    lines
}

/// Another state is more than any change of the headroom.
fn importance(was: &Assessment, is: &Assessment) -> (bool, u64) {
    // MW as whole numbers have an order.
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "saturates, and not a number is nothing"
    )]
    let change = change_mw(was, is).map_or(0, |change| change.abs() as u64);
    (was.state != is.state, change)
}

fn change_mw(was: &Assessment, is: &Assessment) -> Option<f64> {
    Some(is.headroom_mw?.floor() - was.headroom_mw?.floor())
}

/// Column widths.
#[derive(Clone, Copy)]
struct Columns {
    what: usize,
    value: usize,
    change: usize,
}

impl Columns {
    fn new(width: usize) -> Self {
        let (what, change) = ((width / 3).clamp(12, 34), (width / 8).clamp(6, 12));
        Self { what, value: (width.saturating_sub(what + change + 5) / 2).min(34), change }
    }

    fn line(self, cells: [&str; 4], style: Style) -> Line<'static> {
        let [what, was, is, change] = cells;
        Line::styled(
            format!(
                "  {} {} {} {}",
                text::left(what, self.what),
                text::left(was, self.value),
                text::left(is, self.value),
                text::right(change, self.change)
            ),
            style,
        )
    }
}
