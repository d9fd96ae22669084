//! A corridor in one, two or four lines of the overview.

use ratatui::text::{Line, Span};
use unicode_width::UnicodeWidthStr;

use super::{
    Theme, figures,
    ruler::{self, Ruler},
    text::{self, left, right},
    trend,
};
use crate::{
    desk::{Action, Assessment, State},
    grid::Corridor,
    screen::state::{Track, worst_outage},
};

/// Column widths of the overview.
#[derive(Debug, Clone, Copy)]
pub struct Columns {
    name: usize,
    set_by: usize,
    trend: usize,
    ruler: usize,
    action: usize,
    form: Form,
}

/// How much room a corridor gets.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// Everything on one line.
    Line,
    /// The ruler on a second line, beside the best action.
    Pair,
    /// The ruler over the whole width, and a blank line to rest the eye.
    Tall,
}

impl Form {
    /// Rows that a corridor takes.
    pub fn height(self) -> u16 {
        match self {
            Self::Line => 1,
            Self::Pair => 2,
            Self::Tall => 4,
        }
    }
}

const WORD: usize = 6;
const HEADROOM: usize = 12;
const TRANSFER: usize = 6;
const TRUST: usize = 14;
/// Cursor, mark and a space.
const INDENT: usize = 3;

impl Columns {
    /// Shares a width out.
    pub fn new(width: usize, form: Form) -> Self {
        let share = if form == Form::Line { 0 } else { width.saturating_sub(80).min(40) / 4 };
        let (name, set_by, trend) = (13 + share, 17 + share, 17 + share);
        let action = if form == Form::Tall { 0 } else { 22 + share };
        let numbers = INDENT + name + WORD + HEADROOM + set_by + TRANSFER + trend + 6;
        let beside = match form {
            Form::Line => numbers + action + TRUST + 2,
            Form::Pair => INDENT + action + TRUST + 2,
            Form::Tall => INDENT + 1,
        };
        Self { name, set_by, trend, ruler: width.saturating_sub(beside), action, form }
    }

    /// The headings.
    pub fn heading(self, theme: Theme) -> Vec<Line<'static>> {
        let upper = format!(
            "{}{} {} {} {} {} {}",
            " ".repeat(INDENT),
            left("corridor", self.name),
            left("state", WORD),
            left("headroom MW", HEADROOM),
            left("set by", self.set_by),
            right("MW now", TRANSFER),
            left("trend", self.trend),
        );
        let mut lower = ruler::scale(self.ruler, theme);
        if self.form != Form::Tall {
            let gap = self.ruler.saturating_sub(lower.width()) + 1;
            lower
                .push_span(" ".repeat(gap) + &left("headroom after action", self.action) + " " + &right("data", TRUST));
        }
        self.joined(Line::raw(upper), lower).into_iter().map(|line| line.style(theme.quiet())).collect()
    }

    /// A corridor that has been assessed.
    pub fn lines(self, track: &Track, corridor: Option<&Corridor>, chosen: bool, theme: Theme) -> Vec<Line<'static>> {
        let assessment = &track.latest;
        let state = assessment.state;
        let name_style = if chosen { theme.strong() } else { theme.badge(State::Ample) };
        let upper = Line::from(vec![
            Span::raw(cursor(chosen)),
            Span::styled(theme.mark(state), theme.badge(state)),
            Span::raw(" "),
            Span::styled(left(&assessment.corridor, self.name), name_style),
            Span::raw(" "),
            Span::styled(left(&theme.word(state), WORD), theme.badge(state)),
            Span::raw(" "),
            Span::styled(left(&headroom(assessment), HEADROOM), theme.strong()),
            Span::raw(format!(
                " {} {} {}",
                left(&set_by(assessment, self.set_by), self.set_by),
                right(&figures::mw(assessment.transfer_mw), TRANSFER),
                left(&trend::words(track), self.trend)
            )),
        ]);
        let mut lower = match Ruler::new(assessment, worst_outage(assessment)) {
            Some(ruler) => ruler.line(self.ruler, theme),
            None => Line::raw(left(&why_blind(assessment), self.ruler)),
        };
        let (trust, trusted) = trust(assessment);
        let trust = Span::styled(trust, if trusted { theme.quiet() } else { theme.caution() });
        if self.form == Form::Tall {
            let exporter = assessment
                .exporter
                .as_deref()
                .map_or(String::new(), |bus| format!("{} exports   ", text::cut(bus, 20)));
            let right = vec![Span::styled(exporter, theme.quiet()), trust];
            let used: usize = right.iter().map(Span::width).sum();
            let best = best_action(assessment, corridor, self.ruler.saturating_sub(used + 8));
            let best = if best.is_empty() { best } else { format!("best: {best}") };
            let last = text::spread(vec![" ".repeat(INDENT).into(), best.into()], right, self.ruler + INDENT);
            return self.joined(upper, lower).into_iter().chain([last, Line::default()]).collect();
        }
        let best = best_action(assessment, corridor, self.action);
        lower.push_span(format!(" {} ", left(&best, self.action)));
        lower.push_span(Span::raw(" ".repeat(TRUST.saturating_sub(trust.width()))));
        lower.push_span(trust);
        self.joined(upper, lower)
    }

    /// A corridor that has not.
    pub fn waiting(self, name: &str, chosen: bool, theme: Theme) -> Line<'static> {
        Line::from(vec![
            Span::raw(cursor(chosen)),
            Span::raw("  "),
            Span::styled(left(name, self.name), if chosen { theme.strong() } else { theme.quiet() }),
            Span::raw(" no frame yet"),
        ])
    }

    fn joined(self, mut upper: Line<'static>, lower: Line<'static>) -> Vec<Line<'static>> {
        if self.form == Form::Line {
            upper.push_span(" ");
            upper.spans.extend(lower.spans);
            vec![upper]
        } else {
            let mut indented = Line::raw(" ".repeat(INDENT));
            indented.spans.extend(lower.spans);
            vec![upper, indented]
        }
    }
}

/// What points at the chosen row.
pub fn cursor(chosen: bool) -> &'static str {
    if chosen { "▸" } else { " " }
}

/// Headroom with its spread.
pub fn headroom(assessment: &Assessment) -> String {
    let headroom = figures::headroom(assessment.headroom_mw);
    match assessment.headroom_sd_mw {
        Some(sd) => format!("{headroom} ±{}", figures::mw(Some(sd.ceil()))),
        None => headroom,
    }
}

/// The outage and the criterion that set the headroom; of the two the outage’s name is cut to fit.
pub fn set_by(assessment: &Assessment, width: usize) -> String {
    let Some(binding) = &assessment.binding else { return figures::NONE.into() };
    let by = binding.criterion.word();
    match &binding.outage {
        Some(name) => format!("{} out, {by}", text::cut(name, width.saturating_sub(by.len() + 6))),
        None => format!("nothing lost, {by}"),
    }
}

/// The action at hand that brings the most, else one that must wait, else what must come off; as it fits.
pub fn best_action(assessment: &Assessment, corridor: Option<&Corridor>, width: usize) -> String {
    let Some(now) = assessment.headroom_mw else { return String::new() };
    let refusal = |action: &Action| refusal(assessment, corridor, &action.action);
    let helpful = |action: &&Action| action.headroom_mw.is_some_and(|then| then > now.max(0.0));
    let by_headroom = |one: &&Action, other: &&Action| {
        let then = |action: &Action| action.headroom_mw.unwrap_or(f64::MIN);
        refusal(other).is_some().cmp(&refusal(one).is_some()).then(then(one).total_cmp(&then(other)))
    };
    let wordings = match assessment.actions.iter().filter(helpful).max_by(by_headroom) {
        Some(best) => {
            let (action, then) = (text::clean(&best.action), figures::headroom(best.headroom_mw));
            match refusal(best) {
                None => vec![format!("{action}: headroom {then} MW"), format!("{action}: {then} MW")],
                Some(why) => vec![
                    format!("{action}: headroom {then} MW, but not now: {why}"),
                    format!("{action}: {then} MW, not now: {why}"),
                    format!("{action} not now: {why}"),
                    format!("not now: {action}"),
                ],
            }
        }
        None if now < 0.0 => vec![format!("take off {} MW", figures::mw(Some(-now.floor())))],
        None => Vec::new(),
    };
    let fitting = wordings.iter().find(|words| words.width() <= width).or(wordings.last());
    text::cut(fitting.map_or("", String::as_str), width)
}

/// Why an action must wait, where it closes a circuit that the synchronism check refuses.
pub fn refusal(assessment: &Assessment, corridor: Option<&Corridor>, action: &str) -> Option<String> {
    let circuit = action.strip_prefix("close ")?;
    let reclose = assessment.reclose.iter().find(|reclose| &*reclose.circuit == circuit)?;
    let check = corridor.map(|corridor| corridor.reclose).unwrap_or_default();
    match reclose.allowed {
        Some(true) => None,
        None => Some("angle unknown".into()),
        Some(false) if reclose.angle_deg.is_some_and(|angle| angle <= check.max_angle_deg) => Some(format!(
            "voltage differs {} %, check {} %",
            figures::number(reclose.voltage_pct, 1),
            figures::number(Some(check.max_voltage_pct), 0)
        )),
        Some(false) => Some(format!(
            "angle {}°, check {}",
            figures::number(reclose.angle_deg, 1),
            figures::deg(Some(check.max_angle_deg))
        )),
    }
}

/// Whether to believe it, in two words.
pub fn trust(assessment: &Assessment) -> (String, bool) {
    let fit = &assessment.fit;
    let count = |names: usize, one: &str, many: &str| format!("{names} {}", if names == 1 { one } else { many });
    if !fit.missing.is_empty() {
        (count(fit.missing.len(), "missing", "missing"), false)
    } else if !fit.suspects.is_empty() {
        (count(fit.suspects.len(), "suspect", "suspects"), false)
    } else if fit.chi2.zip(fit.limit).is_some_and(|(chi2, limit)| chi2 > limit) {
        ("misfit".into(), false)
    } else if !fit.assumed.is_empty() {
        (count(fit.assumed.len(), "load assumed", "loads assumed"), true)
    } else {
        ("data ok".into(), true)
    }
}

/// What keeps a corridor blind.
pub fn why_blind(assessment: &Assessment) -> String {
    match assessment.fit.missing.as_slice() {
        [] => "no state: the measurements do not fix it".into(),
        [only] => format!("no state: {} is missing", text::clean(only)),
        [first, rest @ ..] => format!("no state: {} and {} more missing", text::clean(first), rest.len()),
    }
}
