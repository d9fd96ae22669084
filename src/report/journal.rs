//! An entry of the journal as a line of text.

use std::fmt;

use chrono_tz::Tz;

use crate::{config::wording::printable, journal::Entry};

/// One entry, its times in a zone.
pub struct Line<'a> {
    /// The entry.
    pub entry: &'a Entry,
    /// The zone.
    pub zone: Tz,
}

impl fmt::Display for Line<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Entry { time, kind, corridor, alarm, priority, event, from, to, value, about, until, text, by } =
            self.entry;
        write!(f, "{}  ", time.with_timezone(&self.zone).format("%Y-%m-%d %H:%M:%S"))?;
        // What is in a database may come from anywhere.
        let shown = |text: &Option<_>| text.as_deref().map(printable).unwrap_or_default();
        match (corridor, alarm) {
            (Some(corridor), Some(alarm)) => write!(f, "{}  {}", printable(corridor), printable(alarm))?,
            _ => write!(f, "{}", printable(kind))?,
        }
        if let Some(priority) = priority {
            write!(f, " ({})", printable(priority))?;
        }
        if let (Some(event), Some(from), Some(to)) = (event, from, to) {
            write!(f, "  {}: {} to {}", printable(event), printable(from), printable(to))?;
        } else if alarm.is_some() {
            write!(f, "  {}", printable(kind))?;
        }
        if let Some(value) = value {
            write!(f, "  at {value:.1}")?;
        }
        if about.is_some() {
            write!(f, " ({})", shown(about))?;
        }
        if let Some(until) = until {
            write!(f, "  until {}", until.with_timezone(&self.zone).format("%Y-%m-%d %H:%M:%S"))?;
        }
        if text.is_some() {
            write!(f, "  {}", shown(text))?;
        }
        if by.is_some() {
            write!(f, "  by {}", shown(by))?;
        }
        Ok(())
    }
}
