//! Files in every order and condition.

use std::fs;

use tautline::events::EventKind;

use crate::bed::{Bed, name, without_files};

#[test]
fn order_and_cuts_change_nothing() {
    let bed = Bed::new(24.0);
    let whole = bed.days(&[bed.file("whole.jsonl.zst", &bed.lines)], 1, false);
    let cut = [
        bed.file("late.jsonl.zst", bed.hours(15..24)),
        bed.file("early.jsonl", bed.hours(0..7)),
        bed.file("midst.jsonl.zst", bed.hours(7..15)),
    ];
    let cut = bed.days(&cut, 2, false);
    assert_eq!(cut[0].files.len(), 3);
    assert_eq!(without_files(cut), without_files(whole));
}

#[test]
fn overlapping_and_doubled_files_count_once_and_are_said() {
    let bed = Bed::new(24.0);
    let whole = bed.days(&[bed.file("whole.jsonl", &bed.lines)], 2, false);
    let (one, other) = (bed.file("one.jsonl", bed.hours(0..16)), bed.file("other.jsonl", bed.hours(12..24)));
    let days = bed.days(&[one.clone(), other.clone(), one.clone()], 2, false);
    let said = days[0].findings.join("\n");
    assert!(
        said.contains(&format!("{} overlaps with {} from 2031-03-14T12:00:00Z", name(&other), name(&one))),
        "{said}"
    );
    assert!(said.contains("given twice"), "{said}");
    assert_eq!(without_files(days), without_files(whole));
}

#[test]
fn a_missing_hour_is_a_gap() {
    let bed = Bed::new(24.0);
    let lines = [bed.hours(0..9), bed.hours(10..24)].concat();
    let review = bed.review(&[bed.file("day.jsonl", &lines)]);
    let gaps: Vec<_> = review.events.iter().filter(|event| event.kind == EventKind::Gap).collect();
    assert_eq!(gaps.len(), 1);
    assert!(gaps[0].text.contains("60 min"), "{}", gaps[0].text);
    assert!(review.events.iter().any(|event| event.kind == EventKind::Trip));
    assert!(review.events.iter().any(|event| event.kind == EventKind::Return));
    assert!(review.events.iter().any(|event| event.kind == EventKind::Step));
}

#[test]
fn a_missing_day_is_a_gap() {
    let bed = Bed::new(60.0);
    let files = [bed.file("1.jsonl", bed.hours(0..24)), bed.file("3.jsonl", bed.hours(48..60))];
    let review = bed.review(&files);
    assert_eq!(review.days.len(), 2);
    let gap = review.events.iter().find(|event| event.kind == EventKind::Gap).unwrap();
    assert!(gap.text.contains("24 h"), "{}", gap.text);
    assert_eq!(review.silent_ms, 24 * 3_600_000);
}

#[test]
fn broken_files_are_read_as_far_as_they_go_and_said() {
    let bed = Bed::new(24.0);
    let path = bed.file("cut.jsonl.zst", bed.hours(0..24));
    let bytes = fs::read(&path).unwrap();
    fs::write(&path, &bytes[..bytes.len() / 2]).unwrap();
    let days = bed.days(&[path], 2, false);
    assert!(days[0].frames > 1000 && days[0].frames < 8000, "{}", days[0].frames);
    assert!(days[0].files[0].findings.iter().any(|finding| finding.contains("cannot be read to its end")));

    let mut lines = bed.hours(0..4).to_vec();
    lines.insert(100, "{\"time\":\"2031-03-14T00:16:\n".into());
    lines.swap(300, 310);
    let (broken, nothing) = (bed.file("broken.jsonl", &lines), bed.file("nothing.jsonl", []));
    let days = bed.days(&[broken, nothing], 2, false);
    let said = days[0].files[0].findings.join("; ");
    assert!(said.contains("1 malformed lines") && said.contains("older than one before"), "{said}");
    assert_eq!(days[0].files[1].findings, ["not a single frame in it"]);
}

#[test]
fn each_day_begins_anew_unless_it_is_carried_over() {
    let bed = Bed::new(48.0);
    let file = bed.file("two.jsonl", &bed.lines);
    let apart = bed.days(std::slice::from_ref(&file), 2, false);
    let second = bed.days(&[bed.file("2.jsonl", bed.hours(24..48))], 2, false);
    assert_eq!(without_files(apart[1..].to_vec()), without_files(second), "a day stands alone");
    let carried = bed.days(&[file], 2, true);
    assert_eq!(without_files(carried[..1].to_vec()), without_files(apart[..1].to_vec()));
    let steps = |day: &tautline::review::Day| day.corridors[0].sources.as_ref().unwrap()[0][0].steps;
    assert_eq!(steps(&apart[1]), 0);
    assert!(steps(&carried[1]) > 0);
}
