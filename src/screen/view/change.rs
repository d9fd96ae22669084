//! What a changed configuration file would change, or why it cannot be used.

use ratatui::text::Line;

use super::{Theme, text};
use crate::screen::state::App;

/// The page's lines.
pub fn lines(app: &App, theme: Theme, width: usize) -> Vec<Line<'static>> {
    let Some(change) = app.change() else {
        let words = if app.playback().is_some() {
            "A recording is played with the configuration as it was at the start."
        } else {
            "The configuration file says what is in force. A change of it will be shown here, to be applied or not."
        };
        return text::wrap(words, width.saturating_sub(2), 0).into_iter().map(|l| Line::raw(format!(" {l}"))).collect();
    };
    let heading = if change.is_sound {
        "The configuration file has changed. Enter puts this into force, whole; Esc leaves things as they are."
    } else {
        "The changed configuration file cannot be used. What was in force stays in force."
    };
    let wrapped = |line: &str, indent| text::wrap(line, width.saturating_sub(2), indent);
    let mut lines: Vec<_> =
        wrapped(heading, 0).into_iter().map(|line| Line::styled(format!(" {line}"), theme.strong())).collect();
    lines.push(Line::default());
    lines.extend(change.lines.iter().flat_map(|line| wrapped(line, 2)).map(|line| Line::raw(format!(" {line}"))));
    lines
}
