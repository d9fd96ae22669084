//! The power-angle curves, with the ruler as their axis of angles.

use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    style::Color,
    text::Line,
    widgets::{
        Paragraph,
        canvas::{Canvas, Painter, Shape},
    },
};

use super::{
    figures,
    ruler::{self, END_DEG, Ruler},
    subject::{Subject, nothing},
    text,
};
use crate::margin::{OutagePicture, PowerAngle};

/// Columns left of the plot, for MW.
const GUTTER: u16 = 7;
const LEGEND: &str = "dashed now, solid after, dotted fault on; dense: speeds up, light: slows down";

/// Draws them for the chosen outage.
pub fn draw(frame: &mut Frame, area: Rect, subject: &Subject) {
    let assessment = &subject.track.latest;
    let (Some(detail), Some(transfer_mw)) = (&assessment.detail, assessment.transfer_mw) else {
        return nothing(
            frame,
            area,
            "No curves: the corridor has no state at this frame. See Data for what is missing.",
        );
    };
    let [plot, axis, scale, notes] =
        Layout::vertical([Constraint::Fill(1), Constraint::Length(1), Constraint::Length(1), Constraint::Length(2)])
            .areas(area);
    let [gutter, plot] = Layout::horizontal([Constraint::Length(GUTTER), Constraint::Fill(1)]).areas(plot);

    let picture = detail.picture;
    let drawing = Drawing {
        now: picture.curve,
        after: subject.outage.and_then(|outage| outage.picture),
        angle_rad: picture.angle_rad,
        p_m_mw: picture.p_m_mw,
        raise_mw: transfer_mw - picture.p_m_mw,
        cells: (plot.width, plot.height),
    };
    let bounds = drawing.bounds_mw();
    let labels = drawing.labels(subject.outage.map_or("", |outage| &outage.name));
    let canvas = Canvas::default().x_bounds([0.0, END_DEG]).y_bounds(bounds).paint(|context| {
        context.draw(&drawing);
        for (angle_deg, mw, label) in &labels {
            context.print(*angle_deg, *mw, Line::raw(label.clone()));
        }
    });
    frame.render_widget(canvas, plot);
    draw_ticks(frame, gutter, bounds, transfer_mw, subject);
    let width = usize::from(plot.width);
    let under = |row: Rect| Rect { x: plot.x, width: plot.width, ..row };
    if let Some(ruler) = Ruler::new(assessment, subject.outage) {
        frame.render_widget(ruler.line(width, subject.theme), under(axis));
        let caption = text::cut(&ruler.caption(), usize::from(area.width));
        let legend = text::cut(LEGEND, usize::from(area.width));
        frame.render_widget(
            Paragraph::new(vec![Line::raw(caption), Line::styled(legend, subject.theme.quiet())]),
            notes,
        );
    }
    frame.render_widget(ruler::scale(width, subject.theme), under(scale));
}

fn draw_ticks(frame: &mut Frame, gutter: Rect, bounds: [f64; 2], transfer_mw: f64, subject: &Subject) {
    let rows = f64::from(gutter.height.saturating_sub(1).max(1));
    let row_of = |mw: f64| {
        let share = (bounds[1] - mw) / (bounds[1] - bounds[0]);
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the rows")]
        let row = (share * rows).round().clamp(0.0, rows) as u16;
        row
    };
    let step = tick_step(bounds[1] - bounds[0], rows);
    let here = row_of(transfer_mw);
    let mut tick = (bounds[0] / step).ceil() * step;
    while tick <= bounds[1] {
        let row = row_of(tick);
        if row != here {
            let label = Line::styled(
                format!("{} ", text::right(&figures::mw(Some(tick)), usize::from(GUTTER) - 1)),
                subject.theme.quiet(),
            );
            frame.render_widget(label, super::row(gutter, row));
        }
        tick += step;
    }
    let label = Line::styled(
        format!("{}▸", text::right(&figures::mw(Some(transfer_mw)), usize::from(GUTTER) - 1)),
        subject.theme.strong(),
    );
    frame.render_widget(label, super::row(gutter, here));
    frame.render_widget(Line::styled("MW", subject.theme.quiet()), super::row(gutter, 0));
}

/// A round step so that ticks stand at least three rows apart.
fn tick_step(span: f64, rows: f64) -> f64 {
    let rough = (span / (rows / 3.0).max(1.0)).max(1e-3);
    let magnitude = 10f64.powf(rough.log10().floor());
    [1.0, 2.0, 5.0, 10.0].map(|factor| factor * magnitude).into_iter().find(|step| *step >= rough).unwrap_or(rough)
}

/// Curves and areas in braille dots. All curves are raised so that the present one passes through the transfer
/// (method: that keeps the areas).
struct Drawing {
    now: PowerAngle,
    after: Option<OutagePicture>,
    angle_rad: f64,
    p_m_mw: f64,
    raise_mw: f64,
    cells: (u16, u16),
}

impl Drawing {
    fn bounds_mw(&self) -> [f64; 2] {
        let curves = [Some(self.now), self.after.map(|after| after.curve), self.after.and_then(|after| after.fault)];
        let tops = curves.into_iter().flatten().map(|curve| curve.mean_mw + curve.amplitude_mw + self.raise_mw);
        let top = tops.fold(self.p_m_mw + self.raise_mw, f64::max);
        let bottom = (self.p_m_mw + self.raise_mw).min(0.0);
        if top.is_finite() && bottom.is_finite() && top > bottom {
            [bottom, bottom + 1.1 * (top - bottom)]
        } else {
            [0.0, 1.0]
        }
    }

    /// A name over the top of each curve: where, and what.
    fn labels(&self, outage: &str) -> Vec<(f64, f64, String)> {
        let cell_deg = END_DEG / f64::from(self.cells.0.max(1));
        let [bottom, top] = self.bounds_mw();
        let cell_mw = (top - bottom) / f64::from(self.cells.1.max(1));
        let curves = [
            (Some(self.now), "now".to_string()),
            (self.after.map(|after| after.curve), format!("{} out", text::cut(outage, 20))),
            (self.after.and_then(|after| after.fault), "fault on".to_string()),
        ];
        let named = curves.into_iter().filter_map(|(curve, name)| Some((curve?, format!(" {name} "))));
        named
            .map(|(curve, name)| {
                let start_deg = 90.0 + curve.shift_rad.to_degrees() - 0.5 * cell_deg * name.chars().count() as f64;
                (start_deg, curve.mean_mw + curve.amplitude_mw + self.raise_mw + cell_mw, name)
            })
            .collect()
    }

    /// The power that acts at an angle of the first swing; `None` where the swing does not come.
    fn acting_mw(&self, angle_rad: f64) -> Option<f64> {
        let after = self.after?;
        let end = after.swing_peak_rad.or(after.tipping_rad).unwrap_or(std::f64::consts::PI);
        let start = if after.fault.is_some() { self.angle_rad } else { self.angle_rad.min(after.equilibrium_rad?) };
        if angle_rad < start || angle_rad > end {
            return None;
        }
        let faulted = after.fault.filter(|_| angle_rad < after.cleared_rad);
        Some(faulted.unwrap_or(after.curve).at(angle_rad))
    }
}

impl Shape for Drawing {
    fn draw(&self, painter: &mut Painter) {
        let (columns, rows) = (usize::from(self.cells.0) * 2, usize::from(self.cells.1) * 4);
        if columns < 2 || rows < 2 {
            return;
        }
        let [low, high] = *painter.bounds().1;
        let row_of = |mw: f64| (high - mw) / (high - low) * (rows - 1) as f64;
        let level = row_of(self.p_m_mw + self.raise_mw);
        let mut last = [None; 3];
        for column in 0..columns {
            let angle_rad = (END_DEG * column as f64 / (columns - 1) as f64).to_radians();
            let row_at = |power_mw: f64| row_of(power_mw + self.raise_mw);
            if let Some(acting) = self.acting_mw(angle_rad) {
                shade(painter, column, row_at(acting), level, rows);
            }
            if column.is_multiple_of(4) && level >= 0.0 {
                dot(painter, column, level, rows);
            }
            let curves = [
                (Some(self.now), column % 6 < 3),
                (self.after.map(|after| after.curve), true),
                (self.after.and_then(|after| after.fault), column.is_multiple_of(3)),
            ];
            for ((curve, inked), last) in curves.into_iter().zip(&mut last) {
                let Some(row) = curve.map(|curve| row_at(curve.at(angle_rad))) else { continue };
                if inked {
                    stroke(painter, column, last.unwrap_or(row), row, rows);
                }
                *last = Some(row);
            }
        }
    }
}

/// Fills between the acting power and the level of P_m: dense where it is below, light where above.
fn shade(painter: &mut Painter, column: usize, acting: f64, level: f64, rows: usize) {
    let speeds_up = acting > level;
    for row in 0..rows {
        let at = row as f64;
        let inside = at > acting.min(level) && at < acting.max(level);
        let inked = if speeds_up {
            column.is_multiple_of(2) || row.is_multiple_of(2)
        } else {
            column.is_multiple_of(3) && row.is_multiple_of(2)
        };
        if inside && inked {
            painter.paint(column, row, Color::Reset);
        }
    }
}

/// A piece of curve: from the row of the column before to this one.
fn stroke(painter: &mut Painter, column: usize, from: f64, to: f64, rows: usize) {
    let (top, bottom) = (from.min(to).max(0.0), from.max(to).min((rows - 1) as f64));
    let mut row = top.round();
    while row <= bottom.round() {
        dot(painter, column, row, rows);
        row += 1.0;
    }
}

fn dot(painter: &mut Painter, column: usize, row: f64, rows: usize) {
    if row >= 0.0 && row < rows as f64 {
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "within the rows")]
        painter.paint(column, row.round() as usize, Color::Reset);
    }
}

#[cfg(test)]
mod tests {
    use super::tick_step;

    #[test]
    fn ticks_are_round_and_apart() {
        assert!((tick_step(3700.0, 12.0) - 1000.0).abs() < 1e-9);
        assert!((tick_step(1.1, 12.0) - 0.5).abs() < 1e-9);
        assert!(tick_step(0.0, 0.0) > 0.0);
    }
}
