//! Every outage with its limits and what it would leave.

use ratatui::{
    Frame,
    layout::Rect,
    text::{Line, Span},
    widgets::Paragraph,
};

use super::{
    Theme,
    figures::{self, number},
    overview::first_in_sight,
    row::cursor,
    subject::{Subject, nothing, paragraph},
    text::{cut, left, right},
};
use crate::{
    desk::{Assessment, Binding, Criterion, OutageRecord},
    grid::Corridor,
    screen::state::{Drawn, Target},
};

/// Draws the list, and what the chosen outage means in a sentence.
pub fn draw(frame: &mut Frame, area: Rect, subject: &Subject, drawn: &mut Drawn) {
    let assessment = &subject.track.latest;
    if assessment.outages.is_empty() {
        return nothing(frame, area, &why_none(assessment));
    }
    let width = usize::from(area.width);
    let name = width.saturating_sub(65).clamp(8, 30);
    let corridor = subject.app.corridor();
    let story = subject.outage.map_or(Vec::new(), |outage| paragraph(&story(outage, corridor), width));
    let heading = heading(corridor, name, subject.theme);
    let story_rows = u16::try_from(story.len()).unwrap_or(0).min(area.height.saturating_sub(5));

    let list = Rect { y: area.y + 2, height: area.height.saturating_sub(2 + story_rows), ..area }.intersection(area);
    frame.render_widget(Paragraph::new(heading), area);
    let here = subject.outage.and_then(|here| assessment.outages.iter().position(|o| o.name == here.name)).unwrap_or(0);
    let shown = usize::from(list.height);
    let first = first_in_sight(drawn.first_row, here, shown.max(1), assessment.outages.len());
    let visible = assessment.outages.iter().enumerate().skip(first).take(shown);
    for (row, (index, outage)) in (0u16..).zip(visible) {
        let at = super::row(list, row);
        let line = line(outage, assessment.binding.as_ref(), corridor, name, index == here, subject.theme);
        frame.render_widget(line, at);
        drawn.targets.push((at, Target::Outage(outage.name.clone())));
    }
    (drawn.first_row, drawn.rows_shown) = (first, shown);
    let below = u16::try_from(assessment.outages.len().min(shown)).unwrap_or(0);
    let rest = Rect { y: list.y + below, height: area.bottom().saturating_sub(list.y + below), ..area };
    frame.render_widget(Paragraph::new(story), rest.intersection(area));
}

fn why_none(assessment: &Assessment) -> String {
    let missing: Vec<_> = assessment.fit.missing.iter().take(12).map(|name| cut(name, 30)).collect();
    let missing = if missing.is_empty() { "nothing by name".into() } else { missing.join(", ") };
    format!(
        "BLIND: too little is measured to fix the state, so no outage is judged and no headroom is told. \
         Missing: {missing}. Bring these back, or judge the corridor by your own rules until then."
    )
}

fn heading(corridor: Option<&Corridor>, name: usize, theme: Theme) -> Vec<Line<'static>> {
    let clear = corridor
        .and_then(|corridor| corridor.fault)
        .map_or(String::new(), |fault| format!("of {}", number(Some(fault.clear_ms), 0)));
    let mark = left(" ◂ sets it", name + 2);
    let upper = format!("{mark}├ limit MW by criterion ─┤├ margin ──┤  clearing  short  lowest");
    let lower = format!("  {} angle  area  load  volt  angle  area  ms {:<7}  load      kV", left("lost", name), clear);
    vec![Line::styled(upper, theme.quiet()), Line::styled(lower, theme.quiet())]
}

fn line(
    outage: &OutageRecord,
    binding: Option<&Binding>,
    corridor: Option<&Corridor>,
    name: usize,
    chosen: bool,
    theme: Theme,
) -> Line<'static> {
    let binds =
        binding.filter(|binding| binding.outage.as_ref() == Some(&outage.name)).map(|binding| binding.criterion);
    let style = if chosen { theme.strong() } else { ratatui::style::Style::new() };
    let mut spans = vec![
        Span::raw(cursor(chosen)),
        Span::raw(if binds.is_some() { "◂" } else { " " }),
        Span::styled(left(&outage.name, name), style),
    ];
    if outage.separates {
        let limit = outage
            .limit_mw
            .separation
            .map_or("accepted".into(), |limit| format!("limit {} MW", figures::mw(Some(limit))));
        spans.push(Span::styled(
            format!(" parts the two sides: {limit}"),
            if binds.is_some() { theme.caution() } else { style },
        ));
        return Line::from(spans);
    }
    let limits = outage.limit_mw;
    for (criterion, limit) in [
        (Criterion::Angle, limits.angle),
        (Criterion::Area, limits.area),
        (Criterion::Loading, limits.loading),
        (Criterion::Voltage, limits.voltage),
    ] {
        let here = binds == Some(criterion);
        let text = format!("{}{}", figures::mw(limit), if here { "◂" } else { " " });
        spans.push(Span::styled(right(&text, 6), if here { theme.strong() } else { style }));
    }
    let clear_ms = corridor.and_then(|corridor| corridor.fault).map(|fault| fault.clear_ms);
    let lowest = lowest_kv(outage, corridor);
    let cells = [
        (right(&figures::deg(outage.angle_margin_deg), 6), outage.angle_margin_deg.is_none()),
        (right(&number(outage.area_margin, 2), 6), outage.area_margin.is_some_and(|area| area <= 0.0)),
        (right(&critical(outage), 9), outage.critical_ms.zip(clear_ms).is_some_and(|(critical, set)| critical < set)),
        (right(&figures::percent(outage.loading_pct), 8), outage.loading_pct.is_some_and(|pct| pct > 100.0)),
        (
            right(&lowest.map_or(figures::NONE.into(), |low| number(Some(low.kv), 1)), 8),
            lowest.is_some_and(|low| low.under()),
        ),
    ];
    for (text, wrong) in cells {
        let blank = text.len() - text.trim_start().len();
        spans.push(Span::raw(text[..blank].to_string()));
        spans.push(Span::styled(text[blank..].to_string(), if wrong { theme.caution() } else { style }));
    }
    Line::from(spans)
}

/// Critical clearing time, ms; where there is a fault and no such time, it is beyond what is looked at.
pub fn critical(outage: &OutageRecord) -> String {
    let has_fault = outage.picture.is_some_and(|picture| picture.fault.is_some());
    if outage.critical_ms.is_none() && has_fault && outage.angle_margin_deg.is_some() {
        ">2000".into()
    } else {
        number(outage.critical_ms, 0)
    }
}

/// The bus nearest to its floor, or the lowest where there are no floors.
#[derive(Clone, Copy)]
struct Lowest<'a> {
    bus: &'a str,
    kv: f64,
    floor_kv: Option<f64>,
}

impl Lowest<'_> {
    fn under(&self) -> bool {
        self.floor_kv.is_some_and(|floor| self.kv < floor)
    }
}

fn lowest_kv<'a>(outage: &'a OutageRecord, corridor: Option<&Corridor>) -> Option<Lowest<'a>> {
    let floor = |name: &str| corridor?.buses.iter().find(|bus| *bus.name == *name)?.min_kv;
    let each = outage.kv.as_ref()?.iter().map(|(bus, kv)| Lowest { bus, kv: *kv, floor_kv: floor(bus) });
    each.min_by(|one, other| {
        let key = |low: &Lowest| low.floor_kv.map_or((1, low.kv), |floor| (0, low.kv - floor));
        let (one, other) = (key(one), key(other));
        one.0.cmp(&other.0).then(one.1.total_cmp(&other.1))
    })
}

fn story(outage: &OutageRecord, corridor: Option<&Corridor>) -> String {
    let name = cut(&outage.name, 30);
    if outage.separates {
        return format!("{name} out: no path is left between the two sides.");
    }
    let Some(picture) = outage.picture else { return format!("{name} out: nothing could be computed.") };
    let deg = |angle: Option<f64>| figures::deg(angle.map(f64::to_degrees));
    let swing = match (picture.equilibrium_rad, picture.swing_peak_rad) {
        (None, _) => {
            "the remaining network cannot carry this transfer: no balance, the sides fall out of step.".to_string()
        }
        (Some(_), None) => format!(
            "the first swing passes the tipping point at {} and the sides fall out of step.",
            deg(picture.tipping_rad)
        ),
        (Some(_), Some(_)) => format!(
            "the angle settles at {}, after a first swing up to {}; it tips at {}.",
            deg(picture.equilibrium_rad),
            deg(picture.swing_peak_rad),
            deg(picture.tipping_rad)
        ),
    };
    let busiest = outage.loaded_circuit.as_ref().map_or(String::new(), |circuit| {
        let loading = figures::percent(outage.loading_pct);
        format!(" Busiest: {} at {loading} of its short-time rating.", cut(circuit, 20))
    });
    let lowest = lowest_kv(outage, corridor).map_or(String::new(), |low| {
        let floor = low.floor_kv.map_or(String::new(), |floor| format!(" (floor {})", number(Some(floor), 0)));
        format!(" Lowest: {} at {} kV{floor}.", cut(low.bus, 20), number(Some(low.kv), 1))
    });
    format!("{name} out: {swing}{busiest}{lowest}")
}
