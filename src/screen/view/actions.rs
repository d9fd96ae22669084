//! What can be done, and what each step brings.

use ratatui::text::{Line, Span};

use super::{
    figures::{self, deg, headroom, number},
    row::refusal,
    subject::{Subject, heading, paragraph},
    text,
};
use crate::desk::Reclose;

/// The panel's lines.
pub fn lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let assessment = &subject.track.latest;
    let theme = subject.theme;
    let mut lines = Vec::new();
    match assessment.headroom_mw {
        None => {
            lines.extend(paragraph("Nothing can be said of actions: the corridor has no state at this frame.", width));
        }
        Some(now) => {
            lines.push(heading("headroom after a single action, MW", theme));
            let spread =
                assessment.headroom_sd_mw.map_or(String::new(), |sd| format!("±{}", figures::mw(Some(sd.ceil()))));
            lines.push(row("as it stands", &headroom(Some(now)), &spread, width));
            for action in &assessment.actions {
                let gain = action.headroom_mw.map_or(String::new(), |then| match headroom(Some(then - now)) {
                    gain if then > now => format!("{gain} more"),
                    gain => gain,
                });
                lines.push(row(&action.action, &headroom(action.headroom_mw), &gain, width));
                if let Some(why) = refusal(assessment, subject.app.corridor(), &action.action) {
                    let words = text::cut(&format!("not now: {why}"), width.saturating_sub(5));
                    lines.push(Line::from(vec![Span::styled(" ! ", theme.caution()), Span::raw(format!("  {words}"))]));
                }
            }
            if assessment.actions.is_empty() {
                lines.extend(paragraph("every circuit is closed and every bank inserted", width));
            }
            for (wanted, what) in
                [(0.0, "for the next outage to be survived"), (assessment.thin_mw, "to be ample again")]
            {
                if now < wanted {
                    let off = figures::mw(Some((wanted - now).ceil()));
                    lines.extend(paragraph(&format!("or take off {off} MW {what}"), width));
                }
            }
        }
    }
    if !assessment.reclose.is_empty() {
        lines.push(Line::default());
        lines.push(heading("closing an open circuit", theme));
        let check = subject.app.corridor().map(|corridor| corridor.reclose).unwrap_or_default();
        for reclose in &assessment.reclose {
            let refused = reclose.allowed == Some(false);
            let mark = if refused { Span::styled(" ! ", theme.caution()) } else { Span::raw("   ") };
            let words = reclose_words(reclose, check.max_angle_deg, check.max_voltage_pct);
            for (index, line) in text::wrap(&words, width.saturating_sub(3), 2).into_iter().enumerate() {
                let lead = if index == 0 { mark.clone() } else { Span::raw("   ") };
                lines.push(Line::from(vec![lead, Span::raw(line)]));
            }
        }
    }
    lines
}

fn row(what: &str, value: &str, gain: &str, width: usize) -> Line<'static> {
    let name = width.saturating_sub(24).min(40);
    Line::raw(format!("   {} {} {}", text::left(what, name), text::right(value, 6), text::left(gain, 12)))
}

fn reclose_words(reclose: &Reclose, max_angle_deg: f64, max_voltage_pct: f64) -> String {
    let verdict = match reclose.allowed {
        Some(true) => "may be closed",
        Some(false) => "must not be closed now",
        None => "cannot be judged",
    };
    let fits = reclose.transfer_to_fit_mw.map_or(String::new(), |transfer| {
        format!("; the angle fits at {} MW of transfer", figures::mw(Some(transfer.floor())))
    });
    format!(
        "{} {verdict}: angle {} (check {}), voltage difference {} % (check {} %){fits}",
        text::clean(&reclose.circuit),
        deg(reclose.angle_deg),
        deg(Some(max_angle_deg)),
        number(reclose.voltage_pct, 1),
        number(Some(max_voltage_pct), 0),
    )
}
