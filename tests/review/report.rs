use serde_json::Value;
use tautline::{
    events::{Event, EventKind},
    report::review::{Paper, csv, json},
    review::Review,
};

use super::paper::{frames, paper, review_of, small, task, told, with_what_if};

fn object(paper: &Paper) -> Value {
    let mut written = Vec::new();
    json::write(paper, &mut written).unwrap();
    serde_json::from_slice(&written).unwrap()
}

/// A value as it is compared between machines: lists of their first three, numbers to six digits.
fn shortened(value: &Value) -> Value {
    match value {
        Value::Array(list) => list.iter().take(3).map(shortened).collect(),
        Value::Object(members) => members.iter().map(|(key, value)| (key.clone(), shortened(value))).collect(),
        Value::Number(number) if number.is_f64() => {
            format!("{:.5e}", number.as_f64().unwrap()).parse::<f64>().unwrap().into()
        }
        other => other.clone(),
    }
}

#[test]
fn a_day_as_text() {
    let (task, review) = small();
    insta::assert_snapshot!(told(&paper(&task, &review, &[])));
}

#[test]
fn a_day_and_what_if_as_text() {
    let (task, review) = small();
    let review = with_what_if(review);
    let told = told(&paper(&task, &review, &["close TM3".into(), "transfer Torvane-Melskar -200".into()]));
    insta::assert_snapshot!(told);
}

#[test]
fn a_day_as_json() {
    let (task, review) = small();
    let mut object = object(&paper(&task, &with_what_if(review), &["close TM3".into()]));
    object.as_object_mut().unwrap().remove("program").unwrap();
    insta::assert_snapshot!(serde_json::to_string_pretty(&shortened(&object)).unwrap());
}

#[test]
fn the_figures_are_those_of_the_review() {
    let (task, review) = small();
    let object = object(&paper(&task, &review, &[]));
    assert_eq!(object["frames"], review.frames);
    assert_eq!(object["events"].as_array().unwrap().len(), review.events.len());
    for (written, corridor) in object["corridors"].as_array().unwrap().iter().zip(&review.corridors) {
        let least = corridor.was.least.as_ref().unwrap();
        assert_eq!(written["was"]["least_headroom"]["headroom_mw"], least.headroom_mw);
        let shares = written["was"]["set_by"].as_array().unwrap().iter();
        let shares: f64 = shares.map(|share| share["share"].as_f64().unwrap()).sum();
        assert!((shares - 1.0).abs() < 1e-12, "{shares}");
        let curve = written["was"]["duration_curve"].as_array().unwrap();
        assert_eq!(curve.last().unwrap()["share"], 1.0);
        assert_eq!(written["was"]["course"].as_array().unwrap().len(), corridor.was.series.slots.len());
        assert_eq!(written["would_have_been"], Value::Null);
    }
}

fn table(paper: &Paper) -> Vec<Vec<String>> {
    let mut written = Vec::new();
    csv::write(paper, &mut written).unwrap();
    let mut reader = ::csv::ReaderBuilder::new().has_headers(false).from_reader(&*written);
    reader.records().map(|record| record.unwrap().iter().map(str::to_owned).collect()).collect()
}

#[test]
fn a_row_for_each_corridor_and_day() {
    let (task, review) = small();
    let rows = table(&paper(&task, &review, &[]));
    assert_eq!(rows.len(), 1 + review.corridors.len());
    let cell = |row: usize, column: &str| {
        let place = rows[0].iter().position(|known| known == column).unwrap_or_else(|| panic!("no column {column}"));
        rows[row][place].clone()
    };
    for (row, corridor) in review.corridors.iter().enumerate() {
        let least = corridor.was.least.as_ref().unwrap();
        assert_eq!(cell(row + 1, "date"), "2031-03-14");
        assert_eq!(cell(row + 1, "corridor"), *corridor.corridor);
        assert_eq!(cell(row + 1, "least_headroom_mw").parse(), Ok(least.headroom_mw));
        assert_eq!(cell(row + 1, "least_criterion"), least.binding.as_ref().unwrap().criterion.word());
    }
    let review = with_what_if(review);
    let compared = table(&paper(&task, &review, &[]));
    assert!(
        compared.iter().zip(&rows).all(|(long, short)| long.starts_with(short) && long.len() == 2 * short.len() - 4)
    );
    assert_eq!(compared[1][rows[0].len()..], compared[2][4..rows[0].len()], "it would have been as the next one was");
}

#[test]
fn no_name_is_a_formula() {
    let (task, mut review) = small();
    review.corridors[0].corridor = "=1+1".into();
    assert_eq!(table(&paper(&task, &review, &[]))[1][1], "'=1+1");
}

#[test]
fn nothing_is_wider_than_the_terminal_or_steers_it() {
    let (task, review) = small();
    let mut review = with_what_if(review);
    let long = "a\u{1b}[31m\u{202e}\u{200f}".repeat(2000);
    review.files[1].name = long.clone();
    review.findings.push((review.days[0].date, long.clone()));
    review.corridors[1].corridor = long.as_str().into();
    for kind in EventKind::ALL {
        let time = review.events[0].time;
        review.events.push(Event { time, corridor: Some(long.as_str().into()), kind, state: None, text: long.clone() });
    }
    let told = told(&paper(&task, &review, &[long]));
    for line in told.lines() {
        assert!(line.chars().count() <= 100, "{line}");
        assert!(!line.chars().any(|c| c.is_control() || matches!(c, '\u{202e}' | '\u{200f}')), "{line:?}");
    }
}

#[test]
fn of_many_events_the_most_telling_are_listed_and_the_rest_is_counted() {
    let (task, mut review) = small();
    let step = review.events[0].clone();
    let trips = review.events.iter().filter(|event| event.kind == EventKind::Trip).count();
    review.events.splice(0..0, (0..500).map(|_| Event { kind: EventKind::Step, ..step.clone() }));
    let told = told(&paper(&task, &review, &[]));
    assert_eq!(told.matches("  trip ").count(), trips);
    assert!(told.contains(&format!("and {} less telling ones", review.events.len() - 60)), "{told}");
}

#[test]
fn without_a_frame_that_is_said() {
    let task = task();
    let review = Review::new(task.config.feed.max_age());
    let paper = paper(&task, &review, &[]);
    assert!(told(&paper).starts_with("Not a single frame.\n"));
    assert_eq!(object(&paper)["first"], Value::Null);
    assert_eq!(table(&paper).len(), 1);
}

#[test]
fn a_single_frame_and_a_blind_one_are_days_too() {
    let task = task();
    let mut frames = frames(&task, 1);
    frames.truncate(1);
    let review = review_of(&task, &frames);
    let one = told(&paper(&task, &review, &[]));
    assert!(one.contains("1 frame") && one.contains("least headroom"), "{one}");
    assert_eq!(object(&paper(&task, &review, &[]))["availability"], 1.0);
    frames[0].readings.clear();
    let review = review_of(&task, &frames);
    let blind = told(&paper(&task, &review, &[]));
    assert!(blind.contains("least headroom  never known") && blind.contains("blind 0.2"), "{blind}");
}
