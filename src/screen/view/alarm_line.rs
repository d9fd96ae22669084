//! The line of alarms on every page: the newest that waits to be acknowledged, and how many there are.

use ratatui::{
    style::{Modifier, Style},
    text::{Line, Span},
};

use super::{Theme, figures, text};
use crate::{
    alarm::{Alarm, Priority, State, Summary},
    screen::state::App,
};

/// The line.
pub fn line(app: &App, theme: Theme, width: usize) -> Line<'static> {
    let Some(report) = app.alarm_report() else { return Line::default() };
    let board = &report.alarms.board;
    let mut left = vec![Span::raw(" ")];
    if let Some(trouble) = report.journal.as_ref().filter(|journal| journal.trouble.is_some()) {
        let lost = if trouble.lost > 0 { format!(", {} LOST", trouble.lost) } else { String::new() };
        let words = format!("JOURNAL NOT WRITTEN: {} wait{lost}", trouble.waiting);
        left.extend([Span::styled(words, theme.caution()), Span::raw("  ")]);
    }
    let rows = board.abnormal();
    let calling = rows.iter().filter_map(|id| Some((*id, board.get(*id)?)));
    let newest = |state| calling.clone().find(|(_, alarm)| alarm.standing.state == state);
    let newest = newest(State::Unacknowledged).or_else(|| newest(State::ReturnedUnacknowledged));
    if let Some((id, alarm)) = newest {
        let definition = &alarm.definition;
        let (mark, _) = theme.alarm(alarm.standing.state);
        let at = alarm.standing.raised.map_or(figures::NONE.into(), |raised| figures::clock(raised, app.zone));
        let corridor = board.corridors.get(id.corridor).map_or("", |corridor| corridor.corridor());
        let returned = if alarm.standing.state == State::ReturnedUnacknowledged { " (returned)" } else { "" };
        left.extend([
            Span::styled(format!("{mark} {}", definition.priority.word().to_uppercase()), called(app, theme, alarm)),
            Span::raw(format!(" {at} ")),
            Span::styled(format!("{}: {}{returned}", text::cut(corridor, 24), definition.name), theme.strong()),
            Span::raw(format!(". {}", definition.message)),
        ]);
    } else {
        let none = if board.corridors.is_empty() { "" } else { "no unacknowledged alarms" };
        left.push(Span::styled(none, theme.quiet()));
    }
    let counts = counts(&board.summary(), width >= 160);
    text::spread(left, vec![Span::styled(format!("  {counts} "), theme.quiet())], width)
}

/// The style of what calls: bright and plain in turn.
pub fn called(app: &App, theme: Theme, alarm: &Alarm) -> Style {
    let style = theme.priority(alarm.definition.priority);
    if !alarm.standing.state.calls() {
        Style::new()
    } else if app.is_lit() {
        style.add_modifier(Modifier::BOLD)
    } else {
        Style::new().add_modifier(Modifier::BOLD)
    }
}

/// How many there are in which state; by priority where there is room for it.
fn counts(summary: &Summary, roomy: bool) -> String {
    let by_priority = |counts: &[usize; Priority::ALL.len()], word: &str, short: &str| {
        let whole: usize = counts.iter().sum();
        let parts = Priority::ALL.iter().rev().zip(counts.iter().rev()).filter(|(_, count)| **count > 0);
        let parts: Vec<_> = parts.map(|(priority, count)| format!("{count} {priority}")).collect();
        match parts.first() {
            None => String::new(),
            Some(_) if roomy => format!("{word} {}", parts.join(", ")),
            Some(worst) if worst.starts_with(&format!("{whole} ")) => format!("{short} {worst}"),
            Some(worst) => format!("{short} {whole}, {worst}"),
        }
    };
    let counted = |count: usize, word: &str| if count > 0 { format!("{count} {word}") } else { String::new() };
    let parts = [
        by_priority(&summary.unacknowledged, "unacknowledged", "unack"),
        counted(summary.returned, if roomy { "returned unacknowledged" } else { "returned" }),
        by_priority(&summary.acknowledged, "acknowledged", "ack"),
        counted(summary.shelved, "shelved"),
        counted(summary.suppressed, "suppressed"),
        counted(summary.out_of_service, "out of service"),
    ];
    parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" · ")
}
