//! What is on the screen, on file: the record, or the page as text or as a picture.

use std::{
    env,
    fmt::Write as _,
    fs::OpenOptions,
    io::{self, Write},
    path::{Path, PathBuf},
};

use chrono::{DateTime, Utc};
use ratatui::{
    buffer::{Buffer, Cell},
    style::{Color, Modifier},
};
use unicode_width::UnicodeWidthStr;

use super::state::{App, Export, Page};
use crate::report::jsonl;

/// Characters of a corridor's name in the name of a file.
const NAME_MAX: usize = 60;
/// Files of one name and moment.
const NUMBERS: usize = 1000;
/// Of a cell of the picture, and where the foot of its letters is.
const CELL: (f64, f64) = (8.4, 17.0);
const FOOT: f64 = 13.0;

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
                file.write_all(bytes)?;
                return Ok(path);
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

/// How cells look, resolved: ink, paper if any, and the letters' own attributes.
#[derive(PartialEq, Clone)]
struct Look {
    ink: String,
    paper: Option<String>,
    bold: bool,
    dim: bool,
    underlined: bool,
}

impl Look {
    fn of(cell: &Cell) -> Self {
        let is = |modifier| cell.modifier.contains(modifier);
        let (ink, paper) = (colour(cell.fg), colour(cell.bg));
        let (ink, paper) = if is(Modifier::REVERSED) {
            (paper.unwrap_or_else(|| PAPER.into()), Some(ink.unwrap_or_else(|| INK.into())))
        } else {
            (ink.unwrap_or_else(|| INK.into()), paper)
        };
        Self { ink, paper, bold: is(Modifier::BOLD), dim: is(Modifier::DIM), underlined: is(Modifier::UNDERLINED) }
    }
}

const INK: &str = "#1b1b1b";
const PAPER: &str = "#ffffff";

/// The page as a picture that needs nothing else.
pub fn svg(page: &Buffer) -> String {
    let (cell_width, cell_height) = CELL;
    let (width, height) = (f64::from(page.area.width) * cell_width, f64::from(page.area.height) * cell_height);
    let mut svg = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width:.1}\" height=\"{height:.1}\" viewBox=\"0 0 {width:.1} \
         {height:.1}\" font-family=\"'DejaVu Sans Mono', Menlo, Consolas, monospace\" font-size=\"14\">\n\
         <title>tautline</title>\n<rect width=\"100%\" height=\"100%\" fill=\"{PAPER}\"/>\n"
    );
    for (row, line) in page.content.chunks(usize::from(page.area.width.max(1))).enumerate() {
        for run in runs(line) {
            run.draw(row, &mut svg);
        }
    }
    svg += "</svg>\n";
    svg
}

/// Cells of one look, side by side.
struct Run {
    column: usize,
    cells: usize,
    text: String,
    look: Look,
}

fn runs(line: &[Cell]) -> Vec<Run> {
    let mut runs: Vec<Run> = Vec::new();
    for (column, cell) in seen(line) {
        let (look, cells) = (Look::of(cell), cell.symbol().width().max(1));
        match runs.last_mut().filter(|run| run.look == look) {
            Some(run) => {
                run.cells += cells;
                run.text += cell.symbol();
            }
            None => runs.push(Run { column, cells, text: cell.symbol().into(), look }),
        }
    }
    runs
}

impl Run {
    fn draw(&self, row: usize, svg: &mut String) {
        let Look { ink, paper, bold, dim, underlined } = &self.look;
        let (left, top) = (self.column as f64 * CELL.0, row as f64 * CELL.1);
        if let Some(paper) = paper {
            let (width, height) = (self.cells as f64 * CELL.0, CELL.1);
            let _ = writeln!(
                svg,
                "<rect x=\"{left:.1}\" y=\"{top:.1}\" width=\"{width:.1}\" height=\"{height:.1}\" fill=\"{paper}\"/>"
            );
        }
        let letters = self.text.trim_end();
        let blank = letters.width() - letters.trim_start().width();
        let letters = letters.trim_start();
        if letters.is_empty() {
            return;
        }
        let mut look = String::new();
        look += if *bold { " font-weight=\"bold\"" } else { "" };
        look += if *dim { " opacity=\"0.6\"" } else { "" };
        look += if *underlined { " text-decoration=\"underline\"" } else { "" };
        let (x, y) = (left + blank as f64 * CELL.0, top + FOOT);
        // The length keeps letters in their cells, whatever font is there.
        let length = letters.width() as f64 * CELL.0;
        let _ = writeln!(
            svg,
            "<text x=\"{x:.1}\" y=\"{y:.1}\" textLength=\"{length:.1}\" fill=\"{ink}\"{look} xml:space=\"preserve\">{}</text>",
            escaped(letters)
        );
    }
}

/// Text as XML takes it; what XML does not allow at all becomes a dot.
fn escaped(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for char in text.chars() {
        match char {
            '&' => escaped += "&amp;",
            '<' => escaped += "&lt;",
            '>' => escaped += "&gt;",
            '"' => escaped += "&quot;",
            char if char.is_control() || matches!(char, '\u{fffe}' | '\u{ffff}') => escaped.push('·'),
            char => escaped.push(char),
        }
    }
    escaped
}

/// A colour on white paper; `None`: the terminal's own.
fn colour(colour: Color) -> Option<String> {
    Some(match colour {
        Color::Reset => return None,
        Color::Rgb(red, green, blue) => format!("#{red:02x}{green:02x}{blue:02x}"),
        Color::Indexed(index) => indexed(index),
        Color::Black => "#000000".into(),
        Color::Red | Color::LightRed => "#c01818".into(),
        Color::Green | Color::LightGreen => "#1a7f37".into(),
        Color::Yellow | Color::LightYellow => "#ffd33d".into(),
        Color::Blue | Color::LightBlue => "#2257c4".into(),
        Color::Magenta | Color::LightMagenta => "#9a2a9a".into(),
        Color::Cyan | Color::LightCyan => "#5cd0dc".into(),
        Color::Gray => "#c0c0c0".into(),
        Color::DarkGray => "#707070".into(),
        Color::White => "#ffffff".into(),
    })
}

/// The usual 256 colours: 16 named ones, a cube of 6×6×6 and 24 greys.
fn indexed(index: u8) -> String {
    const NAMED: [Color; 16] = [
        Color::Black,
        Color::Red,
        Color::Green,
        Color::Yellow,
        Color::Blue,
        Color::Magenta,
        Color::Cyan,
        Color::Gray,
        Color::DarkGray,
        Color::LightRed,
        Color::LightGreen,
        Color::LightYellow,
        Color::LightBlue,
        Color::LightMagenta,
        Color::LightCyan,
        Color::White,
    ];
    match index {
        0..16 => colour(NAMED[usize::from(index)]).unwrap_or_default(),
        16..232 => {
            let level = |step: u8| if step == 0 { 0 } else { 55 + 40 * step };
            let cube = index - 16;
            format!("#{:02x}{:02x}{:02x}", level(cube / 36), level(cube / 6 % 6), level(cube % 6))
        }
        _ => {
            let grey = 8 + 10 * (index - 232);
            format!("#{grey:02x}{grey:02x}{grey:02x}")
        }
    }
}

#[cfg(test)]
mod tests {
    use ratatui::{layout::Rect, style::Style};

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

    #[test]
    fn a_picture_holds_text_places_and_looks() {
        let mut page = Buffer::empty(Rect::new(0, 0, 12, 2));
        page.set_string(1, 0, "a<b & \"東\"", Style::new());
        page.set_string(2, 1, "THIN", Style::new().fg(Color::Black).bg(Color::Yellow).add_modifier(Modifier::BOLD));
        let svg = svg(&page);
        assert!(svg.contains(">a&lt;b &amp; &quot;東&quot;</text>"), "{svg}");
        assert!(svg.contains(r##"<rect x="16.8" y="17.0" width="33.6" height="17.0" fill="#ffd33d"/>"##), "{svg}");
        assert!(
            svg.contains(r##"<text x="16.8" y="30.0" textLength="33.6" fill="#000000" font-weight="bold""##),
            "{svg}"
        );
        assert_eq!(text(&page), " a<b & \"東\"\n  THIN\n");
        assert_eq!(
            [16, 196, 231, 232, 255, 1].map(indexed),
            ["#000000", "#ff0000", "#ffffff", "#080808", "#eeeeee", "#c01818"]
        );
    }
}
