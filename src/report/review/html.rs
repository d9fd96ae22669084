//! A review as one page for a browser or a printer, with nothing to load and nothing to run.

use std::io::{self, Write};

use chrono::TimeDelta;

use super::{
    Paper,
    clock::Clock,
    compare::{cause, unknown},
    corridor_block::CorridorBlock,
    definitions::DEFINITIONS,
    figures::{LONGEST_SENTENCE, NO_BALANCE, NONE, counted, lasting, minutes_of, mw, name, plain, room, share, signed},
    markup::{Cell, Table, anchor, escape, put},
    plot::time_scale,
    scale::{TimeScale, in_full},
    strip::PATTERNS,
};
use crate::{
    desk::State,
    events::{Event, EventKind},
    report::CAUTION,
    review::{Brief, CorridorReview, Course, DayFigures},
};

const STYLE: &str = include_str!("page.css");
/// Rows of the longest tables; everything is in the JSON.
const MOST_EVENTS: usize = 1000;
const MOST_DAYS: usize = 1500;
const MOST_FILES: usize = 500;

/// Writes it.
pub fn write(paper: &Paper, mut to: impl Write) -> io::Result<()> {
    let clock = Clock::new(paper.zone, paper.review.span);
    let time = time_scale(paper);
    let mut page = String::new();
    head(&mut page, paper, &clock, &time);
    page += "<main id=\"main\">\n";
    summary(&mut page, paper, &clock);
    to.write_all(page.as_bytes())?;
    for (place, corridor) in paper.review.corridors.iter().enumerate() {
        page.clear();
        CorridorBlock { paper: *paper, clock, time: &time, corridor, place }.write(&mut page);
        to.write_all(page.as_bytes())?;
    }
    page.clear();
    days(&mut page, paper);
    events(&mut page, paper, &clock);
    files(&mut page, paper);
    meanings(&mut page);
    page += "</main>\n";
    page += concat!("<footer><p>tautline ", env!("CARGO_PKG_VERSION"), "</p></footer>\n</body>\n</html>\n");
    to.write_all(page.as_bytes())
}

fn head(page: &mut String, paper: &Paper, clock: &Clock, time: &TimeScale) {
    let review = paper.review;
    let title = match review.span {
        None => "Review without a single frame".to_owned(),
        Some((first, last)) => {
            let [first, last] =
                [first, last].map(|time| time.with_timezone(&paper.zone).format("%-d %b %Y").to_string());
            if first == last { format!("Review of {first}") } else { format!("Review of {first} to {last}") }
        }
    };
    put!(
        page,
        "<!DOCTYPE html>\n<html lang=\"en\"><head><meta charset=\"utf-8\"/>\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\"/><title>{}</title>\n\
         <style>\n{STYLE}</style></head>\n<body>\n{PATTERNS}<a class=\"skip\" href=\"#main\">Skip to the summary</a>\n\
         <header><h1>{0}</h1>\n",
        escape(&title)
    );
    if let Some((first, last)) = review.span {
        put!(
            page,
            "<p>{} to {}: {}, data for {} of the time",
            escape(&clock.full(first)),
            escape(&clock.full(last)),
            counted(review.frames, "frame"),
            escape(&review.availability().map_or(NONE.into(), share))
        );
        match review.silent_ms {
            ..1000 => *page += ".",
            ms => put!(page, ", none for {}.", lasting(ms)),
        }
        put!(page, " {}</p>\n", escape(&zone(time)));
    }
    if !paper.changes.is_empty() {
        let changes: Vec<_> = paper.changes.iter().map(|change| plain(change, LONGEST_SENTENCE)).collect();
        put!(page, "<p><strong>What if:</strong> {}.</p>\n", escape(&changes.join("; ")));
    }
    put!(page, "<p class=\"caution\">{}</p>\n</header>\n", escape(&CAUTION.replace('\n', " ")));
    *page += "<nav aria-label=\"Contents\"><ul><li><a href=\"#summary\">Summary</a></li>";
    for (place, corridor) in review.corridors.iter().enumerate() {
        put!(page, "<li><a href=\"#{}\">{}</a></li>", anchor(place), escape(&name(&corridor.corridor)));
    }
    if review.days.len() > 1 {
        *page += "<li><a href=\"#days\">Days</a></li>";
    }
    *page += "<li><a href=\"#events\">Events</a></li><li><a href=\"#files\">Files</a></li>\
              <li><a href=\"#definitions\">Definitions and limits</a></li></ul></nav>\n";
}

/// In which zone times are, and with which offsets.
fn zone(time: &TimeScale) -> String {
    let offset = |at_s: i64| time.local(at_s).map_or(String::new(), |time| in_full(&time));
    let shifts = time.shifts();
    if shifts.is_empty() && offset(time.begin_s).starts_with("UTC+00") {
        return "Times are UTC.".into();
    }
    let mut told = format!("Times are of {}: {}", time.zone.name(), offset(time.begin_s));
    for shift in shifts.iter().take(4) {
        // As the clock shows it before it is turned.
        let turned = time.local(shift.at_s - 1).map(|time| time.naive_local() + TimeDelta::seconds(1));
        let when = turned.map_or(String::new(), |time| time.format("%-d %b %H:%M").to_string());
        put!(told, " until {when}, then {}", offset(shift.at_s));
    }
    told + "."
}

fn summary(page: &mut String, paper: &Paper, clock: &Clock) {
    *page += "<section id=\"summary\"><h2>Summary</h2>\n";
    if paper.review.corridors.is_empty() {
        *page += "<p>Not a single frame was read.</p></section>\n";
        return;
    }
    let corridors = || paper.review.corridors.iter().enumerate();
    let mut heading = vec!["corridor", "least headroom, MW", "when", "set by", "thin, min", "spent, min", "blind, min"];
    heading.extend(["known", "transfer, MW"]);
    let table = Table { caption: "All corridors", label: "", heading: &heading };
    table.write(page, corridors().map(|(place, corridor)| summary_row(paper, clock, place, corridor)));
    if corridors().any(|(_, corridor)| corridor.what_if.is_some()) {
        let heading =
            ["corridor", "least headroom, MW", "would have been", "difference", "thin, min", "would have been"];
        let heading = heading.into_iter().chain(["spent, min", "would have been"]).collect::<Vec<_>>();
        let table = Table { caption: "What if", label: "", heading: &heading };
        table.write(page, corridors().filter_map(|(place, corridor)| what_if_row(place, corridor)));
    }
    *page += "</section>\n";
}

fn summary_row(paper: &Paper, clock: &Clock, place: usize, corridor: &CorridorReview) -> Vec<Cell> {
    let none = || NONE.to_owned();
    let was = &corridor.was;
    let least = was.least.as_ref();
    let known_ms = was.state_ms.total_ms() - was.state_ms.ms(&State::Blind);
    let transfer = was.transfer_mw.map_or_else(none, |[low, high]| format!("{} to {}", mw(low), mw(high)));
    let mut row = vec![
        Cell::Link(anchor(place), name(&corridor.corridor)),
        Cell::number(least.map_or_else(none, |least| room(least.headroom_mw))),
        Cell::text(least.map_or_else(none, |least| clock.when(least.time))),
        Cell::text(least.and_then(|least| least.binding.as_ref()).map_or_else(none, cause)),
    ];
    row.extend(
        [State::Thin, State::Spent, State::Blind].map(|state| Cell::number(minutes_of(was.state_ms.ms(&state)))),
    );
    row.push(Cell::number(paper.review.part(known_ms).map_or_else(none, share)));
    row.push(Cell::number(transfer));
    row
}

fn what_if_row(place: usize, corridor: &CorridorReview) -> Option<Vec<Cell>> {
    let courses = [&corridor.was, corridor.what_if.as_ref()?];
    let least = courses.map(|course| course.lowest().map(|least| least.headroom_mw));
    let shown =
        |course: &Course| course.lowest().map_or_else(|| unknown(course).into(), |least| room(least.headroom_mw));
    let [was, would] = courses.map(|course| Cell::number(shown(course)));
    let difference = least[0].zip(least[1]).map_or(NONE.into(), |(was, would)| signed(would - was, 0));
    let mut row = vec![Cell::Link(anchor(place), name(&corridor.corridor)), was, would, Cell::number(difference)];
    let minutes = |state| courses.map(|course| Cell::number(minutes_of(course.state_ms.ms(&state))));
    row.extend([State::Thin, State::Spent].into_iter().flat_map(minutes));
    Some(row)
}

/// One row for each day, with the corridor that came closest.
fn days(page: &mut String, paper: &Paper) {
    let days = &paper.review.days;
    if days.len() < 2 {
        return;
    }
    let compared = paper.review.corridors.iter().any(|corridor| corridor.what_if.is_some());
    let mut heading = vec!["day (UTC)", "least headroom, MW", "corridor", "set by", "thin, min", "spent, min"];
    heading.extend(["blind, min", "data, h", "alarms", "begun with"]);
    if compared {
        heading.push("least would have been, MW");
    }
    *page += "<section id=\"days\"><h2>Days</h2>\n";
    let table = Table {
        caption: "Each day: the corridor that came closest, and all corridors together",
        label: "",
        heading: &heading,
    };
    table.write(page, days.iter().take(MOST_DAYS).map(|day| day_row(paper, day, compared)));
    if days.len() > MOST_DAYS {
        put!(page, "<p>{} more days are in the CSV report.</p>", days.len() - MOST_DAYS);
    }
    *page += "<p class=\"muted\">The CSV report has each corridor's figures for each day.</p></section>\n";
}

fn day_row(paper: &Paper, day: &DayFigures, compared: bool) -> Vec<Cell> {
    let least = |brief: &Brief| brief.least.as_ref().map_or(f64::INFINITY, |least| least.headroom_mw);
    let corridors = paper.review.corridors.iter().zip(&day.corridors);
    let closest = corridors.min_by(|(_, (one, _)), (_, (other, _))| least(one).total_cmp(&least(other)));
    let found = closest.and_then(|(corridor, (was, _))| Some((corridor, was.least.as_ref()?)));
    let shown = |mw: f64| if mw.is_finite() { room(mw) } else { NONE.into() };
    let minutes =
        |state: State| Cell::number(minutes_of(day.corridors.iter().map(|(was, _)| was.state_ms.ms(&state)).sum()));
    let alarms: u64 = day.corridors.iter().map(|(was, _)| was.alarms).sum();
    let mut row = vec![
        Cell::text(day.date.to_string()),
        Cell::number(found.map_or(NONE.into(), |(_, least)| room(least.headroom_mw))),
        Cell::text(found.map_or(NONE.into(), |(corridor, _)| name(&corridor.corridor))),
        Cell::text(found.and_then(|(_, least)| least.binding.as_ref()).map_or(NONE.into(), cause)),
    ];
    row.extend([State::Thin, State::Spent, State::Blind].map(minutes));
    row.push(Cell::number(format!("{:.1}", day.covered_ms as f64 / 3_600_000.0)));
    row.push(Cell::number(alarms.to_string()));
    row.push(Cell::text(match day.beginning {
        crate::review::Beginning::Recorded => "what the recording keeps",
        crate::review::Beginning::Configured => "the configuration",
        crate::review::Beginning::Carried => "the day before",
    }));
    if compared {
        let would = day.corridors.iter().filter_map(|(_, would)| would.as_ref());
        let parts = would.clone().any(|would| would.unbalanced_ms > 0);
        let lowest = shown(would.map(least).fold(f64::INFINITY, f64::min));
        row.push(Cell::number(if parts { NO_BALANCE.into() } else { lowest }));
    }
    row
}

fn events(page: &mut String, paper: &Paper, clock: &Clock) {
    let review = paper.review;
    *page += "<section id=\"events\"><h2>Events</h2>\n";
    let listed = review.most_telling(MOST_EVENTS);
    let is_routine = |event: &&&Event| matches!(event.kind, EventKind::Step | EventKind::Meter);
    let (routine, telling): (Vec<_>, Vec<_>) = listed.iter().partition(is_routine);
    let write = |page: &mut String, caption, events: &[&Event]| {
        let heading = ["time", "corridor", "kind", "what happened"];
        let rows = events.iter().map(|event| event_row(clock, event));
        Table { caption, label: "", heading: &heading }.write(page, rows);
    };
    if telling.is_empty() {
        *page += "<p>No switching, no change of state, no alarm, no gap.</p>";
    } else {
        write(page, "Switching, states, alarms and gaps, in order", &telling);
    }
    if !routine.is_empty() {
        *page += "<div class=\"on-screen\">";
        write(page, "Steps of the sources, and meters", &routine);
        *page += "</div><p class=\"muted\">Steps and meters are not printed.</p>";
    }
    if listed.len() < review.events.len() {
        put!(page, "<p>{} less telling ones are in the JSON report.</p>", review.events.len() - listed.len());
    }
    if review.events_left_out > 0 {
        put!(page, "<p>{} more were too many to be kept.</p>", review.events_left_out);
    }
    *page += "</section>\n";
}

fn event_row(clock: &Clock, event: &Event) -> Vec<Cell> {
    vec![
        Cell::text(clock.when(event.time)),
        Cell::text(event.corridor.as_ref().map_or(NONE.into(), |corridor| name(corridor))),
        Cell::text(event.kind.word()),
        Cell::text(plain(&event.text, LONGEST_SENTENCE)),
    ]
}

fn files(page: &mut String, paper: &Paper) {
    let review = paper.review;
    *page += "<section id=\"files\"><h2>Files and findings</h2>\n";
    if !review.files.is_empty() {
        let table = Table { caption: "Files", label: "", heading: &["file", "findings"] };
        let rows = review.files.iter().take(MOST_FILES).map(|file| {
            let findings = if file.findings.is_empty() { "none".into() } else { file.findings.join("; ") };
            vec![Cell::text(plain(&file.name, LONGEST_SENTENCE)), Cell::text(plain(&findings, 5 * LONGEST_SENTENCE))]
        });
        table.write(page, rows);
        if review.files.len() > MOST_FILES {
            put!(page, "<p>{} more files are in the JSON report.</p>", review.files.len() - MOST_FILES);
        }
    }
    if review.findings.is_empty() {
        *page += "<p>No findings on the days themselves.</p>";
    } else {
        let table = Table { caption: "Findings", label: "", heading: &["day (UTC)", "finding"] };
        let rows = review.findings.iter().take(MOST_FILES);
        let row = |(date, finding): &(chrono::NaiveDate, String)| {
            vec![Cell::text(date.to_string()), Cell::text(plain(finding, LONGEST_SENTENCE))]
        };
        table.write(page, rows.map(row));
    }
    *page += "</section>\n";
}

fn meanings(page: &mut String) {
    *page += "<section id=\"definitions\"><h2>Definitions</h2>\n<dl>";
    for (term, meaning) in DEFINITIONS {
        put!(page, "<dt>{}</dt><dd>{}</dd>", escape(term), escape(meaning));
    }
    *page += "</dl></section>\n<section id=\"limits\"><h2>Limits of the method</h2>\n";
    put!(page, "<p class=\"caution\">{}</p>\n", escape(&CAUTION.replace('\n', " ")));
    *page += "<p>Each side is one machine behind a reactance with constant voltage; loads are constant admittances; the network is \
              balanced apart from the fault itself. A review is as good as the recorded measurements and the configuration.</p>\
              </section>\n";
}
