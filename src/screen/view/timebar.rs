use chrono::{DateTime, TimeDelta, Utc};
use ratatui::{
    Frame,
    layout::Rect,
    style::Style,
    text::{Line, Span},
};

use super::{Theme, figures};
use crate::screen::{
    connection::Playback,
    state::{App, Target},
};

/// Play or pause, speed, time, and the whole recording with the states seen so far.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, playback: &Playback, theme: Theme) -> Option<(Rect, Target)> {
    let now = playback.now.map_or(figures::NONE.into(), |now| figures::clock(now, app.zone));
    let mark = if playback.seeking.is_some() {
        "»"
    } else if playback.playing {
        "▶"
    } else {
        "‖"
    };
    let head = format!(" {mark} ×{:<4} {now} ", playback.speed);
    let Some((first, last)) = playback.extent else {
        let known = format!("{head} frame {} · measuring the recording…", playback.taken);
        frame.render_widget(Line::raw(known), area);
        return None;
    };
    let long = last - first > TimeDelta::hours(24);
    let label = |time: DateTime<Utc>| {
        time.with_timezone(&app.zone).format(if long { "%-d %b %H:%M" } else { "%H:%M" }).to_string()
    };
    let (left, right) = (format!("{} ", label(first)), format!(" {}", label(last)));
    let used = head.chars().count() + left.chars().count() + right.chars().count() + 1;
    let width = usize::from(area.width).saturating_sub(used);

    let mut spans = vec![Span::styled(head.clone(), theme.strong()), Span::styled(left.clone(), theme.quiet())];
    spans.extend(cells(first, last, width, playback, theme));
    spans.push(Span::styled(right, theme.quiet()));
    frame.render_widget(Line::from(spans), area);

    let from = area.x + u16::try_from(head.chars().count() + left.chars().count()).unwrap_or(0);
    let bar = Rect { x: from, width: u16::try_from(width).unwrap_or(0), ..area }.intersection(area);
    Some((bar, Target::Time(first, last)))
}

fn cells(
    first: DateTime<Utc>,
    last: DateTime<Utc>,
    width: usize,
    playback: &Playback,
    theme: Theme,
) -> Vec<Span<'static>> {
    let whole_s = (last - first).num_seconds().max(1);
    let at = |cell: usize| {
        first
            + TimeDelta::seconds(whole_s * i64::try_from(cell).unwrap_or(0) / i64::try_from(width.max(1)).unwrap_or(1))
    };
    let here = playback.now.map(|now| {
        let cells = (now - first).num_seconds().clamp(0, whole_s) * i64::try_from(width).unwrap_or(0) / whole_s;
        usize::try_from(cells).unwrap_or(0).min(width.saturating_sub(1))
    });
    (0..width)
        .map(|cell| {
            let state = playback.seen.worst_between(at(cell), at(cell + 1));
            let (symbol, style) = match state {
                None => ("─", theme.quiet()),
                Some(crate::desk::State::Ample) => ("━", Style::new()),
                Some(state) => (theme.mark(state), theme.badge(state)),
            };
            if here == Some(cell) {
                Span::styled("◆", style.patch(theme.strong()))
            } else {
                Span::styled(symbol, style)
            }
        })
        .collect()
}
