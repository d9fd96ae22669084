//! What stands behind each terminal, and how well it is known.

use ratatui::text::Line;
use unicode_width::UnicodeWidthStr;

use super::{
    figures::{NONE, number, percent},
    subject::{Subject, heading, paragraph},
    text::{cut, left, right},
};
use crate::{
    desk::{Basis, Learned, SourceRecord},
    source::{Moved, SpreadPoint},
};

/// The panel's lines.
pub fn lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let assessment = &subject.track.latest;
    let [from, to] = &assessment.sources;
    let label = 22.min(width / 2);
    let column = (width.saturating_sub(label + 2) / 2).min(24);
    let row = |what: &str, of: &dyn Fn(usize) -> String| {
        Line::raw(format!(" {} {}{}", left(what, label), right(&of(0), column), right(&of(1), column)))
    };
    let source = |side: usize| &assessment.sources[side];
    let corridor = subject.app.corridor();
    let heading_words = format!("{} {}{}", left("behind", label), right(&from.bus, column), right(&to.bus, column));
    let mut lines = vec![
        heading(&heading_words, subject.theme),
        row("voltage E, kV", &|side| number(source(side).e_kv, 1)),
        row("its angle", &|side| {
            source(side).angle_deg.map_or(NONE.into(), |deg| format!("{}°", number(Some(deg), 1)))
        }),
        row("reactance X, ohm", &|side| with_spread(source(side).x_ohm, source(side).x_sd, 1)),
        row("  as configured", &|side| {
            corridor
                .and_then(|corridor| corridor.sides.get(side))
                .map_or(NONE.into(), |side| with_spread(side.source.x_ohm, side.source.spread * side.source.x_ohm, 1))
        }),
        row("resistance R, ohm", &|side| with_spread(source(side).r_ohm, source(side).r_sd, 1)),
        row("short-circuit, MVA", &|side| {
            let nominal_kv = corridor.and_then(|corridor| corridor.buses.get(side)).map(|bus| bus.nominal_kv);
            nominal_kv
                .and_then(|kv| short_circuit_mva(kv, source(side)))
                .map_or(NONE.into(), |(s, sd)| with_spread(s, sd, 0))
        }),
        row("known from", &|side| match (source(side).basis, source(side).steps) {
            (Basis::Configured, _) => "configuration".into(),
            (Basis::Learned, 1) => "1 step".into(),
            (Basis::Learned, steps) => format!("{steps} steps"),
        }),
    ];
    if let Some(learned) = assessment.detail.as_ref().map(|detail| &detail.learned) {
        if let Some(first) = learned.history.first() {
            let since = first.time.with_timezone(&subject.app.zone).format("%H:%M");
            lines.push(row(&format!("± of X since {since}"), &|side| course(&learned.history, side, column)));
        }
        lines.extend(steps(subject, learned, width));
    }
    lines.extend(paragraph(
        "± is one standard deviation, and goes through to the headroom’s. Angles are against the second bus.",
        width,
    ));
    lines
}

/// How the spread of a reactance went, from the first to the last value.
fn course(history: &[SpreadPoint], side: usize, width: usize) -> String {
    let spread = |point: Option<&SpreadPoint>| point.map(|point| point.x_sd_ohm[side]);
    let (first, last) = (number(spread(history.first()), 1), number(spread(history.last()), 1));
    let room = width.saturating_sub(first.len() + last.len() + 4);
    let cells = room.min(12).min(history.len());
    let values = (0..cells)
        .map(|cell| Some(history[cell * (history.len() - 1) / cells.max(2).saturating_sub(1)].x_sd_ohm[side]));
    format!("{first} {} {last}", super::trend::bars(values))
}

/// The steps that were seen, newest first.
fn steps(subject: &Subject, learned: &Learned, width: usize) -> Vec<Line<'static>> {
    let assessment = &subject.track.latest;
    let name = assessment.sources.iter().map(|source| source.bus.width()).max().unwrap_or(0).clamp(7, 16);
    let mut lines =
        vec![heading("recent steps, newest first: which side’s E moved, by how many kV, how sure", subject.theme)];
    if learned.steps.is_empty() {
        lines.extend(paragraph("none yet: sources are learned from sudden changes on the grid", width));
    }
    let today = assessment.time.with_timezone(&subject.app.zone).date_naive();
    for step in learned.steps.iter().rev() {
        let time = step.time.with_timezone(&subject.app.zone);
        let time = time.format(if time.date_naive() == today { "%H:%M:%S" } else { "%-d %b %H:%M:%S" });
        let [from, to] = assessment.sources.each_ref().map(|source| &*source.bus);
        let (who, kv) = match step.moved {
            Moved::Neither => ("neither", right(NONE, 6)),
            Moved::From => (from, right(&signed(step.de_kv[0]), 6)),
            Moved::To => (to, right(&signed(step.de_kv[1]), 6)),
            Moved::Both => ("both", step.de_kv.map(|kv| right(&signed(kv), 6)).join(" ")),
        };
        let sure = percent(Some(100.0 * step.probability));
        let mut words = format!(" {time}  {} {kv} kV  {sure} sure", left(who, name));
        if step.topology_changed {
            words += ", switched here";
        }
        if !step.explained {
            words += if step.widened { ", unexplained: ± widened" } else { ", unexplained" };
        }
        lines.push(Line::raw(cut(&words, width)));
    }
    lines
}

fn signed(value: f64) -> String {
    let sign = if value > 0.0 { "+" } else { "" };
    format!("{sign}{}", number(Some(value), 1))
}

fn with_spread(value: f64, sd: f64, decimals: usize) -> String {
    format!("{} ± {}", number(Some(value), decimals), number(Some(sd), decimals))
}

/// S_k = U²/|Z| at nominal voltage (IEC 60909, with c = 1) with the spread that X gives it, to first order; `None` for
/// a stiff bus.
fn short_circuit_mva(nominal_kv: f64, source: &SourceRecord) -> Option<(f64, f64)> {
    let z_ohm = source.r_ohm.hypot(source.x_ohm);
    let s_mva = nominal_kv * nominal_kv / z_ohm;
    (z_ohm > 0.0).then(|| (s_mva, s_mva * source.x_ohm * source.x_sd / z_ohm.powi(2)))
}
