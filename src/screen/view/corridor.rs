//! One corridor: its verdict, the ruler, and as many panels as there is room for.

use ratatui::{
    Frame,
    layout::{Constraint, Layout, Rect},
    text::{Line, Span},
};
use unicode_width::UnicodeWidthStr;

use super::{
    Theme, actions, card, curves, data, network, outages,
    row::{best_action, headroom, set_by},
    ruler::{self, Ruler},
    sources,
    subject::Subject,
    text, trend,
};
use crate::screen::state::{App, Drawn, Panel, Target};

/// Draws the corridor page.
pub fn draw(frame: &mut Frame, area: Rect, app: &App, theme: Theme) -> Drawn {
    let Some(track) = app.track(app.selected) else {
        let name = app.corridor().map_or("", |corridor| &corridor.name);
        frame.render_widget(Line::raw(format!("  {}: waiting for the first frame.", text::cut(name, 30))), area);
        return Drawn::default();
    };
    let subject = Subject { app, track, outage: app.outage(&track.latest), theme };
    let panels = app.panel.page(app.size);
    let axis_below = panels.contains(&Panel::Curves) && track.latest.detail.is_some();
    let [title, verdict, scale, line, tabs, body] = Layout::vertical([
        Constraint::Length(1),
        Constraint::Length(1),
        Constraint::Length(u16::from(!axis_below)),
        Constraint::Length(u16::from(!axis_below)),
        Constraint::Length(u16::from(panels.len() < 6)),
        Constraint::Fill(1),
    ])
    .areas(area);
    frame.render_widget(card::title(track, false, app, theme, usize::from(area.width)), title);
    frame.render_widget(verdict_line(&subject, usize::from(verdict.width)), verdict);
    if !axis_below {
        draw_ruler(frame, scale, line, &subject);
    }
    let mut drawn = Drawn::default();
    if panels.len() < 6 {
        drawn.targets = draw_tabs(frame, tabs, panels, theme);
    }
    for (panel, at) in arranged(panels, body, network::height(&subject)) {
        let inner = if panels.len() > 1 { headed(frame, at, panel, &subject) } else { at };
        let inner = Rect { width: inner.width.saturating_sub(1), ..inner };
        match panel {
            Panel::Curves => curves::draw(frame, inner, &subject),
            Panel::Outages => outages::draw(frame, inner, &subject, &mut drawn),
            _ => {
                let width = usize::from(inner.width);
                let lines = match panel {
                    Panel::Actions => actions::lines(&subject, width),
                    Panel::Sources => sources::lines(&subject, width),
                    Panel::Network => network::lines(&subject, width),
                    _ => data::lines(&subject, width),
                };
                // The first panel of a page has the keys.
                let scrolls = panel == panels[0];
                let long = super::scrolled(frame, inner, if scrolls { app.scroll } else { 0 }, lines);
                if scrolls {
                    (drawn.scroll_max, drawn.rows_shown) = (long.scroll_max, long.rows_shown);
                }
            }
        }
    }
    drawn
}

fn verdict_line(subject: &Subject, width: usize) -> Line<'static> {
    let assessment = &subject.track.latest;
    let theme = subject.theme;
    let mut spans = vec![
        Span::styled(" headroom ", theme.quiet()),
        Span::styled(format!("{} MW", headroom(assessment)), theme.strong()),
        Span::raw(format!(" ({})", set_by(assessment, 26))),
        Span::raw(format!("  {}", trend::words(subject.track))),
    ];
    let used: usize = spans.iter().map(Span::width).sum();
    let best = best_action(assessment, subject.app.corridor(), width.saturating_sub(used + 2));
    spans.push(Span::raw(format!("  {best}")));
    text::spread(spans, Vec::new(), width)
}

fn draw_ruler(frame: &mut Frame, scale: Rect, line: Rect, subject: &Subject) {
    let name = subject.outage.map_or(String::new(), |outage| format!("{} out", outage.name));
    let name_width = 14.min(scale.width / 4);
    let [name_at, ruler_at] = Layout::horizontal([Constraint::Length(name_width), Constraint::Fill(1)]).areas(line);
    let width = usize::from(ruler_at.width).saturating_sub(1);
    frame.render_widget(ruler::scale(width, subject.theme), Rect { x: ruler_at.x, width: ruler_at.width, ..scale });
    frame
        .render_widget(Line::raw(format!(" {}", text::cut(&name, usize::from(name_width).saturating_sub(2)))), name_at);
    let ruler = match Ruler::new(&subject.track.latest, subject.outage) {
        Some(ruler) => ruler.line(width, subject.theme),
        None => Line::raw(text::cut(&super::row::why_blind(&subject.track.latest), width)),
    };
    frame.render_widget(ruler, ruler_at);
}

fn draw_tabs(frame: &mut Frame, area: Rect, shown: &[Panel], theme: Theme) -> Vec<(Rect, Target)> {
    let all = [Panel::Outages, Panel::Curves, Panel::Actions, Panel::Sources, Panel::Network, Panel::Data];
    let mut spans = vec![Span::styled("─", theme.quiet())];
    let mut targets = Vec::new();
    let mut x = area.x + 1;
    for panel in all {
        let here = shown.contains(&panel);
        let title = if here { format!("[{}]", panel.title()) } else { format!(" {} ", panel.title()) };
        let width = u16::try_from(title.width()).unwrap_or(0);
        targets.push((Rect { x, width, ..area }.intersection(area), Target::Panel(panel)));
        x += width + 1;
        spans.push(Span::styled(title, if here { theme.strong() } else { theme.quiet() }));
        spans.push(Span::styled("─", theme.quiet()));
    }
    let rest = usize::from(area.right().saturating_sub(x));
    spans.push(Span::styled("─".repeat(rest), theme.quiet()));
    frame.render_widget(Line::from(spans), area);
    targets
}

/// Draws a panel's heading and returns what is under it.
fn headed(frame: &mut Frame, area: Rect, panel: Panel, subject: &Subject) -> Rect {
    let title = match (panel, subject.outage) {
        (Panel::Curves, Some(outage)) => format!("─ Curves: {} out ", text::cut(&outage.name, 24)),
        _ => format!("─ {} ", panel.title()),
    };
    let rest = usize::from(area.width).saturating_sub(title.width() + 1);
    frame.render_widget(Line::styled(format!("{title}{}", "─".repeat(rest)), subject.theme.quiet()), area);
    Rect { y: area.y + 1, height: area.height.saturating_sub(1), ..area }.intersection(area)
}

fn arranged(panels: &[Panel], area: Rect, network_height: u16) -> Vec<(Panel, Rect)> {
    use Constraint::{Fill, Length, Percentage};
    use Panel::{Actions, Curves, Data, Network, Outages, Sources};
    match panels {
        [only] => vec![(*only, area)],
        [Outages, ..] if panels.len() == 3 => {
            let [upper, lower] = Layout::vertical([Fill(1), Percentage(38)]).areas(area);
            let [curves, actions] = Layout::horizontal([Fill(1), Length(38)]).areas(upper);
            vec![(Curves, curves), (Actions, actions), (Outages, lower)]
        }
        [_, _, _] => {
            let [left, data] = Layout::horizontal([Fill(1), Percentage(45)]).areas(area);
            let [sources, network] = Layout::vertical([Fill(1), Length(network_height)]).areas(left);
            vec![(Sources, sources), (Network, network), (Data, data)]
        }
        _ => {
            let [left, right] = Layout::horizontal([Fill(1), Length(76)]).areas(area);
            let [curves, outages] = Layout::vertical([Fill(1), Percentage(36)]).areas(left);
            let [actions, sources, network, data] =
                Layout::vertical([Length(10), Fill(1), Length(network_height), Length(14)]).areas(right);
            vec![
                (Curves, curves),
                (Outages, outages),
                (Actions, actions),
                (Sources, sources),
                (Network, network),
                (Data, data),
            ]
        }
    }
}
