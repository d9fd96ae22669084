//! Reviews to be written down, made from a part of the demo day.

use std::{fs::File, path::Path, sync::OnceLock};

use chrono::{DateTime, TimeDelta, Utc};
use chrono_tz::Tz;
use tautline::{
    config::Config,
    feed::{Format, Frame, Reader, Recorded},
    report::review::{Paper, html, text},
    review::{Bench, FileNote, Review, Task},
};

pub const DAY: &str = "replay-data/demo-day.jsonl.zst";

/// What is needed to review the demo.
pub fn task() -> Task {
    let (config, configuration) = Config::read(Path::new("config/demo.toml")).unwrap();
    Task::new(config, configuration.into(), tautline::report::change::lines)
}

/// Frames of the demo day, of so many minutes from a quarter to ten, when a circuit trips.
pub fn frames(task: &Task, minutes: i64) -> Vec<Frame> {
    let reader = Reader::new(DAY, File::open(DAY).unwrap(), Format::of(Path::new(DAY)), &task.channels);
    let begin: DateTime<Utc> = "2031-03-14T09:36:00Z".parse().unwrap();
    let end = begin + TimeDelta::minutes(minutes);
    let frames = Recorded::new(vec![reader], &task.channels);
    frames.skip_while(|frame| frame.time < begin).take_while(|frame| frame.time < end).collect()
}

pub fn files() -> Vec<FileNote> {
    vec![
        FileNote { name: "2031-03-14.jsonl.zst".into(), findings: Vec::new() },
        FileNote { name: "more.jsonl".into(), findings: vec!["3 lines that do not parse".into()] },
    ]
}

pub fn review_of(task: &Task, frames: &[Frame]) -> Review {
    let mut bench = Bench::new(task, task.config.grid.corridors.iter().map(|_| ()));
    bench.take(frames);
    let mut review = Review::new(task.config.feed.max_age());
    let mut day = bench.finish(files(), Vec::new()).unwrap();
    day.findings.push("the configuration has changed at 09:40".into());
    review.add(day);
    review
}

/// Twelve minutes with a trip.
pub fn small() -> (Task, Review) {
    static REVIEW: OnceLock<Review> = OnceLock::new();
    let task = task();
    let review = REVIEW.get_or_init(|| review_of(&task, &frames(&task, 12))).clone();
    (task, review)
}

/// As if each corridor had been as the next one was.
pub fn with_what_if(mut review: Review) -> Review {
    let count = review.corridors.len();
    let was: Vec<_> = review.corridors.iter().map(|corridor| corridor.was.clone()).collect();
    for (place, corridor) in review.corridors.iter_mut().enumerate() {
        corridor.what_if = Some(was[(place + 1) % count].clone());
    }
    for day in &mut review.days {
        let was: Vec<_> = day.corridors.iter().map(|(was, _)| was.clone()).collect();
        for (place, (_, would)) in day.corridors.iter_mut().enumerate() {
            *would = Some(was[(place + 1) % count].clone());
        }
    }
    review
}

pub fn paper<'a>(task: &'a Task, review: &'a Review, changes: &'a [String]) -> Paper<'a> {
    Paper { review, grid: &task.config.grid, zone: Tz::UTC, changes }
}

pub fn page(paper: &Paper) -> String {
    let mut page = Vec::new();
    html::write(paper, &mut page).unwrap();
    String::from_utf8(page).unwrap()
}

pub fn told(paper: &Paper) -> String {
    let mut told = Vec::new();
    text::write(paper, &mut told).unwrap();
    String::from_utf8(told).unwrap()
}
