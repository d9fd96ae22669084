//! Why to believe it: how the measurements fit, what is set aside, missing or assumed, how the feed does.

use ratatui::text::{Line, Span};

use super::{
    figures::{self, number},
    subject::{Subject, heading, paragraph},
    text,
};

/// The panel's lines.
pub fn lines(subject: &Subject, width: usize) -> Vec<Line<'static>> {
    let theme = subject.theme;
    let assessment = &subject.track.latest;
    let fit = &assessment.fit;
    let mut lines = paragraph(&fit_words(subject), width);

    for (title, names, abnormal) in [
        ("set aside, does not fit the rest", &fit.suspects, true),
        ("missing", &fit.missing, true),
        ("assumed", &fit.assumed, false),
    ] {
        if names.is_empty() {
            lines.push(Line::from(vec![Span::styled(format!(" {title}: "), theme.strong()), Span::raw("nothing")]));
            continue;
        }
        lines.push(heading(&format!("{title} ({}):", names.len()), theme));
        for name in names {
            let name = text::cut(name, width.saturating_sub(5));
            let mark = if abnormal { Span::styled(" ! ", theme.caution()) } else { Span::raw("   ") };
            lines.push(Line::from(vec![mark, Span::raw(format!(" {name}"))]));
        }
    }

    lines.push(Line::default());
    let age = subject.app.age().map_or(figures::NONE.into(), figures::duration);
    let time = figures::clock(assessment.time, subject.app.zone);
    lines.push(heading(&format!("feed: last frame {time}, {age} old"), theme));
    if let Some(parcel) = &subject.app.parcel {
        for (what, report) in parcel.feed.reports() {
            lines.extend(paragraph(&format!("{what} {}: {}", report.name, report.standing), width));
            for finding in &report.findings {
                lines.extend(paragraph(&format!("! {finding}"), width));
            }
        }
        lines.extend(paragraph(&format!("{} frames taken", parcel.feed.frames), width));
    }
    lines
}

fn fit_words(subject: &Subject) -> String {
    let fit = &subject.track.latest.fit;
    match (fit.chi2, fit.limit) {
        (None, _) => "No fit: too little is measured to fix the state. Bring back what is missing.".into(),
        (Some(_), None) => "The state is fixed, but nothing is measured twice: a false meter would not show.".into(),
        (Some(chi2), Some(limit)) => format!(
            "The measurements {}: χ² {} of at most {} ({} measured more than needed).",
            if chi2 <= limit { "fit each other" } else { "DO NOT FIT EACH OTHER, and no single one can be blamed" },
            number(Some(chi2), 1),
            number(Some(limit), 1),
            fit.dof,
        ),
    }
}
