//! Circuits and buses as they stand.

use ratatui::text::{Line, Span};

use super::{
    figures::{mw, number, percent},
    subject::{Subject, heading, paragraph},
    text::{clean, left, right},
};

/// Rows that the panel would like, its heading included.
pub fn height(subject: &Subject) -> u16 {
    let listed = subject.track.latest.detail.as_ref().map_or(0, |detail| detail.circuits.len() + detail.buses.len());
    u16::try_from(listed + 7).unwrap_or(u16::MAX).min(18)
}

/// The panel's lines.
pub fn lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let theme = subject.theme;
    let Some(detail) = &subject.track.latest.detail else {
        return paragraph("No state: neither flows nor voltages can be told. See Data for what is missing.", width);
    };
    let name = width.saturating_sub(44).clamp(8, 24);
    let mut lines = vec![heading(
        &format!(
            "{} {} {} {}  series capacitors",
            left("circuit", name),
            left("", 6),
            right("MW", 7),
            right("load", 6)
        ),
        theme,
    )];
    for circuit in &detail.circuits {
        let standing = if circuit.closed { Span::raw("closed") } else { Span::styled("OPEN  ", theme.caution()) };
        let flow = mw(circuit.closed.then_some(circuit.from_mw));
        let mut spans = vec![
            Span::raw(format!(" {} ", left(&circuit.name, name))),
            standing,
            Span::raw(format!(" {} {} ", right(&flow, 7), right(&percent(circuit.loading_pct), 6))),
        ];
        for (bank, inserted) in &circuit.banks {
            let word = if *inserted { "in" } else { "BYPASSED" };
            let style = if *inserted { ratatui::style::Style::new() } else { theme.caution() };
            spans.push(Span::raw(format!(" {} ", clean(bank))));
            spans.push(Span::styled(word, style));
        }
        lines.push(Line::from(spans));
    }
    let names = subject.app.corridor().map(|corridor| {
        let [from, to] = [0, 1].map(|bus| corridor.buses.get(bus).map_or(String::new(), |bus| clean(&bus.name).into_owned()));
        format!("MW into each circuit at its first bus; + is {from} → {to} where it joins these. Load in % of the continuous rating.")
    });
    lines.extend(paragraph(&names.unwrap_or_default(), width));
    lines.push(Line::default());
    lines.push(heading(
        &format!(
            "{} {} {} {} {}",
            left("bus", name),
            right("kV", 7),
            right("degrees", 8),
            right("load MW", 8),
            right("Mvar", 6)
        ),
        theme,
    ));
    for bus in &detail.buses {
        lines.push(Line::raw(format!(
            " {} {} {} {} {}",
            left(&bus.name, name),
            right(&number(Some(bus.kv), 1), 7),
            right(&number(Some(bus.deg), 1), 8),
            right(&mw(Some(bus.load_mw)), 8),
            right(&mw(Some(bus.load_mvar)), 6)
        )));
    }
    lines
}
