//! What stands behind each terminal, and how well it is known.

use ratatui::text::Line;

use super::{
    corridor::{Subject, heading, paragraph},
    figures::{mw, number},
    text::{left, right},
};
use crate::desk::{Basis, SourceRecord};

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
    .collect()
}

fn with_spread(value: f64, sd: f64) -> String {
    format!("{} ± {}", number(Some(value), 1), number(Some(sd), 1))
}

/// S_k = U²/|Z| at nominal voltage (IEC 60909, with c = 1); `None` for a stiff bus.
fn short_circuit_mva(nominal_kv: f64, source: &SourceRecord) -> Option<f64> {
    let z_ohm = source.r_ohm.hypot(source.x_ohm);
    (z_ohm > 0.0).then(|| nominal_kv * nominal_kv / z_ohm)
}
