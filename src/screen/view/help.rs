use ratatui::text::{Line, Span};

use super::{Theme, ruler, text};
use crate::{desk::State, screen::state::KEYS};

/// What the numbers mean.
const NUMBERS: [(&str, &str); 11] = [
    (
        "headroom",
        "MW that may still be added so that the next outage is survived by every criterion; negative: MW to take off now. Rounded down. ± is one standard deviation, from what is not known of the two sides.",
    ),
    (
        "set by",
        "the outage and the criterion with the smallest limit: angle (a balance with the required margin to 90°), area (energy left in the first swing), loading (short-time ratings), voltage (floors), separation (no path is left).",
    ),
    (
        "angle ruler",
        "the angle between the two sides, 0° in step, 180° opposed. The line is taut up to now, goes on to the balance after the outage and to the top of the first swing. The dots are what is left to the tipping point, past which the sides fall out of step.",
    ),
    ("angle margin", "degrees from the balance after the outage to 90°, where the remaining network carries its most."),
    (
        "area margin",
        "energy left of what the first swing can absorb: 1 is all of it, 0 is the edge, below 0 the sides fall out of step (equal-area criterion).",
    ),
    (
        "clearing",
        "critical clearing time: the longest the fault may last. It must be longer than the clearing time it is compared with.",
    ),
    (
        "trend",
        "where the headroom went in the last 10 minutes; with a time, when it gets there if it goes on like that.",
    ),
    (
        "curves",
        "transfer against angle. The level line is what the machines deliver. Where the curve is below it the swing speeds up (dense), above it the swing slows down (light): survived when the light area can match the dense one before the tipping point.",
    ),
    (
        "time bar",
        "the whole recording: its worst states (on a corridor’s page its own), and above them, or on a small terminal in them, T trip, R return, B bypass, I insertion, D direction, ▲ alarm raised, ▼ lowest headroom of a day, ▾ of a dip, G gap, m meter, * mark. What is of other corridors is faint.",
    ),
    (
        "spread, ±",
        "learned sources know themselves better with every step seen on the grid; configured ones keep the spread they were given.",
    ),
    ("suspect", "a measurement that contradicts the others and is left out of the fit; look at that meter."),
];

const CAUTION: &str = "tautline advises. Protection, approved operating limits, local codes and licensed engineers stand \
above it. Its method leaves out: governors, exciters, load dynamics and damping (classical machines, constant voltage \
behind a reactance), every swing after the first, unbalance apart from the fault itself, swings inside a side (each side \
swings as one). Loads are constant admittances. On Kundur’s two-area system its clearing times lie between 19 % below and \
26 % above those of detailed simulations.";

/// Every key, what the numbers mean, and the caution.
pub fn lines(theme: Theme, width: usize) -> Vec<Line<'static>> {
    let mut lines = vec![heading("Caution", theme)];
    lines.extend(item("", CAUTION, 2, width, theme));
    lines.push(Line::default());
    lines.push(heading("States", theme));
    for (state, words) in [
        (State::Ample, "headroom above the corridor’s thin threshold"),
        (State::Thin, "headroom below the thin threshold: little room left"),
        (State::Spent, "no headroom: the next outage would not be survived as required; act"),
        (State::Blind, "too little is measured to say; see what is missing on the corridor’s Data part"),
    ] {
        lines.push(Line::from(vec![
            Span::raw("  "),
            Span::styled(format!("{} {}", theme.mark(state), text::left(&theme.word(state), 6)), theme.badge(state)),
            Span::raw(text::cut(&format!("  {words}"), width.saturating_sub(10))),
        ]));
    }
    for (title, keys) in KEYS {
        lines.push(Line::default());
        lines.push(heading(title, theme));
        for (key, what) in keys {
            lines.extend(item(key, what, 18, width, theme));
        }
    }
    lines.push(Line::default());
    lines.push(heading("What the numbers mean", theme));
    lines.extend(item("", ruler::LEGEND, 2, width, theme));
    for (word, meaning) in NUMBERS {
        lines.extend(item(word, meaning, 18, width, theme));
    }
    lines
}

fn heading(words: &str, theme: Theme) -> Line<'static> {
    Line::styled(format!(" {words}"), theme.strong())
}

fn item(word: &str, meaning: &str, indent: usize, width: usize, theme: Theme) -> Vec<Line<'static>> {
    let wrapped = text::wrap(meaning, width.min(110).saturating_sub(indent + 1), 0);
    let lead = |index| if index == 0 { format!("  {word}") } else { String::new() };
    let line = |(index, line)| {
        Line::from(vec![Span::styled(text::left(&lead(index), indent), theme.strong()), Span::raw(line)])
    };
    wrapped.into_iter().enumerate().map(line).collect()
}
