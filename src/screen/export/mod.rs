//! What is on the screen, on file: the record, or the page as text or as a picture.

mod picture;

use std::{
    env,
    fs::{self, OpenOptions},
    io::{self, Write},
    path::{Path, PathBuf},
};

use chrono::{DateTime, Utc};
use ratatui::buffer::{Buffer, Cell};
use unicode_width::UnicodeWidthStr;

pub use picture::svg;

use super::state::{App, Export, Page};
use crate::report::jsonl;

/// Characters of a corridor's name in the name of a file.
const NAME_MAX: usize = 60;
/// Files of one name and moment.
const NUMBERS: usize = 1000;

/// Writes it to the current directory, over no other file; returns what to say.
pub fn export(app: &App, page: &Buffer, what: Export) -> Result<String, String> {
    let (bytes, ending) = match what {
        Export::Record => (record(app).ok_or("there is no record yet")?, "json"),
        Export::Text => (text(page).into_bytes(), "txt"),
        Export::Picture => (svg(page).into_bytes(), "svg"),
    };
    let written = env::current_dir().and_then(|folder| write(&folder, &name(app, what), ending, &bytes));
    match written {
        Ok(path) => Ok(format!("Written: {}", path.display())),
        Err(error) => Err(format!("nothing was written to the current directory: {error}")),
    }
}

/// The record of the corridor with the cursor: the line that `tautline assess` writes.
pub fn record(app: &App) -> Option<Vec<u8>> {
    let mut line = Vec::new();
    jsonl::write(&app.track(app.selected)?.latest, &mut line).ok()?;
    Some(line)
}

/// What it is of, and its time: `Skarn-Velm-corridor-20310314T100750Z`.
fn name(app: &App, what: Export) -> String {
    let corridor = app.corridor().map(|corridor| &*corridor.name);
    let page = match app.page {
        Page::Overview => "corridors",
        Page::Corridor => "corridor",
        Page::Alarms => "alarms",
        Page::Events => "events",
        Page::Compare => "comparison",
        Page::Change => "configuration",
        Page::Messages => "messages",
        Page::Help => "help",
    };
    let of_one = matches!(app.page, Page::Corridor | Page::Compare) || what == Export::Record;
    let mut parts = vec![corridor.filter(|_| of_one).map_or("tautline".into(), plain)];
    parts.extend((what != Export::Record).then(|| page.into()));
    parts.extend(app.present().map(|time: DateTime<Utc>| time.format("%Y%m%dT%H%M%SZ").to_string()));
    parts.join("-")
}

/// A name that is one for a file, too.
fn plain(name: &str) -> String {
    let name: String =
        name.chars().take(NAME_MAX).map(|char| if char.is_alphanumeric() { char } else { '-' }).collect();
    let name = name.trim_matches('-');
    if name.is_empty() { "corridor".into() } else { name.into() }
}

/// Writes to the first free name: `….json`, `…-2.json` and so on.
fn write(folder: &Path, name: &str, ending: &str, bytes: &[u8]) -> io::Result<PathBuf> {
    for number in 1..=NUMBERS {
        let number = if number == 1 { String::new() } else { format!("-{number}") };
        let path = folder.join(format!("{name}{number}.{ending}"));
        match OpenOptions::new().write(true).create_new(true).open(&path) {
            Ok(mut file) => {
                let written = file.write_all(bytes).and_then(|()| file.sync_all());
                return match written {
                    Ok(()) => Ok(path),
                    Err(error) => {
                        let _half_written = fs::remove_file(&path);
                        Err(error)
                    }
                };
            }
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists => {}
            Err(error) => return Err(error),
        }
    }
    Err(io::Error::other(format!("{NUMBERS} files of this name are there already")))
}

/// Cells that are seen, with their column: what a wide character covers is not.
fn seen(line: &[Cell]) -> impl Iterator<Item = (usize, &Cell)> {
    let mut covered = 0;
    line.iter().enumerate().filter(move |(_, cell)| {
        let hidden = covered > 0;
        covered = if hidden { covered - 1 } else { cell.symbol().width().saturating_sub(1) };
        !hidden
    })
}

/// The page as text.
pub fn text(page: &Buffer) -> String {
    let mut text = String::new();
    for line in page.content.chunks(usize::from(page.area.width.max(1))) {
        let line: String = seen(line).map(|(_, cell)| cell.symbol()).collect();
        text += line.trim_end();
        text.push('\n');
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_file_is_written_over() {
        let folder = tempfile::tempdir().unwrap();
        let names: Vec<_> = (0..3)
            .map(|_| write(folder.path(), "Skarn-Velm", "json", b"{}\n").unwrap().file_name().unwrap().to_owned())
            .collect();
        assert_eq!(names, ["Skarn-Velm.json", "Skarn-Velm-2.json", "Skarn-Velm-3.json"]);
        assert!(write(&folder.path().join("gone"), "x", "txt", b"").is_err());
    }

    #[test]
    fn names_stay_in_their_folder() {
        for (name, expected) in [
            ("Skarn-Velm", "Skarn-Velm"),
            ("../../etc/passwd", "etc-passwd"),
            ("a b\u{1b}[31m/\\:", "a-b--31m"),
            ("東西線", "東西線"),
            ("...", "corridor"),
        ] {
            assert_eq!(plain(name), expected);
        }
        assert_eq!(plain(&"x".repeat(500)).len(), NAME_MAX);
    }
}
