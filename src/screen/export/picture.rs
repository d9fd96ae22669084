//! A drawing as SVG that needs nothing else.

use std::fmt::Write;

use ratatui::{
    buffer::{Buffer, Cell},
    style::{Color, Modifier},
};
use unicode_width::UnicodeWidthStr;

use super::seen;

/// Of a cell of the picture, and where the foot of its letters is.
const CELL: (f64, f64) = (8.4, 17.0);
const FOOT: f64 = 13.0;

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
        assert_eq!(super::super::text(&page), " a<b & \"東\"\n  THIN\n");
        assert_eq!(
            [16, 196, 231, 232, 255, 1].map(indexed),
            ["#000000", "#ff0000", "#ffffff", "#080808", "#eeeeee", "#c01818"]
        );
    }
}
