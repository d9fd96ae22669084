//! `tautline journal`: prints or exports what the alarms did.

use std::{
    io::{self, BufWriter, Write, stdout},
    path::PathBuf,
};

use chrono::{DateTime, LocalResult, NaiveDate, NaiveDateTime, NaiveTime, TimeZone, Utc};
use chrono_tz::Tz;
use clap::{Args, ValueEnum};

use super::Failure;
use crate::{
    config::Config,
    journal::{Entry, ReadOnly},
    report::journal::Line,
};

/// Options of `journal`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file, which says where the journal is
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
    /// Only from this time on: 2031-03-14, 2031-03-14T14:03:20 or 2031-03-14T14:03:20Z; without a zone in that of the
    /// configuration
    #[arg(long, value_name = "TIME")]
    from: Option<String>,
    /// Only before this time
    #[arg(long, value_name = "TIME")]
    to: Option<String>,
    /// How to write it
    #[arg(long, value_enum, default_value_t)]
    format: Format,
}

/// How entries are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, ValueEnum)]
pub enum Format {
    /// A line each, to be read
    #[default]
    Text,
    /// A JSON object on a line each
    Json,
    /// Comma-separated, with a heading
    Csv,
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let config = Config::load(&options.config)?;
    let time = |text: &Option<String>| text.as_deref().map(|text| time(text, config.time_zone)).transpose();
    let (from, to) = (time(&options.from)?, time(&options.to)?);
    let journal = ReadOnly::open(&config.journal.path(&options.config))?;
    let mut entries = journal.entries(from, to)?;
    let mut out = BufWriter::new(stdout().lock());
    let written = match options.format {
        Format::Text => entries
            .read()?
            .try_for_each(|entry| Ok(writeln!(out, "{}", Line { entry: &entry?, zone: config.time_zone })?)),
        Format::Json => entries.read()?.try_for_each(|entry| json(&entry?, &mut out)),
        Format::Csv => {
            let mut rows = csv::Writer::from_writer(&mut out);
            entries.read()?.try_for_each(|entry| Ok(rows.serialize(entry?)?)).and_then(|()| Ok(rows.flush()?))
        }
    };
    match written.and_then(|()| Ok(out.flush()?)) {
        Err(failure) if is_broken_pipe(&*failure) => Ok(()),
        outcome => outcome,
    }
}

fn json(entry: &Entry, out: &mut impl Write) -> Result<(), Failure> {
    serde_json::to_writer(&mut *out, entry)?;
    Ok(out.write_all(b"\n")?)
}

/// Nobody reads on.
fn is_broken_pipe(failure: &(dyn std::error::Error + 'static)) -> bool {
    let is_broken = |kind: Option<io::ErrorKind>| kind == Some(io::ErrorKind::BrokenPipe);
    is_broken(failure.downcast_ref::<io::Error>().map(io::Error::kind))
        || is_broken(failure.downcast_ref::<serde_json::Error>().and_then(serde_json::Error::io_error_kind))
        || failure.downcast_ref::<csv::Error>().is_some_and(
            |error| matches!(error.kind(), csv::ErrorKind::Io(error) if error.kind() == io::ErrorKind::BrokenPipe),
        )
}

/// A time as people write it; one that a change of the clocks leaves out or brings twice is taken at its earliest.
fn time(text: &str, zone: Tz) -> Result<DateTime<Utc>, Failure> {
    if let Ok(time) = DateTime::parse_from_rfc3339(text) {
        return Ok(time.to_utc());
    }
    let formats = ["%Y-%m-%dT%H:%M:%S%.f", "%Y-%m-%d %H:%M:%S%.f", "%Y-%m-%dT%H:%M", "%Y-%m-%d %H:%M"];
    let local = formats.iter().find_map(|format| NaiveDateTime::parse_from_str(text, format).ok());
    let midnight = || NaiveDate::parse_from_str(text, "%Y-%m-%d").ok().map(|day| day.and_time(NaiveTime::MIN));
    let Some(local) = local.or_else(midnight) else {
        return Err(format!("{text:?} is no time; write 2031-03-14, 2031-03-14T14:03 or 2031-03-14T14:03:20Z").into());
    };
    match zone.from_local_datetime(&local) {
        LocalResult::Single(time) | LocalResult::Ambiguous(time, _) => Ok(time.to_utc()),
        LocalResult::None => Ok(zone.from_utc_datetime(&local).to_utc()),
    }
}
