//! A review for the terminal, at most 100 columns wide.

use std::io::{self, Write};

use super::{
    Paper,
    clock::Clock,
    compare::{HELD_PCT, STATES, cause, causes, rows},
    figures::{LONGEST_SENTENCE, NO_BALANCE, NONE, counted, lasting, minutes_of, mw, name, number, plain, room, share},
    sketch::Sketch,
};
use crate::{
    desk::State,
    events::Event,
    report::{CAUTION, table::Table},
    review::{Brief, CorridorReview, DayFigures, SourceNote},
};

const WIDTH: usize = 100;
/// Events, files, findings and meters that are listed.
const MOST_EVENTS: usize = 60;
const MOST_LINES: usize = 20;
/// Days that are listed, of all corridors together; more are in the CSV.
const MOST_DAYS: usize = 400;
/// Characters of a name in a table.
const CELL: usize = 24;
/// A space at which no line is broken, within this file.
const NO_BREAK: &str = "\u{a0}";
const IN_FULL: &str = "the HTML, JSON and CSV reports have more";

/// Writes it.
pub fn write(paper: &Paper, mut to: impl Write) -> io::Result<()> {
    let clock = Clock::new(paper.zone, paper.review.span);
    heading(paper, &clock, &mut to)?;
    for corridor in &paper.review.corridors {
        writeln!(to, "\n{}", name(&corridor.corridor))?;
        figures(paper, &clock, corridor, &mut to)?;
    }
    days(paper, &mut to)?;
    events(paper, &clock, &mut to)?;
    files(paper, &mut to)?;
    writeln!(to)?;
    CAUTION.lines().try_for_each(|line| wrapped(&mut to, "", line))
}

fn heading(paper: &Paper, clock: &Clock, to: &mut impl Write) -> io::Result<()> {
    let review = paper.review;
    let Some((first, last)) = review.span else { return writeln!(to, "Not a single frame.") };
    writeln!(to, "{} to {}, {}", clock.full(first), clock.full(last), counted(review.frames, "frame"))?;
    write!(to, "data for {} of the time", review.availability().map_or(NONE.into(), share))?;
    match review.silent_ms {
        ..1000 => writeln!(to)?,
        ms => writeln!(to, ", none for {}", lasting(ms))?,
    }
    for change in paper.changes {
        wrapped(to, "what if: ", &plain(change, LONGEST_SENTENCE))?;
    }
    Ok(())
}

/// The essence of a corridor in a few lines.
fn in_brief(paper: &Paper, clock: &Clock, corridor: &CorridorReview, to: &mut impl Write) -> io::Result<()> {
    let was = &corridor.was;
    let least = was.least.as_ref().map_or("never known".into(), |least| {
        let spread = least.headroom_sd_mw.map_or(String::new(), |sd| format!(" ±{}", mw(sd.ceil())));
        let cause = least.binding.as_ref().map_or(String::new(), |binding| format!(": {}", cause(binding)));
        let transfer =
            least.transfer_mw.map_or(String::new(), |transfer| format!(", at a transfer of {} MW", mw(transfer)));
        format!("{}{spread} MW at {}{cause}{transfer}", room(least.headroom_mw), clock.when(least.time))
    });
    wrapped(to, "  least headroom  ", &least)?;
    let mean = was.mean_transfer_mw().map_or(String::new(), |mean| format!(", mean {}", mw(mean)));
    let direction = match paper.terminals(corridor) {
        ["", _] | [_, ""] => String::new(),
        [from, to] => format!(", positive from {} to {}", plain(from, CELL), plain(to, CELL)),
    };
    let transfer = was
        .transfer_mw
        .map_or("never known".into(), |[low, high]| format!("{} to {} MW{mean}{direction}", mw(low), mw(high)));
    wrapped(to, "  transfer        ", &transfer)?;
    let minutes = STATES.into_iter().filter(|state| was.state_ms.ms(state) > 0);
    let minutes: Vec<_> =
        minutes.map(|state| format!("{} {}", state.word(), minutes_of(was.state_ms.ms(&state)))).collect();
    wrapped(to, "  minutes         ", &minutes.join(", "))?;
    let mut held = HELD_PCT.into_iter().filter_map(|pct| {
        let held = was.held_for(f64::from(pct) / 100.0)?;
        Some((mw(held.into()), pct))
    });
    let Some((most, pct)) = held.next() else { return Ok(()) };
    let others = held.map(|(mw, pct)| format!("{mw} for {pct} %"));
    let held = [format!("{most} MW for {pct} % of the time")].into_iter().chain(others);
    let unbroken: Vec<_> = held.map(|held| held.replace(' ', NO_BREAK)).collect();
    wrapped(to, "  held            ", &unbroken.join(", "))
}

fn compared(clock: &Clock, corridor: &CorridorReview, to: &mut impl Write) -> io::Result<()> {
    writeln!(to)?;
    let cut = |text: String| plain(&text, CELL);
    let rows = rows(clock, corridor);
    let rows = rows.into_iter().map(|row| [plain(&row.what, 40), cut(row.was), cut(row.would), row.difference]);
    write!(to, "{}", Table::new(["", "was", "would have been", "difference"], rows))
}

fn figures(paper: &Paper, clock: &Clock, corridor: &CorridorReview, to: &mut impl Write) -> io::Result<()> {
    in_brief(paper, clock, corridor, to)?;
    let [was, would] = match corridor.what_if {
        Some(_) => ["was", "would have been"],
        None => [""; 2],
    };
    if corridor.what_if.is_some() {
        compared(clock, corridor, to)?;
    }
    let causes = causes(corridor);
    if !causes.is_empty() {
        writeln!(to, "\n  headroom set by, share of the time")?;
        let part = |part: f64| if corridor.what_if.is_some() { share(part) } else { String::new() };
        let rows = causes
            .iter()
            .take(MOST_LINES)
            .map(|(binding, [was, would])| [plain(&cause(binding), 48), share(*was), part(*would)]);
        write!(to, "{}", Table::new(["", was, would], rows))?;
        more(to, causes.len(), "outages and criteria")?;
    }
    write!(to, "{}", Sketch { series: &corridor.was.series, clock: *clock })?;

    if !corridor.meters.is_empty() {
        let mut meters: Vec<_> = corridor.meters.iter().collect();
        meters.sort_by_key(|(_, note)| std::cmp::Reverse(note.missing_ms + note.suspect_ms));
        writeln!(to, "\n  channels, minutes of no use")?;
        let rows = meters
            .iter()
            .take(MOST_LINES)
            .map(|(channel, note)| [plain(channel, 48), minutes_of(note.missing_ms), minutes_of(note.suspect_ms)]);
        write!(to, "{}", Table::new(["", "missing", "set aside"], rows))?;
        more(to, meters.len(), "channels")?;
    }
    if let Some([first, last]) = &corridor.sources {
        writeln!(to, "\n  sources, ohm")?;
        let notes = first.iter().zip(last).flat_map(|(first, last)| [("first", first), ("last", last)]);
        let rows = notes.map(|(when, note)| source(when, note));
        write!(to, "{}", Table::new(["behind", "at frame", "R", "X", "basis", "steps"], rows))?;
    }
    if !corridor.was.alarms.is_empty() {
        writeln!(to, "\n  alarms raised")?;
        let compared = would;
        let would = corridor.what_if.as_ref().map(|course| &course.alarms);
        let rows = corridor.was.alarms.iter().take(MOST_LINES).map(|count| {
            let would = would.map(|alarms| alarms.iter().find(|other| other.alarm == count.alarm));
            let would = would.map_or(String::new(), |count| count.map_or(0, |count| count.raised).to_string());
            [plain(&count.alarm, 48), count.priority.word().into(), count.raised.to_string(), would]
        });
        write!(to, "{}", Table::new(["", "priority", "raised", compared], rows))?;
        more(to, corridor.was.alarms.len(), "alarms")?;
    }
    Ok(())
}

fn source(when: &str, note: &SourceNote) -> [String; 6] {
    let ohm = |ohm: f64, sd: f64| format!("{} ±{}", number(ohm, 1), number(sd, 1));
    [
        plain(&note.bus, CELL),
        when.into(),
        ohm(note.r_ohm, note.r_sd),
        ohm(note.x_ohm, note.x_sd),
        note.basis.word().into(),
        note.steps.to_string(),
    ]
}

/// One line for each day and corridor, where there are several days.
fn days(paper: &Paper, to: &mut impl Write) -> io::Result<()> {
    let days = &paper.review.days;
    if days.len() < 2 {
        return Ok(());
    }
    let most = MOST_DAYS / paper.review.corridors.len().max(1);
    writeln!(to, "\nDays (UTC)")?;
    for (place, corridor) in paper.review.corridors.iter().enumerate() {
        writeln!(to, "\n  {}", name(&corridor.corridor))?;
        let rows = days.iter().take(most).filter_map(|day| {
            let (was, would) = day.corridors.get(place)?;
            Some(day_row(day, was, would.as_ref()))
        });
        let would = if corridor.what_if.is_some() { "would be" } else { "" };
        let [ample, thin, spent, blind] = STATES.map(State::word);
        let heading = ["", "least", would, "there 95 %", ample, thin, spent, blind, "alarms", "begun"];
        write!(to, "{}", Table::new(heading, rows))?;
    }
    writeln!(to, "    least headroom and headroom there 95 % of the time, MW; minutes in each state")?;
    if days.len() > most {
        writeln!(to, "    {} more days: see the CSV report", days.len() - most)?;
    }
    Ok(())
}

fn day_row(day: &DayFigures, was: &Brief, would: Option<&Brief>) -> [String; 10] {
    let least = |brief: &Brief| match &brief.least {
        Some(least) => room(least.headroom_mw),
        None => if brief.unbalanced_ms > 0 { NO_BALANCE } else { NONE }.into(),
    };
    let [ample, thin, spent, blind] = STATES.map(|state| minutes_of(was.state_ms.ms(&state)));
    [
        day.date.to_string(),
        least(was),
        would.map_or(String::new(), least),
        was.held_mw[1].map_or(NONE.into(), |held| mw(held.into())),
        ample,
        thin,
        spent,
        blind,
        was.alarms.to_string(),
        day.beginning.word().into(),
    ]
}

fn events(paper: &Paper, clock: &Clock, to: &mut impl Write) -> io::Result<()> {
    let review = paper.review;
    if review.events.is_empty() {
        return Ok(());
    }
    writeln!(to, "\nEvents")?;
    let listed = review.most_telling(MOST_EVENTS);
    let many = review.corridors.len() > 1;
    for Event { time, corridor, kind, text, .. } in &listed {
        let corridor =
            corridor.as_ref().filter(|_| many).map_or(String::new(), |name| format!("{}: ", plain(name, CELL)));
        let head = format!("  {}  {:9}  ", clock.when(*time), kind.word());
        wrapped(to, &head, &format!("{corridor}{}", plain(text, LONGEST_SENTENCE)))?;
    }
    if listed.len() < review.events.len() {
        writeln!(to, "  and {} less telling ones: see the JSON report", review.events.len() - listed.len())?;
    }
    if review.events_left_out > 0 {
        writeln!(to, "  and {} that were too many to be kept", review.events_left_out)?;
    }
    Ok(())
}

fn files(paper: &Paper, to: &mut impl Write) -> io::Result<()> {
    let review = paper.review;
    let listed: Vec<_> = review.files.iter().filter(|file| !file.findings.is_empty()).collect();
    let whole = review.files.len() - listed.len();
    writeln!(to, "\nFiles\n  {} read, {whole} without a finding", review.files.len())?;
    for file in listed.iter().take(MOST_LINES) {
        wrapped(to, "  ", &plain(&file.name, LONGEST_SENTENCE))?;
        for finding in file.findings.iter().take(MOST_LINES) {
            wrapped(to, "    ", &plain(finding, LONGEST_SENTENCE))?;
        }
        more(to, file.findings.len(), "findings")?;
    }
    more(to, listed.len(), "files with findings")?;
    for (date, finding) in review.findings.iter().take(MOST_LINES) {
        wrapped(to, &format!("  {date}  "), &plain(finding, LONGEST_SENTENCE))?;
    }
    more(to, review.findings.len(), "findings")
}

/// Says how many are not listed.
fn more(to: &mut impl Write, count: usize, what: &str) -> io::Result<()> {
    if count > MOST_LINES { writeln!(to, "    {} more {what}; {IN_FULL}", count - MOST_LINES) } else { Ok(()) }
}

/// A sentence after its head, broken between words, the lines that follow set in.
fn wrapped(to: &mut impl Write, head: &str, text: &str) -> io::Result<()> {
    let indent = head.chars().count();
    let most = WIDTH.saturating_sub(indent).max(20);
    write!(to, "{head}")?;
    let mut used = 0;
    for word in text.split(' ') {
        // A word that is longer than a line is broken wherever the line ends.
        let letters: Vec<char> = word.chars().collect();
        for (place, part) in letters.chunks(most).enumerate() {
            let space = usize::from(used > 0 && place == 0);
            if used + space + part.len() > most {
                write!(to, "\n{:indent$}", "")?;
                used = 0;
            } else if space == 1 {
                write!(to, " ")?;
                used += 1;
            }
            write!(to, "{}", part.iter().collect::<String>().replace(NO_BREAK, " "))?;
            used += part.len();
        }
    }
    writeln!(to)
}
