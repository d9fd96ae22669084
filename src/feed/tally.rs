use std::{collections::BTreeSet, fmt, sync::Arc};

use super::{Untaken, line_error::LineError};
use crate::config::wording::is_unprintable;

/// Names and reasons kept of each sort: the first few show what is wrong.
const KEPT: usize = 5;
/// Longest text kept from outside, characters.
const TEXT_CHARS: usize = 120;

/// What came in through one input, and what of it could not be used.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Tally {
    /// Frames read.
    pub frames: u64,
    /// Lines that are no frame.
    pub malformed: u64,
    /// The first of these: line number and reason, without control characters.
    pub reasons: Vec<(u64, String)>,
    /// Values of channels that the configuration does not know.
    pub unknown: Named,
    /// Values that are not numbers, absurd, or given twice in one frame.
    pub invalid: Named,
    /// Frames dropped because they are older than one before them.
    pub old: u64,
    /// Frames of live inputs dropped because they are far ahead of the clock and of the frame before them.
    pub ahead: u64,
    /// Frames dropped because the program did not keep up with datagrams.
    pub overrun: u64,
    /// Connections opened again.
    pub reconnects: u64,
    /// What a recording says besides its frames, and could not be taken up.
    pub untaken: Untaken,
    /// What went wrong last outside the frames themselves: a broken archive, a refused connection.
    pub trouble: Option<String>,
}

/// A count, and the first few names it is about.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Named {
    /// How many.
    pub count: u64,
    /// Some of the names, without control characters.
    pub names: BTreeSet<Arc<str>>,
}

impl Named {
    pub(super) fn count(&mut self, name: &str) {
        self.count += 1;
        if self.names.len() < KEPT && !self.names.contains(name) {
            self.names.insert(printable(name).into());
        }
    }
}

impl Tally {
    /// Counts a line that is no frame.
    pub(super) fn malformed(&mut self, line: u64, error: &LineError) {
        self.malformed += 1;
        if self.reasons.len() < KEPT {
            self.reasons.push((line, printable(&error.to_string())));
        }
    }

    /// Keeps what went wrong outside the frames.
    pub(super) fn trouble(&mut self, error: &impl fmt::Display) {
        self.trouble = Some(printable(&error.to_string()));
    }

    /// What could not be used, in one line each; nothing when all could.
    pub fn findings(&self) -> Vec<String> {
        let reasons = self.reasons.iter().map(|(line, reason)| format!("line {line}: {reason}"));
        let untaken = self.untaken.named();
        let counts = [
            (self.malformed, "malformed lines skipped", such_as(reasons)),
            (self.unknown.count, "values of unknown channels ignored", such_as(self.unknown.names.iter())),
            (self.invalid.count, "values invalid", such_as(self.invalid.names.iter())),
            (self.old, "frames dropped, older than one before them", String::new()),
            (self.ahead, "frames dropped, far ahead of the clock and of the frame before them", String::new()),
            (self.overrun, "frames dropped, more than could be used in time", String::new()),
            (self.reconnects, "connections opened again", String::new()),
            (untaken.count, "facts of a recording not taken up", such_as(untaken.names.iter())),
        ];
        let counted = counts.into_iter().filter(|(count, ..)| *count > 0);
        counted.map(|(count, what, which)| format!("{count} {what}{which}")).chain(self.trouble.clone()).collect()
    }
}

fn such_as(some: impl Iterator<Item = impl ToString>) -> String {
    let some: Vec<String> = some.map(|one| one.to_string()).collect();
    if some.is_empty() { String::new() } else { format!(", such as {}", some.join("; ")) }
}

/// Text from outside, fit for a terminal: bounded, without control characters and the like.
pub(super) fn printable(text: &str) -> String {
    let shown = text.chars().map(|c| if is_unprintable(c) { '\u{fffd}' } else { c });
    let mut shown: String = shown.take(TEXT_CHARS + 1).collect();
    if let Some((end, _)) = shown.char_indices().nth(TEXT_CHARS) {
        shown.truncate(end);
        shown.push('…');
    }
    shown
}
