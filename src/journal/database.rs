//! The database itself: opening, its schema, and one entry in it.

use std::{path::Path, time::Duration};

use chrono::{DateTime, Utc};
use rusqlite::{Connection, Error, ErrorCode, Transaction, named_params};

use super::{Entry, JournalError, stamp};
use crate::alarm::State;

const APPLICATION_ID: i64 = 0x7461_7574;
const VERSION: i64 = 1;
/// A reader may hold the database for a moment.
const PATIENCE: Duration = Duration::from_millis(250);
/// Rows looked at in one go for being too old.
const PRUNED_AT_ONCE: u16 = 1000;

const SCHEMA: &str = "
    PRAGMA application_id = 1952544116;
    PRAGMA user_version = 1;
    CREATE TABLE entry (
        id INTEGER PRIMARY KEY, time TEXT NOT NULL, written TEXT NOT NULL, kind TEXT NOT NULL,
        corridor TEXT, alarm TEXT, priority TEXT, event TEXT, from_state TEXT, to_state TEXT,
        value REAL, about TEXT, until TEXT, text TEXT, by TEXT
    ) STRICT;
    CREATE INDEX entry_time ON entry (time);
    CREATE INDEX entry_alarm ON entry (corridor, alarm, time);
    CREATE TABLE standing (
        corridor TEXT NOT NULL, alarm TEXT NOT NULL, state TEXT NOT NULL, since TEXT, raised TEXT, value REAL,
        about TEXT, until TEXT, reason TEXT, note TEXT, PRIMARY KEY (corridor, alarm)
    ) STRICT, WITHOUT ROWID;";

const INSERT: &str = "
    INSERT INTO entry (time, written, kind, corridor, alarm, priority, event, from_state, to_state, value, about, until,
        text, by)
    VALUES (:time, :written, :kind, :corridor, :alarm, :priority, :event, :from, :to, :value, :about, :until, :text, :by)";

const STAND: &str = "
    INSERT INTO standing (corridor, alarm, state, since, raised, value, about, until, reason)
    VALUES (:corridor, :alarm, :state, :since, :raised, :value, :about, :until, :reason)
    ON CONFLICT DO UPDATE SET state = excluded.state, since = excluded.since, until = excluded.until,
        reason = excluded.reason, raised = coalesce(excluded.raised, raised),
        value = iif(excluded.raised IS NULL, value, excluded.value),
        about = iif(excluded.raised IS NULL, about, excluded.about)";

const REMARK: &str = "
    INSERT INTO standing (corridor, alarm, state, note) VALUES (:corridor, :alarm, :state, :note)
    ON CONFLICT DO UPDATE SET note = excluded.note";

/// Opens a journal for writing, and begins one where there is none.
pub(super) fn open(path: &Path) -> Result<Connection, JournalError> {
    let failed = |error| JournalError::Database { path: path.to_owned(), error };
    let mut connection = Connection::open(path).map_err(failed)?;
    connection.busy_timeout(PATIENCE).map_err(failed)?;
    let is_new = match connection.query_row("SELECT count(*) FROM sqlite_schema", [], |row| row.get::<_, i64>(0)) {
        Ok(objects) => objects == 0,
        Err(error) if error.sqlite_error_code() == Some(ErrorCode::NotADatabase) => {
            return Err(JournalError::NotAJournal(path.to_owned()));
        }
        Err(error) => return Err(failed(error)),
    };
    if !is_new {
        check(&connection, path)?;
    }
    connection.pragma_update(None, "journal_mode", "WAL").map_err(failed)?;
    connection.pragma_update(None, "synchronous", "FULL").map_err(failed)?;
    if is_new {
        begin(&mut connection).map_err(failed)?;
    }
    Ok(connection)
}

/// All of the schema or nothing: a program that is killed here leaves an empty file.
fn begin(connection: &mut Connection) -> Result<(), Error> {
    let transaction = connection.transaction()?;
    transaction.execute_batch(SCHEMA)?;
    transaction.commit()
}

/// Whether it is a journal that this version understands.
pub(super) fn check(connection: &Connection, path: &Path) -> Result<(), JournalError> {
    let pragma = |name: &str| connection.pragma_query_value(None, name, |row| row.get::<_, i64>(0));
    let failed = |error: Error| match error.sqlite_error_code() {
        Some(ErrorCode::NotADatabase) => JournalError::NotAJournal(path.to_owned()),
        _ => JournalError::Database { path: path.to_owned(), error },
    };
    if pragma("application_id").map_err(failed)? != APPLICATION_ID {
        return Err(JournalError::NotAJournal(path.to_owned()));
    }
    match pragma("user_version").map_err(failed)? {
        VERSION => Ok(()),
        version => Err(JournalError::TooNew { path: path.to_owned(), version }),
    }
}

/// Adds an entry, and changes how its alarm stands.
pub(super) fn insert(transaction: &Transaction<'_>, entry: &Entry, written: DateTime<Utc>) -> Result<(), Error> {
    let time = stamp(entry.time);
    let until = entry.until.map(stamp);
    transaction.prepare_cached(INSERT)?.execute(named_params! {
        ":time": time, ":written": stamp(written), ":kind": entry.kind, ":corridor": entry.corridor,
        ":alarm": entry.alarm, ":priority": entry.priority, ":event": entry.event, ":from": entry.from, ":to": entry.to,
        ":value": entry.value, ":about": entry.about, ":until": until, ":text": entry.text, ":by": entry.by,
    })?;
    if let Some(state) = &entry.to {
        let is_raised = *state == State::Unacknowledged.word();
        transaction.prepare_cached(STAND)?.execute(named_params! {
            ":corridor": entry.corridor, ":alarm": entry.alarm, ":state": state, ":since": time,
            ":raised": is_raised.then_some(&time), ":value": entry.value, ":about": entry.about, ":until": until,
            ":reason": entry.text,
        })?;
    } else if entry.kind == "note" {
        transaction.prepare_cached(REMARK)?.execute(named_params! {
            ":corridor": entry.corridor, ":alarm": entry.alarm, ":state": State::Normal.word(), ":note": entry.text,
        })?;
    }
    Ok(())
}

/// Deletes what was written before a time, of the oldest entries; true if there may be more.
pub(super) fn prune(connection: &Connection, before: DateTime<Utc>) -> Result<bool, Error> {
    let oldest = "SELECT id, written FROM entry ORDER BY id LIMIT ?1";
    let delete = format!("DELETE FROM entry WHERE id IN (SELECT id FROM ({oldest}) WHERE written < ?2)");
    let deleted = connection.execute(&delete, (PRUNED_AT_ONCE, stamp(before)))?;
    Ok(deleted == usize::from(PRUNED_AT_ONCE))
}
