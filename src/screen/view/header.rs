use ratatui::text::{Line, Span};

use super::{Theme, text};
use crate::{
    desk::State,
    screen::state::{App, Page, Sort},
};

/// Where we are, how many corridors are in which state, what time it is.
pub fn line(app: &App, theme: Theme, width: usize) -> Line<'static> {
    let page = match app.page {
        Page::Overview if app.sort == Sort::WorstFirst => "worst first",
        Page::Overview => "all corridors",
        Page::Corridor => "corridor",
        Page::Alarms => "alarms",
        Page::Events => "events and marks",
        Page::Compare => "A and now",
        Page::Change => "configuration",
        Page::Messages => "messages",
        Page::Help => "help",
    };
    let roomy = width >= 100;
    let mut left = vec![Span::styled("tautline", theme.strong())];
    if roomy || app.page != Page::Overview || app.sort == Sort::WorstFirst {
        left.push(Span::raw(format!("  {page}")));
    }
    if !app.filter.is_empty() {
        left.push(Span::styled(format!(" with “{}”", text::cut(&app.filter, 16)), theme.caution()));
    }
    let mut states = [State::Ample, State::Thin, State::Spent, State::Blind];
    states.sort_by_key(|&state| std::cmp::Reverse(state.severity()));
    for state in states {
        let tracks = app.parcel.iter().flat_map(|parcel| &parcel.chronicle.tracks);
        let count = tracks.filter(|track| track.latest.state == state).count();
        if count > 0 {
            left.push(Span::raw("  "));
            let words = format!("{}{count} {}", prefix(state, theme), theme.word(state));
            left.push(Span::styled(words, theme.badge(state)));
        }
    }
    let time = app.parcel.as_ref().and_then(|parcel| parcel.chronicle.time());
    let right = time.map_or(String::new(), |time| {
        let format = if roomy { "%-d %b %Y %H:%M:%S %Z" } else { "%-d %b %H:%M:%S %Z" };
        time.with_timezone(&app.zone).format(format).to_string()
    });
    text::spread(left, vec![Span::styled(format!(" {right}"), theme.strong())], width)
}

fn prefix(state: State, theme: Theme) -> String {
    if state == State::Ample { String::new() } else { format!("{} ", theme.mark(state)) }
}
