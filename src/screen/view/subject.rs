//! What every panel of a corridor draws from, and the words that stand in one.

use ratatui::{Frame, layout::Rect, text::Line, widgets::Paragraph};

use super::{Theme, text};
use crate::{
    desk::OutageRecord,
    screen::state::{App, Track},
};

/// What the panels of a corridor draw from.
#[derive(Clone, Copy)]
pub struct Subject<'a> {
    /// The screen's state.
    pub app: &'a App,
    /// The corridor over time.
    pub track: &'a Track,
    /// The outage looked at.
    pub outage: Option<&'a OutageRecord>,
    /// How things look.
    pub theme: Theme,
}

/// A paragraph of wrapped text, ready for a panel.
pub fn paragraph(words: &str, width: usize) -> Vec<Line<'static>> {
    text::wrap(words, width.saturating_sub(1), 2).into_iter().map(|line| Line::raw(format!(" {line}"))).collect()
}

/// A heading inside a panel.
pub fn heading(words: &str, theme: Theme) -> Line<'static> {
    Line::styled(format!(" {words}"), theme.strong())
}

/// Draws nothing but words in a panel that has nothing to show.
pub fn nothing(frame: &mut Frame, area: Rect, words: &str) {
    frame.render_widget(Paragraph::new(paragraph(words, usize::from(area.width))), area);
}
