//! The angle ruler: where a corridor stands between the two sides in step and the point of no return.
//!
//! ```text
//! 0°        30°       60°       90°       120°      150°      180°
//! ━━━━━━━━━━●────◆════════▶·········58° left·········┃░░░░░░░░░░░░
//! ```
//! The line is taut up to now (●), goes on to the balance after the outage (◆) and the top of the swing (▶). What is
//! left from there to the tipping point (┃) is dotted, so that the eye sees the distance that counts.

use ratatui::text::{Line, Span};
use unicode_width::UnicodeWidthStr;

use super::{Theme, figures};
use crate::desk::{Assessment, OutageRecord, State};

/// The scale goes from 0° to here, where the two sides stand against each other.
pub const END_DEG: f64 = 180.0;
/// What the marks mean, for a heading.
pub const LEGEND: &str = "● now  ◆ after the outage  ▶ top of swing  ┃ tipping point";

/// Angles between the sources of the swing, degrees.
#[derive(Debug, Clone, PartialEq)]
pub struct Ruler {
    now: f64,
    after: Option<f64>,
    top: Option<f64>,
    limit: Option<f64>,
    separates: bool,
    state: State,
}

impl Ruler {
    /// The ruler of one outage; `None` without a state of the corridor.
    pub fn new(assessment: &Assessment, outage: Option<&OutageRecord>) -> Option<Self> {
        let now = assessment.detail.as_ref()?.picture.angle_rad.to_degrees();
        let picture = outage.and_then(|outage| outage.picture);
        let deg = |angle: Option<f64>| angle.map(f64::to_degrees);
        Some(Self {
            now,
            after: deg(picture.and_then(|picture| picture.equilibrium_rad)),
            top: deg(picture.and_then(|picture| picture.swing_peak_rad)),
            limit: deg(picture.and_then(|picture| picture.tipping_rad)),
            separates: outage.is_some_and(|outage| outage.separates),
            state: assessment.state,
        })
    }

    /// Degrees from the top of the swing to the tipping point.
    pub fn left_deg(&self) -> Option<f64> {
        Some(self.limit? - self.top?)
    }

    /// The ruler at a width.
    pub fn line(&self, width: usize, theme: Theme) -> Line<'static> {
        let mut cells = vec![' '; width];
        let now = column(self.now, width);
        fill(&mut cells, 0, now, '━');
        let (from, until, label) = match (self.after, self.top, self.limit) {
            _ if self.separates => (now + 1, width, "parts the two sides".into()),
            (Some(after), Some(top), Some(limit)) => {
                let (after, top, limit) = (column(after, width), column(top, width), column(limit, width));
                fill(&mut cells, now, after, '─');
                fill(&mut cells, now.max(after), top, '═');
                fill(&mut cells, top, limit, '·');
                self.wall(&mut cells);
                put(&mut cells, after, '◆');
                put(&mut cells, top, '▶');
                (top + 1, limit, format!("{} left", figures::deg(self.left_deg().map(f64::floor))))
            }
            (Some(after), None, Some(limit)) => {
                let (after, limit) = (column(after, width), column(limit, width));
                fill(&mut cells, now, after, '─');
                fill(&mut cells, now.max(after), limit, '×');
                self.wall(&mut cells);
                put(&mut cells, after, '◆');
                (now.max(after) + 1, limit, "swings out of step".into())
            }
            (None, ..) if self.limit.is_none() && self.top.is_none() => {
                fill(&mut cells, now, width, '×');
                (now + 1, width, "no balance after the outage".into())
            }
            _ => (now + 1, width, String::new()),
        };
        put(&mut cells, now, '●');
        self.labelled(&cells, from, until, &label, theme)
    }

    fn wall(&self, cells: &mut [char]) {
        let width = cells.len();
        let limit = column(self.limit.unwrap_or(END_DEG), width);
        fill(cells, limit, width, '░');
        put(cells, limit, '┃');
    }

    /// Writes the label, or what of it fits, into the middle of a stretch.
    fn labelled(&self, cells: &[char], from: usize, until: usize, label: &str, theme: Theme) -> Line<'static> {
        let room = until.saturating_sub(from);
        // “58° left” still reads as “58°”, and whatever is not survived as “lost”.
        let short = match (label, self.top) {
            ("", _) => "",
            (_, Some(_)) => label.split(' ').next().unwrap_or_default(),
            (_, None) => "lost",
        };
        let text = [label, short].into_iter().find(|text| text.width() + 2 <= room).unwrap_or_default();
        let text = if text.is_empty() { String::new() } else { format!(" {text} ") };
        let start = from + (room - text.width().min(room)) / 2;
        let end = start + text.width();
        let run = |range: &[char]| range.iter().collect::<String>();
        let style = if self.state == State::Ample { theme.strong() } else { theme.badge(self.state) };
        Line::from(vec![
            Span::raw(run(&cells[..start.min(cells.len())])),
            Span::styled(text, style),
            Span::raw(run(&cells[end.min(cells.len())..])),
        ])
    }

    /// The four angles in words.
    pub fn caption(&self) -> String {
        let mut parts = vec![format!("● now {}", figures::deg(Some(self.now)))];
        for (mark, what, angle) in
            [('◆', "after", self.after), ('▶', "top of swing", self.top), ('┃', "tipping point", self.limit)]
        {
            parts.push(format!("{mark} {what} {}", figures::deg(angle)));
        }
        parts.join("   ")
    }
}

/// The scale at a width: a tick every 30°, or every 60° where it is tight.
pub fn scale(width: usize, theme: Theme) -> Line<'static> {
    let step = if width >= 40 { 30 } else { 60 };
    let mut text = String::new();
    for tick in (0..=180).step_by(step) {
        let label = format!("{tick}°");
        let at = if tick == 180 { width.saturating_sub(label.width()) } else { column(f64::from(tick), width) };
        let room_after = if tick == 180 { 0 } else { "180°".width() + 1 };
        let clear = at + label.width() + room_after <= width;
        if clear && (text.is_empty() || at > text.width()) {
            text += &" ".repeat(at - text.width());
            text += &label;
        }
    }
    Line::styled(text, theme.quiet())
}

/// The cell of an angle.
pub fn column(angle_deg: f64, width: usize) -> usize {
    #[allow(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "clamped to 0…180; not a number gives 0"
    )]
    let cell = (angle_deg.clamp(0.0, END_DEG) / END_DEG * width as f64) as usize;
    cell.min(width.saturating_sub(1))
}

fn fill(cells: &mut [char], from: usize, until: usize, with: char) {
    for cell in cells.iter_mut().take(until).skip(from) {
        *cell = with;
    }
}

fn put(cells: &mut [char], at: usize, mark: char) {
    if let Some(cell) = cells.get_mut(at) {
        *cell = mark;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn drawn(angles: [Option<f64>; 3], width: usize) -> String {
        let [after, top, limit] = angles;
        let ruler = Ruler { now: 30.0, after, top, limit, separates: false, state: State::Ample };
        ruler.line(width, Theme { colour: false }).to_string()
    }

    #[test]
    fn the_distance_left_is_what_shows() {
        let full = drawn([Some(45.0), Some(63.0), Some(135.0)], 60);
        assert_eq!(full, "━━━━━━━━━━●────◆═════▶······ 72° left ·······┃░░░░░░░░░░░░░░");
        assert_eq!(
            drawn([Some(45.0), Some(100.0), Some(112.0)], 60),
            "━━━━━━━━━━●────◆═════════════════▶···┃░░░░░░░░░░░░░░░░░░░░░░"
        );
        assert_eq!(
            drawn([Some(80.0), None, Some(100.0)], 60).trim_start_matches(['━', '●', '─']),
            "◆ lost ┃░░░░░░░░░░░░░░░░░░░░░░░░░░"
        );
        assert!(drawn([None, None, None], 60).contains("× no balance after the outage ×"));
    }

    #[test]
    fn it_fits_any_width_and_any_angle() {
        for width in 0..80 {
            for angles in [[Some(-20.0), Some(500.0), Some(f64::NAN)], [Some(45.0), Some(63.0), Some(135.0)], [None; 3]]
            {
                assert_eq!(drawn(angles, width).width(), width, "{angles:?}");
            }
            assert!(scale(width, Theme { colour: false }).width() <= width);
        }
    }
}
