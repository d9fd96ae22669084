//! The alarm page: the list, what the chosen alarm means and what can be done, or its history.

use chrono::{DateTime, TimeDelta, Utc};
use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    style::Style,
    text::{Line, Span},
    widgets::Paragraph,
};

use super::{Theme, alarm_line, figures, overview::first_in_sight, row::cursor, scrolled, text};
use crate::{
    alarm::{Alarm, AlarmId, Direction, Kind},
    journal::Entry,
    screen::{
        connection::{AlarmKey, AlarmReport, Seen},
        state::{App, Drawn, Target},
    },
};

/// Rows of the part about the chosen alarm.
const ABOUT: u16 = 8;
/// Cursor, mark, state and priority, and all gaps.
const FIXED: usize = 29;
const STATE: usize = 14;
const PRIORITY: usize = 6;

/// Draws the page.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, theme: Theme) -> Drawn {
    let Some(report) = app.alarm_report() else {
        frame.render_widget(Line::raw("  Waiting for the first frame."), area);
        return Drawn::default();
    };
    let rows = app.alarm_rows();
    let Some((place, id)) = app.chosen_alarm(&rows) else {
        frame.render_widget(Paragraph::new(nothing(app, report, usize::from(area.width))), area);
        return Drawn::default();
    };
    let Some(subject) = Subject::new(app, theme, report, id) else { return Drawn::default() };
    if app.alarms.history {
        let lines = history(&subject, usize::from(area.width));
        return Drawn { alarms: vec![subject.seen()], ..scrolled(frame, area, app.scroll, lines) };
    }
    let about = ABOUT.min(area.height / 2);
    let [heading, list, lower] =
        Layout::vertical([Constraint::Length(1), Constraint::Fill(1), Constraint::Length(about)]).areas(area);
    let columns = Columns::new(usize::from(area.width));
    frame.render_widget(columns.heading(theme), heading);
    let rows_shown = usize::from(list.height).max(1);
    let first_row = first_in_sight(app.drawn.first_row, place, rows_shown, rows.len());
    let mut drawn = Drawn { first_row, rows_shown, alarm_cursor: place - first_row, ..Drawn::default() };
    for (index, &row) in (0u16..).zip(rows.iter().skip(first_row).take(rows_shown)) {
        let Some(subject) = Subject::new(app, theme, report, row) else { continue };
        let at = super::row(list, index);
        frame.render_widget(columns.line(&subject, row == id), at);
        drawn.targets.push((at, Target::Alarm(subject.seen())));
        drawn.alarms.push(subject.seen());
    }
    let mut lines = vec![subject.title(usize::from(area.width))];
    lines.extend(about_lines(&subject, usize::from(area.width)));
    frame.render_widget(Paragraph::new(lines), lower);
    drawn
}

/// One alarm and all that is known of it.
struct Subject<'a> {
    app: &'a App,
    theme: Theme,
    report: &'a AlarmReport,
    alarm: &'a Alarm,
    key: AlarmKey,
}

impl<'a> Subject<'a> {
    fn new(app: &'a App, theme: Theme, report: &'a AlarmReport, id: AlarmId) -> Option<Self> {
        let board = &report.alarms.board;
        Some(Self { app, theme, report, alarm: board.get(id)?, key: AlarmKey::of(board, id)? })
    }

    fn seen(&self) -> Seen {
        Seen { key: self.key.clone(), raised: self.alarm.standing.raised }
    }

    /// Something was asked, or done, that is not safe yet.
    fn open_end(&self) -> Option<&'static str> {
        if self.app.is_pending(&self.key) {
            Some("asked for, not done yet")
        } else if self.report.unwritten.contains(&self.key) {
            Some("done, but not in the journal yet")
        } else {
            None
        }
    }

    fn title(&self, width: usize) -> Line<'static> {
        let definition = &self.alarm.definition;
        let title = format!("─ {} · {} · {} ", self.key.corridor, definition.name, definition.priority);
        let title = text::cut(&title, width);
        let rest = "─".repeat(width.saturating_sub(unicode_width::UnicodeWidthStr::width(&*title)));
        Line::from(vec![Span::styled(title, self.theme.strong()), Span::styled(rest, self.theme.quiet())])
    }

    /// Time of day, or the day where that is another.
    fn since(&self, time: Option<DateTime<Utc>>, width: usize) -> String {
        let now = self.report.alarms.now;
        match time {
            None => figures::NONE.into(),
            Some(time) if now.is_some_and(|now| (now - time).abs() >= TimeDelta::hours(24)) => {
                time.with_timezone(&self.app.zone).format("%-d %b").to_string()
            }
            Some(time) => figures::clock(time, self.app.zone).chars().take(if width < 8 { 5 } else { 8 }).collect(),
        }
    }

    /// The value at which it was raised against the setpoint.
    fn against(&self) -> String {
        let definition = &self.alarm.definition;
        let kind = definition.kind;
        if kind == Kind::Blind {
            return "no state".into();
        }
        let sign = match kind.direction() {
            Direction::Low => "≤",
            Direction::High => "≥",
        };
        let value = value(kind, self.alarm.standing.value);
        format!("{value} {sign} {} {}", value_plain(kind, definition.setpoint), kind.unit()).trim_end().into()
    }
}

/// Column widths.
struct Columns {
    since: usize,
    corridor: usize,
    name: usize,
    value: usize,
    message: usize,
}

impl Columns {
    fn new(width: usize) -> Self {
        // Seconds where there is room for them.
        let since = if width >= 100 { 8 } else { 6 };
        let rest = width.saturating_sub(FIXED + since);
        let spare = rest.saturating_sub(90) / 5;
        let (corridor, name, value) = (15 + spare.min(11), 16 + spare.min(5), 14 + spare.min(5));
        Self { since, corridor, name, value, message: rest.saturating_sub(corridor + name + value) }
    }

    fn heading(&self, theme: Theme) -> Line<'static> {
        let words = format!(
            "   {} {} {} {} {} {} {}",
            text::left("state", STATE),
            text::left("prio", PRIORITY),
            text::left("since", self.since),
            text::left("corridor", self.corridor),
            text::left("alarm", self.name),
            text::left("raised at", self.value),
            text::left("meaning", self.message)
        );
        Line::styled(words, theme.quiet())
    }

    fn line(&self, subject: &Subject, chosen: bool) -> Line<'static> {
        let Subject { app, theme, alarm, key, .. } = subject;
        let standing = &alarm.standing;
        let (mark, word) = theme.alarm(standing.state);
        let style = alarm_line::called(app, *theme, alarm);
        let since = if standing.state.calls() { standing.raised } else { standing.since };
        let mark = if subject.open_end().is_some() { "…" } else { mark };
        let strong = if chosen { theme.strong() } else { Style::new() };
        let against = if standing.raised.is_some() { subject.against() } else { figures::NONE.into() };
        Line::from(vec![
            Span::raw(cursor(chosen)),
            Span::styled(mark, style),
            Span::raw(" "),
            Span::styled(text::left(word, STATE), style),
            Span::raw(" "),
            Span::styled(text::left(alarm.definition.priority.word(), PRIORITY), style),
            Span::raw(format!(" {} ", text::left(&subject.since(since, self.since), self.since))),
            Span::styled(text::left(&key.corridor, self.corridor), strong),
            Span::raw(" "),
            Span::styled(text::left(&key.alarm, self.name), strong),
            Span::raw(format!(
                " {} {}",
                text::left(&against, self.value),
                text::left(&alarm.definition.message, self.message)
            )),
        ])
    }
}

fn about_lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let Subject { app, theme, alarm, .. } = subject;
    let (standing, definition) = (&alarm.standing, &alarm.definition);
    let mut state = vec![standing.state.word().to_owned()];
    state.extend(standing.since.map(|since| format!(" since {}", when(since, app))));
    state.extend(standing.until.map(|until| format!(" until {}", when(until, app))));
    state.extend(subject.open_end().map(|open_end| format!(" ({open_end})")));
    state.extend(standing.raised.map(|raised| format!("; raised {} at {}", when(raised, app), subject.against())));
    state.extend(standing.about.as_deref().map(|about| format!(", {about}")));
    let state = state.concat();
    let holds = if alarm.is_active() { "its condition holds" } else { "its condition does not hold" };
    let unit = definition.kind.unit();
    let setting = format!(
        "{holds}; deadband {} {unit}, on after {} s, off after {} s",
        value_plain(definition.kind, definition.deadband),
        definition.on_delay.as_seconds_f64(),
        definition.off_delay.as_seconds_f64()
    );
    let items = [
        ("means", Some(&*definition.message)),
        ("do", Some(&*definition.action)),
        ("state", Some(&*state)),
        ("why", standing.reason.as_deref()),
        ("note", standing.note.as_deref()),
        ("now", Some(&*setting)),
    ];
    items
        .into_iter()
        .filter_map(|(word, words)| Some((word, words?)))
        .flat_map(|(word, words)| item(word, words, width, *theme))
        .collect()
}

fn item(word: &str, words: &str, width: usize, theme: Theme) -> Vec<Line<'static>> {
    let wrapped = text::wrap(words, width.saturating_sub(9), 0);
    let lead = |index: usize| Span::styled(text::left(if index == 0 { word } else { "" }, 6), theme.strong());
    wrapped
        .into_iter()
        .enumerate()
        .map(|(index, line)| Line::from(vec![" ".into(), lead(index), line.into()]))
        .collect()
}

/// Everything that happened to it, newest first.
fn history(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let Subject { app, theme, report, key, .. } = subject;
    let mut lines = vec![subject.title(width)];
    let kept = report.history.as_ref().filter(|history| history.0 == *key);
    let entries: Vec<&Entry> = match kept {
        Some(history) => history.1.iter().collect(),
        None => report.alarms.log.iter().map(AsRef::as_ref).filter(|entry| key.is_of(entry)).collect(),
    };
    let from = if kept.is_some() { "from the journal" } else { "of this session" };
    lines.push(Line::styled(format!(" What happened to it, newest first, {from}."), theme.quiet()));
    if entries.is_empty() {
        lines.push(Line::raw(" Nothing yet."));
    }
    lines.extend(entries.into_iter().rev().flat_map(|entry| told(entry, subject, width, app)));
    lines
}

fn told(entry: &Entry, subject: &Subject, width: usize, app: &App) -> Vec<Line<'static>> {
    let kind = subject.alarm.definition.kind;
    let mut words = vec![match (&entry.event, &entry.to) {
        (Some(event), Some(to)) => format!("{event} → {to}"),
        _ => entry.kind.to_string(),
    }];
    words.extend(entry.value.map(|_| format!(" at {} {}", value(kind, entry.value), kind.unit())));
    words.extend(entry.about.as_ref().map(|about| format!(" ({about})")));
    words.extend(entry.until.map(|until| format!(" until {}", when(until, app))));
    words.extend(entry.text.as_ref().map(|text| format!(": {text}")));
    words.extend(entry.by.as_ref().map(|by| format!(", by {by}")));
    let words = words.concat();
    let time = text::left(&when(entry.time, app), 17);
    let wrapped = text::wrap(&words, width.saturating_sub(20), 2);
    let lead = |index: usize| if index == 0 { time.clone() } else { " ".repeat(17) };
    let line = |(index, line)| Line::from(vec![Span::styled(format!(" {}", lead(index)), subject.theme.quiet()), line]);
    wrapped.into_iter().map(Span::raw).enumerate().map(line).collect()
}

fn nothing(app: &App, report: &AlarmReport, width: usize) -> Vec<Line<'static>> {
    let words = if app.alarms.filter.is_empty() {
        let count = report.alarms.board.alarms().count();
        format!("All {count} alarms are normal. v lists them, Esc goes back.")
    } else {
        format!(
            "No alarm’s corridor or name contains “{}”, and no state or priority begins with it. Esc shows all.",
            app.alarms.filter
        )
    };
    text::wrap(&words, width.saturating_sub(4), 0).into_iter().map(|line| Line::raw(format!("  {line}"))).collect()
}

fn when(time: DateTime<Utc>, app: &App) -> String {
    time.with_timezone(&app.zone).format("%-d %b %H:%M:%S").to_string()
}

/// A watched value as the page writes it.
fn value(kind: Kind, value: Option<f64>) -> String {
    match (kind, value) {
        (Kind::HeadroomMw, _) => figures::headroom(value),
        (_, Some(value)) => value_plain(kind, value),
        (_, None) => figures::NONE.into(),
    }
}

fn value_plain(kind: Kind, value: f64) -> String {
    figures::number(Some(value), kind.decimals())
}
