use chrono::TimeDelta;
use ratatui::text::{Line, Span};

use super::{Theme, figures, text};
use crate::screen::{
    connection::{Playback, Seeking},
    state::{App, Page},
};

/// The one thing that must be known before any number is believed; `None` when all is well.
pub fn line(app: &App, theme: Theme, width: usize) -> Option<Line<'static>> {
    let (words, alarming) = words(app)?;
    let text = text::left(&format!(" {words}"), width);
    Some(Line::from(Span::styled(text, if alarming { theme.caution() } else { theme.strong() })))
}

fn words(app: &App) -> Option<(String, bool)> {
    if let Some(notice) = &app.notice {
        return Some((notice.clone(), true));
    }
    if let Some(said) = app.said.as_ref().filter(|_| app.playback().is_none_or(|playback| playback.seeking.is_none())) {
        return Some((said.clone(), false));
    }
    troubled(app).or_else(|| unwritten(app)).or_else(|| unrecorded(app)).or_else(|| changed(app))
}

fn unrecorded(app: &App) -> Option<(String, bool)> {
    let trouble = app.parcel.as_ref()?.feed.unrecorded.as_ref()?;
    Some((format!("FRAMES ARE NOT KEPT, {trouble}. Messages (m) count them."), true))
}

fn unwritten(app: &App) -> Option<(String, bool)> {
    let trouble = app.alarm_report()?.journal.as_ref()?.trouble.as_ref()?;
    Some((format!("What alarms do is kept in memory until the journal can be written again: {trouble}"), true))
}

fn changed(app: &App) -> Option<(String, bool)> {
    app.change().filter(|_| app.page != Page::Change).map(|change| {
        let words = if change.is_sound {
            "The configuration file has changed: c shows what, and applies it."
        } else {
            "The changed configuration file is refused, what was in force stays: c shows why."
        };
        (words.into(), !change.is_sound)
    })
}

fn troubled(app: &App) -> Option<(String, bool)> {
    let parcel = app.parcel.as_ref()?;
    let time = parcel.chronicle.time()?;
    if let Some(playback) = app.playback() {
        if let Some(seeking) = playback.seeking {
            return Some((seeking_words(app, playback, seeking), false));
        }
        if playback.at_end {
            return Some(("End of the recording. , goes back a frame, { an hour, t to a time; q quits.".into(), false));
        }
    } else if parcel.feed.ended {
        let at = figures::clock(time, app.zone);
        return Some((format!("THE FEED HAS ENDED: this is how it stood at {at}. Nothing new will come."), true));
    }
    let age = app.age().filter(|&age| age > app.max_age.max(TimeDelta::seconds(2)))?;
    let paused = app.playback().is_some_and(|playback| !playback.playing);
    (!paused).then(|| {
        let at = figures::clock(time, app.zone);
        let words =
            format!("NO DATA FOR {}: this is how it stood at {at}. Look at the inputs (m).", figures::duration(age));
        (words, true)
    })
}

fn seeking_words(app: &App, playback: &Playback, seeking: Seeking) -> String {
    let to = seeking.to.map_or(String::new(), |to| format!(" to {}", figures::clock(to, app.zone)));
    let at = playback.now.map_or(String::new(), |now| format!(", at {}", figures::clock(now, app.zone)));
    format!("Going{to}: {} done{at}. Esc stops here.", figures::percent(Some(100.0 * seeking.done)))
}
