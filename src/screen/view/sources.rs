//! What stands behind each terminal, and how well it is known.

use ratatui::text::Line;

use super::{
    corridor::{Subject, heading, paragraph},
    figures::{clock, mw, number, percent},
    text::{cut, left, right},
};
use crate::{
    desk::{Basis, SourceRecord},
    source::Moved,
};

/// The panel's lines.
pub fn lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let assessment = &subject.track.latest;
    let [from, to] = &assessment.sources;
    let label = 21.min(width / 2);
    let column = (width.saturating_sub(label + 2) / 2).min(24);
    let row = |what: &str, of: &dyn Fn(&SourceRecord) -> String| {
        Line::raw(format!(" {} {}{}", left(what, label), right(&of(from), column), right(&of(to), column)))
    };
    let nominal_kv = |source: &SourceRecord| {
        subject.app.corridor()?.buses.iter().find(|bus| bus.name == source.bus).map(|bus| bus.nominal_kv)
    };
    vec![
        heading(
            &format!("{} {}{}", left("behind", label), right(&from.bus, column), right(&to.bus, column)),
            subject.theme,
        ),
        row("voltage E, kV", &|source| number(source.e_kv, 1)),
        row("its angle, degrees", &|source| number(source.angle_deg, 1)),
        row("reactance X, ohm", &|source| with_spread(source.x_ohm, source.x_sd)),
        row("resistance R, ohm", &|source| with_spread(source.r_ohm, source.r_sd)),
        row("short-circuit, MVA", &|source| mw(nominal_kv(source).and_then(|kv| short_circuit_mva(kv, source)))),
        row("known from", &|source| {
            match source.basis {
                Basis::Configured => "configuration",
                Basis::Learned => "learned",
            }
            .into()
        }),
        row("steps learned from", &|source| source.steps.to_string()),
        Line::default(),
    ]
    .into_iter()
    .chain(paragraph(
        "± is one standard deviation. It goes through to the headroom’s. Angles are against the second bus.",
        width,
    ))
    .chain(learned(subject, width))
    .collect()
}

/// How the spreads shrank, and the steps that were seen, newest first.
fn learned(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let assessment = &subject.track.latest;
    let Some(learned) = assessment.detail.as_ref().map(|detail| &detail.learned) else { return Vec::new() };
    let names = assessment.sources.each_ref().map(|source| cut(&source.bus, 16));
    let mut lines = Vec::new();
    if let (Some(first), Some(last)) = (learned.history.first(), learned.history.last()) {
        let since = clock(first.time, subject.app.zone);
        for (side, name) in names.iter().enumerate() {
            let [before, now] = [first, last].map(|point| number(Some(point.x_sd_ohm[side]), 1));
            lines.extend(paragraph(&format!("{name}: X known to ± {now} ohm, ± {before} at {since}"), width));
        }
    }
    lines.push(heading("recent steps, newest first", subject.theme));
    if learned.steps.is_empty() {
        lines.extend(paragraph("none yet: sources are learned from sudden changes on the grid", width));
    }
    for step in learned.steps.iter().rev() {
        let moved = match step.moved {
            Moved::Neither => "neither side moved".into(),
            Moved::From => format!("{} moved {} kV", names[0], signed(step.de_kv[0])),
            Moved::To => format!("{} moved {} kV", names[1], signed(step.de_kv[1])),
            Moved::Both => format!("both moved, {} and {} kV", signed(step.de_kv[0]), signed(step.de_kv[1])),
        };
        let sure = percent(Some(100.0 * step.probability));
        let mut words = format!("{}  {moved}, {sure} sure", clock(step.time, subject.app.zone));
        if step.topology_changed {
            words += ", with a switching here";
        }
        if !step.explained {
            words += if step.widened { ", unexplained: the spread was widened" } else { ", unexplained" };
        }
        lines.extend(paragraph(&words, width));
    }
    lines
}

fn signed(value: f64) -> String {
    let sign = if value > 0.0 { "+" } else { "" };
    format!("{sign}{}", number(Some(value), 1))
}

fn with_spread(value: f64, sd: f64) -> String {
    format!("{} ± {}", number(Some(value), 1), number(Some(sd), 1))
}

/// S_k = U²/|Z| at nominal voltage (IEC 60909, with c = 1); `None` for a stiff bus.
fn short_circuit_mva(nominal_kv: f64, source: &SourceRecord) -> Option<f64> {
    let z_ohm = source.r_ohm.hypot(source.x_ohm);
    (z_ohm > 0.0).then(|| nominal_kv * nominal_kv / z_ohm)
}
