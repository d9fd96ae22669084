//! The course of a headroom in a few lines of characters.

use std::fmt;

use super::{
    clock::Clock,
    figures::{lasting, room},
};
use crate::{desk::State, review::Series};

/// Columns of the drawing.
const COLUMNS: i64 = 80;
const LINES: usize = 5;
const EIGHTHS: [char; 9] = [' ', '▁', '▂', '▃', '▄', '▅', '▆', '▇', '█'];

/// The lowest headroom in each column of time, and under it the worst state.
pub(super) struct Sketch<'a> {
    pub series: &'a Series,
    pub clock: Clock,
}

/// What a column shows.
#[derive(Clone, Copy, Default)]
struct Column {
    headroom_mw: Option<f64>,
    state: Option<State>,
}

impl Sketch<'_> {
    /// Seconds of a column, and when the first begins.
    fn scale(&self) -> Option<(i64, i64)> {
        let (first, last) = (self.series.slots.first()?.at_s, self.series.slots.last()?.at_s);
        let slots = (last - first) / self.series.slot_s + 1;
        Some(((slots + COLUMNS - 1) / COLUMNS * self.series.slot_s, first))
    }

    fn columns(&self, width_s: i64, first: i64) -> Vec<Column> {
        let mut columns = Vec::new();
        for slot in &self.series.slots {
            let place = ((slot.at_s - first) / width_s).clamp(0, COLUMNS - 1);
            let place = usize::try_from(place).unwrap_or(0);
            columns.resize(columns.len().max(place + 1), Column::default());
            let column = &mut columns[place];
            let lowest = slot.headroom_mw.map(|[low, _]| low);
            column.headroom_mw = match (column.headroom_mw, lowest) {
                (Some(one), Some(other)) => Some(one.min(other)),
                (one, other) => one.or(other),
            };
            if column.state.is_none_or(|state| slot.state.severity() > state.severity()) {
                column.state = Some(slot.state);
            }
        }
        columns
    }
}

impl fmt::Display for Sketch<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Some((width_s, first)) = self.scale() else { return Ok(()) };
        let columns = self.columns(width_s, first);
        // Few columns are drawn wide.
        let wide = usize::try_from(COLUMNS).unwrap_or(0) / columns.len().max(1);
        let columns: Vec<_> = columns.into_iter().flat_map(|column| std::iter::repeat_n(column, wide)).collect();
        let highest = columns.iter().filter_map(|column| column.headroom_mw).fold(0.0, f64::max);
        writeln!(f, "\n  lowest headroom in each {}, MW", lasting(1000 * width_s))?;
        if highest > 0.0 {
            for line in (0..LINES).rev() {
                let label = match line {
                    _ if line == LINES - 1 => room(highest),
                    0 => "0".into(),
                    _ => String::new(),
                };
                let drawn: String = columns.iter().map(|column| cell(column.headroom_mw, highest, line)).collect();
                writeln!(f, "  {label:>8} │{}", drawn.trim_end())?;
            }
        }
        let states: String = columns.iter().map(|column| column.state.map_or(' ', letter)).collect();
        writeln!(f, "  {:>8} │{}", "state", states.trim_end())?;
        let time =
            |at_s: i64| chrono::DateTime::from_timestamp(at_s, 0).map_or(String::new(), |time| self.clock.when(time));
        let last = self.series.slots.last().map_or(first, |slot| slot.at_s + self.series.slot_s);
        let [begin, end] = [first, last].map(time);
        let gap = columns.len().saturating_sub(begin.chars().count());
        writeln!(f, "  {:>8}  {begin}{end:>gap$}", "")?;
        writeln!(f, "  {:>8}  · ample, t thin, S spent, b blind, blank: no data", "")
    }
}

/// The part of a column that is in a line, in eighths.
fn cell(headroom_mw: Option<f64>, highest: f64, line: usize) -> char {
    let eighths = headroom_mw.map_or(0.0, |mw| (mw / highest).clamp(0.0, 1.0)) * (8 * LINES) as f64;
    // Between 0 and 40.
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
    let eighths = eighths.round() as usize;
    EIGHTHS[eighths.saturating_sub(8 * line).min(8)]
}

fn letter(state: State) -> char {
    match state {
        State::Ample => '·',
        State::Thin => 't',
        State::Spent => 'S',
        State::Blind => 'b',
    }
}
