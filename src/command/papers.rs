//! Where a review is written.

use std::{
    fs::{self, File},
    io::{self, BufWriter, ErrorKind, Write, stdout},
    path::{Path, PathBuf},
};

use clap::Args;

use super::Failure;
use crate::report::review::{Paper, csv, html, json, text};

/// Options on where a review goes. Each file may be -, standard output, which otherwise gets it as text.
#[derive(Debug, Args)]
pub(super) struct Papers {
    /// Write it as one self-contained page with plots
    #[arg(long, value_name = "FILE")]
    html: Option<PathBuf>,
    /// Write everything as one JSON object
    #[arg(long, value_name = "FILE")]
    json: Option<PathBuf>,
    /// Write one row for each corridor and day, for a spreadsheet
    #[arg(long, value_name = "FILE")]
    csv: Option<PathBuf>,
}

type Writing = fn(&Paper, &mut dyn Write) -> io::Result<()>;

impl Papers {
    /// Refuses what could not be written: better before the work than after it.
    pub fn check(&self) -> Result<(), Failure> {
        let wanted = [&self.html, &self.json, &self.csv].into_iter().flatten();
        let (stdout, files): (Vec<_>, Vec<_>) = wanted.partition(|path| is_stdout(path));
        if stdout.len() > 1 {
            return Err("standard output can take only one of --html, --json and --csv".into());
        }
        for path in files {
            let is_there = path.exists();
            if is_there && !path.is_file() && !path.is_dir() {
                // A pipe may have to be opened once only.
                continue;
            }
            let opened = File::options().append(true).create(true).open(path);
            opened.map_err(|error| format!("cannot write {}: {error}; name another file", path.display()))?;
            if !is_there {
                let _nothing_lost = fs::remove_file(path);
            }
        }
        Ok(())
    }

    pub fn write(&self, paper: &Paper) -> Result<(), Failure> {
        let formats: [(&Option<PathBuf>, Writing); 3] = [
            (&self.html, |paper, to| html::write(paper, to)),
            (&self.json, |paper, to| json::write(paper, to)),
            (&self.csv, |paper, to| csv::write(paper, to)),
        ];
        let mut wanted: Vec<(&Path, Writing)> =
            formats.iter().filter_map(|(path, write)| Some((path.as_deref()?, *write))).collect();
        if !wanted.iter().any(|(path, _)| is_stdout(path)) {
            wanted.push((Path::new("-"), |paper, to| text::write(paper, to)));
        }
        for (path, write) in wanted {
            let to = |to: &mut dyn Write| write(paper, to).and_then(|()| to.flush());
            let written = if is_stdout(path) {
                to(&mut BufWriter::new(stdout().lock()))
            } else {
                File::create(path).and_then(|file| to(&mut BufWriter::new(file)))
            };
            match written {
                // Nobody reads on.
                Err(error) if error.kind() == ErrorKind::BrokenPipe && is_stdout(path) => {}
                written => written.map_err(|error| {
                    let to = if is_stdout(path) { "to standard output".into() } else { path.display().to_string() };
                    format!("cannot write {to}: {error}")
                })?,
            }
        }
        Ok(())
    }
}

fn is_stdout(path: &Path) -> bool {
    path == Path::new("-")
}
