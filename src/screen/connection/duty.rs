//! The alarms of a live feed: whatever they do is in the journal before it is shown as done.

use std::{collections::HashSet, path::PathBuf, sync::Arc};

use chrono::{DateTime, Utc};

use super::{AlarmKey, AlarmOrder, AlarmReport, Alarms, Wish};
use crate::{
    alarm::{Act, Board, Deed, State},
    config::{Config, wording::printable},
    desk::Assessment,
    feed::Start,
    journal::{Entry, Journal, JournalError, ReadOnly},
};

/// Entries of a history that are shown; the rest is in the journal.
const HISTORY_SHOWN: usize = 1000;

/// Keeps the alarms of a live feed.
#[derive(Debug)]
pub struct Duty {
    journal: Journal,
    path: PathBuf,
    /// Who is at the keyboard.
    by: Option<String>,
    report: AlarmReport,
}

impl Duty {
    /// Takes up the alarms where the journal left them.
    pub fn begin(config: &Config, path: PathBuf, by: Option<String>) -> Result<Self, JournalError> {
        let journal = Journal::open(&path, config.journal.keep())?;
        let mut board = Board::new(config);
        let now = Utc::now();
        let gone = board.restore(journal.standing()?);
        let alarms = Alarms::new(board);
        let report = AlarmReport { alarms, journal: Some(journal.status().clone()), ..AlarmReport::default() };
        let by = by.map(|by| printable(&by)).filter(|by| !by.is_empty());
        let mut duty = Self { journal, path, by, report };
        let start = Entry::start(now, &format!("version {}", env!("CARGO_PKG_VERSION")));
        let gone = gone.iter().filter(|gone| gone.standing.state != State::Normal);
        let withdrawn = gone.map(|gone| Entry::withdrawn(gone, now));
        duty.write([start].into_iter().chain(withdrawn).collect());
        Ok(duty)
    }

    /// Takes the assessments of a frame in. Nothing of it may be shown before [`Self::write`].
    pub fn observe(&mut self, assessments: &[Assessment]) -> Vec<Entry> {
        self.report.alarms.observe(assessments)
    }

    /// Takes in that time has passed without a frame.
    pub fn elapse(&mut self, now: DateTime<Utc>) -> Option<Act> {
        let entries = self.report.alarms.elapse(now);
        let act = (!entries.is_empty()).then_some(Act { time: now, by: None, deed: Deed::Silence });
        self.write(entries);
        act
    }

    /// Goes on as a recording says that the alarms stood: its own, so that a replay has the same.
    pub fn begin_at(&mut self, start: &Start) {
        Arc::make_mut(&mut self.report.alarms.board).begin(start);
    }

    /// Does what the operator asks for; what was done.
    pub fn obey(&mut self, order: &AlarmOrder) -> Vec<Act> {
        let outcome = self.report.alarms.obey(&order.wish, self.by.as_deref());
        let acts = outcome.iter().flatten().filter_map(|entry| order.wish.act(entry)).collect();
        let read = match &order.wish {
            Wish::History(key) => self.read(key),
            _ => Ok(()),
        };
        self.report.refusal = outcome
            .map(|entries| self.write(entries))
            .map_err(|e| e.to_string())
            .and(read.map_err(|e| e.to_string()))
            .err();
        self.report.answered = order.number;
        acts
    }

    fn read(&mut self, key: &AlarmKey) -> Result<(), JournalError> {
        let mut entries = ReadOnly::open(&self.path)?.history(&key.corridor, &key.alarm)?;
        entries.drain(..entries.len().saturating_sub(HISTORY_SHOWN));
        self.report.history = Some(Arc::new((key.clone(), entries)));
        Ok(())
    }

    /// Writes entries, together; with none it tries again what could not be written.
    pub fn write(&mut self, entries: Vec<Entry>) {
        let report = &mut self.report;
        if let Some(history) = &mut report.history {
            let news: Vec<_> = entries.iter().filter(|entry| history.0.is_of(entry)).cloned().collect();
            if !news.is_empty() {
                Arc::make_mut(history).1.extend(news);
            }
        }
        let keys: Vec<_> = entries
            .iter()
            .filter_map(|entry| Some(AlarmKey { corridor: entry.corridor.clone()?, alarm: entry.alarm.clone()? }))
            .collect();
        let status = self.journal.write(entries);
        if !status.is_durable() {
            Arc::make_mut(&mut report.unwritten).extend(keys);
        } else if !report.unwritten.is_empty() {
            report.unwritten = Arc::new(HashSet::new());
        }
        if report.journal.as_ref() != Some(status) {
            report.journal = Some(status.clone());
        }
    }

    /// Goes on under another configuration; what it changes is written down in the operator's name.
    pub fn reconfigure(&mut self, config: &Config, changes: &[String]) {
        let time = self.report.alarms.now.unwrap_or_else(Utc::now);
        let what = Entry::configuration(time, &changes.join("; "));
        let what = if let Some(by) = &self.by { what.by(by) } else { what };
        let mut entries = self.report.alarms.reconfigure(config, time);
        entries.insert(0, what);
        self.write(entries);
    }

    /// What a screen shows of it.
    pub fn report(&self) -> &AlarmReport {
        &self.report
    }

    /// Ends it.
    pub fn end(mut self) {
        let time = self.report.alarms.now.unwrap_or_else(Utc::now);
        self.journal.write([Entry::stop(time, "by the operator or a signal")]);
        self.journal.flush();
    }
}
