//! Reading a journal, without ever changing it.

use std::path::{Path, PathBuf};

use chrono::{DateTime, Utc};
use rusqlite::{Connection, Error, OpenFlags, Row, Statement, types::Type};

use super::{Entry, JournalError, database, stamp, time_of};
use crate::alarm::{Restored, Standing, State};

const STANDING: &str = "SELECT corridor, alarm, state, since, raised, value, about, until, reason, note FROM standing ORDER BY corridor, alarm";
const COLUMNS: &str =
    "time, kind, corridor, alarm, priority, event, from_state, to_state, value, about, until, text, by";

/// A journal opened for reading only.
#[derive(Debug)]
pub struct ReadOnly {
    path: PathBuf,
    connection: Connection,
}

/// A question to a journal, to be run entry by entry.
#[derive(Debug)]
pub struct Entries<'a> {
    path: &'a Path,
    statement: Statement<'a>,
    span: [String; 2],
}

impl ReadOnly {
    /// Opens it.
    pub fn open(path: &Path) -> Result<Self, JournalError> {
        let failed = |error| JournalError::Database { path: path.to_owned(), error };
        if !path.exists() {
            return Err(JournalError::NotThere(path.to_owned()));
        }
        let flags = OpenFlags::SQLITE_OPEN_READ_ONLY | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let mut connection = Connection::open_with_flags(path, flags).map_err(failed)?;
        if let Err(JournalError::Database { .. }) = database::check(&connection, path) {
            // A finished journal on a disk that is read-only has no room for the files that readers share.
            let uri = format!("file:{}?immutable=1", escaped(path));
            connection = Connection::open_with_flags(uri, flags | OpenFlags::SQLITE_OPEN_URI).map_err(failed)?;
        }
        database::check(&connection, path)?;
        Ok(Self { path: path.to_owned(), connection })
    }

    /// How the alarms stand.
    pub fn standing(&self) -> Result<Vec<Restored>, JournalError> {
        standing(&self.connection).map_err(|error| JournalError::Database { path: self.path.clone(), error })
    }

    /// Entries from a time up to another, in order.
    pub fn entries(&self, from: Option<DateTime<Utc>>, to: Option<DateTime<Utc>>) -> Result<Entries<'_>, JournalError> {
        let failed = |error| JournalError::Database { path: self.path.clone(), error };
        let order = "ORDER BY time, id";
        let question = format!("SELECT {COLUMNS} FROM entry WHERE time >= ?1 AND time < ?2 {order}");
        let statement = self.connection.prepare(&question).map_err(failed)?;
        // Text that sorts before and after every time.
        let span = [from.map_or(String::new(), stamp), to.map_or("~".to_owned(), stamp)];
        Ok(Entries { path: &self.path, statement, span })
    }

    /// Everything that happened to one alarm, in order.
    pub fn history(&self, corridor: &str, alarm: &str) -> Result<Vec<Entry>, JournalError> {
        let question = format!("SELECT {COLUMNS} FROM entry WHERE corridor = ?1 AND alarm = ?2 ORDER BY time, id");
        let read = || -> Result<Vec<Entry>, Error> {
            let mut statement = self.connection.prepare(&question)?;
            statement.query_map([corridor, alarm], entry)?.collect()
        };
        read().map_err(|error| JournalError::Database { path: self.path.clone(), error })
    }
}

impl Entries<'_> {
    /// One after another.
    pub fn read(&mut self) -> Result<impl Iterator<Item = Result<Entry, JournalError>>, JournalError> {
        let path = self.path;
        let failed = move |error| JournalError::Database { path: path.to_owned(), error };
        let entries = self.statement.query_map([&self.span[0], &self.span[1]], entry).map_err(failed)?;
        Ok(entries.map(move |entry| entry.map_err(failed)))
    }
}

/// A path within a URI, RFC 3986.
fn escaped(path: &Path) -> String {
    let escape = |byte: u8| match byte {
        b'a'..=b'z' | b'A'..=b'Z' | b'0'..=b'9' | b'/' | b'.' | b'-' | b'_' | b'~' => char::from(byte).to_string(),
        byte => format!("%{byte:02X}"),
    };
    path.as_os_str().as_encoded_bytes().iter().copied().map(escape).collect()
}

pub(super) fn standing(connection: &Connection) -> Result<Vec<Restored>, Error> {
    let mut statement = connection.prepare(STANDING)?;
    let restored = |row: &Row<'_>| {
        let state: String = row.get(2)?;
        let standing = Standing {
            state: State::from_word(&state)
                .ok_or_else(|| Error::FromSqlConversionFailure(2, Type::Text, format!("no state {state:?}").into()))?,
            since: time(row, 3)?,
            raised: time(row, 4)?,
            value: row.get(5)?,
            about: row.get(6)?,
            until: time(row, 7)?,
            reason: row.get(8)?,
            note: row.get(9)?,
        };
        Ok(Restored { corridor: row.get(0)?, alarm: row.get(1)?, standing })
    };
    statement.query_map([], restored)?.collect()
}

fn entry(row: &Row<'_>) -> Result<Entry, Error> {
    let word = |column| row.get::<_, Option<String>>(column).map(|word| word.map(Into::into));
    let missing = || Error::FromSqlConversionFailure(0, Type::Null, "no time".into());
    Ok(Entry {
        time: time(row, 0)?.ok_or_else(missing)?,
        kind: row.get::<_, String>(1)?.into(),
        corridor: row.get(2)?,
        alarm: row.get(3)?,
        priority: word(4)?,
        event: word(5)?,
        from: word(6)?,
        to: word(7)?,
        value: row.get(8)?,
        about: row.get(9)?,
        until: time(row, 10)?,
        text: row.get(11)?,
        by: row.get(12)?,
    })
}

fn time(row: &Row<'_>, column: usize) -> Result<Option<DateTime<Utc>>, Error> {
    let Some(stamp): Option<String> = row.get(column)? else { return Ok(None) };
    let time = time_of(&stamp);
    let wrong = || Error::FromSqlConversionFailure(column, Type::Text, format!("no time {stamp:?}").into());
    Ok(Some(time.ok_or_else(wrong)?))
}
