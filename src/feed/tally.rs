use std::{collections::BTreeSet, fmt, sync::Arc};

use super::line_error::LineError;

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
    /// Frames dropped because the program did not keep up with datagrams.
    pub overrun: u64,
    /// Connections opened again.
    pub reconnects: u64,
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

    /// Whether everything that came could be used.
    pub fn is_clean(&self) -> bool {
        *self == Self { frames: self.frames, ..Self::default() }
    }
}

/// One finding a line; nothing when clean.
impl fmt::Display for Tally {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let mut findings = Vec::new();
        let mut count = |n: u64, what: &str| {
            if n > 0 {
                findings.push(format!("{n} {what}"));
            }
        };
        count(self.malformed, &format!("malformed lines skipped{}", self.listed_reasons()));
        count(self.unknown.count, &format!("values of unknown channels ignored ({})", self.unknown));
        count(self.invalid.count, &format!("values invalid ({})", self.invalid));
        count(self.old, "frames dropped: older than one before them");
        count(self.overrun, "frames dropped: they came faster than they could be used");
        count(self.reconnects, "reconnections");
        findings.extend(self.trouble.clone());
        f.write_str(&findings.join("\n"))
    }
}

impl Tally {
    fn listed_reasons(&self) -> String {
        self.reasons.iter().map(|(line, reason)| format!("\n  line {line}: {reason}")).collect()
    }
}

impl fmt::Display for Named {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let names: Vec<&str> = self.names.iter().map(|name| &**name).collect();
        f.write_str(&names.join(", "))?;
        f.write_str(if names.len() == KEPT { ", …" } else { "" })
    }
}

/// Text from outside, fit for a terminal: no control characters, bounded.
pub(super) fn printable(text: &str) -> String {
    let mut shown: String =
        text.chars().map(|c| if is_harmless(c) { c } else { '\u{fffd}' }).take(TEXT_CHARS + 1).collect();
    if let Some((end, _)) = shown.char_indices().nth(TEXT_CHARS) {
        shown.truncate(end);
        shown.push('…');
    }
    shown
}

/// Neither a control character nor one that reorders the text around it (Unicode Standard Annex 9).
fn is_harmless(c: char) -> bool {
    !c.is_control() && !matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}
