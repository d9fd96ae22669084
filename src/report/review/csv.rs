//! A review for a spreadsheet: one row for each corridor and UTC day.

use std::io::{self, Write};

use chrono::SecondsFormat;

use super::{Paper, compare::STATES};
use crate::review::{Brief, DayFigures};

const DAY: [&str; 4] = ["date", "corridor", "beginning", "frames"];
/// Those of a corridor as it was; as it would have been, `if_` is before each.
const BRIEF: [&str; 18] = [
    "data_minutes",
    "ample_minutes",
    "thin_minutes",
    "spent_minutes",
    "blind_minutes",
    "no_balance_minutes",
    "transfer_low_mw",
    "transfer_mean_mw",
    "transfer_high_mw",
    "least_headroom_mw",
    "least_headroom_sd_mw",
    "least_time",
    "least_transfer_mw",
    "least_outage",
    "least_criterion",
    "headroom_held_50_pct_mw",
    "headroom_held_95_pct_mw",
    "alarms",
];

/// Writes it. Times are UTC; an empty cell is a value that does not exist.
pub fn write(paper: &Paper, to: impl Write) -> io::Result<()> {
    let compared = paper.review.corridors.iter().any(|corridor| corridor.what_if.is_some());
    let mut csv = ::csv::Writer::from_writer(to);
    let would = BRIEF.iter().filter(|_| compared).map(|column| format!("if_{column}"));
    csv.write_record(DAY.iter().chain(&BRIEF).map(|column| (*column).to_owned()).chain(would))?;
    for day in &paper.review.days {
        for (corridor, (was, would)) in paper.review.corridors.iter().zip(&day.corridors) {
            let mut record = first_cells(day, &corridor.corridor);
            record.extend(cells(was));
            match would {
                Some(would) => record.extend(cells(would)),
                None if compared => record.extend(BRIEF.map(|_| String::new())),
                None => {}
            }
            csv.write_record(record)?;
        }
    }
    csv.flush()
}

fn first_cells(day: &DayFigures, corridor: &str) -> Vec<String> {
    vec![day.date.to_string(), word(corridor), day.beginning.word().into(), day.frames.to_string()]
}

fn cells(brief: &Brief) -> [String; BRIEF.len()] {
    let minutes = |ms: i64| (ms as f64 / 60_000.0).to_string();
    let number = |value: Option<f64>| value.map_or(String::new(), |value| value.to_string());
    let [ample, thin, spent, blind] = STATES.map(|state| minutes(brief.state_ms.ms(&state)));
    let [low, high] = [0, 1].map(|end| number(brief.transfer_mw.map(|ends| ends[end])));
    let least = brief.least.as_ref();
    let binding = least.and_then(|least| least.binding.as_ref());
    let [median, mostly] = brief.held_mw.map(|held| number(held.map(f64::from)));
    [
        minutes(brief.state_ms.total_ms()),
        ample,
        thin,
        spent,
        blind,
        minutes(brief.unbalanced_ms),
        low,
        number(brief.mean_transfer_mw),
        high,
        number(least.map(|least| least.headroom_mw)),
        number(least.and_then(|least| least.headroom_sd_mw)),
        least.map_or(String::new(), |least| least.time.to_rfc3339_opts(SecondsFormat::AutoSi, true)),
        number(least.and_then(|least| least.transfer_mw)),
        binding.and_then(|binding| binding.outage.as_deref()).map_or(String::new(), word),
        binding.map_or(String::new(), |binding| binding.criterion.word().into()),
        median,
        mostly,
        brief.alarms.to_string(),
    ]
}

/// A name that no spreadsheet takes for a formula.
fn word(text: &str) -> String {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r']) { format!("'{text}") } else { text.to_owned() }
}
