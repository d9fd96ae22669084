//! Reviewed days that are kept, shared out over jobs, and put together.

use std::{fs, path::PathBuf, time::SystemTime};

use assert_cmd::Command;

use crate::bed::{Bed, name};

fn review(bed: &Bed, more: &[&str]) -> (bool, String, String) {
    let output = Command::cargo_bin("tautline")
        .unwrap()
        .current_dir(bed.folder.path())
        .arg("review")
        .args(more)
        .output()
        .unwrap();
    let text = |bytes| String::from_utf8(bytes).unwrap();
    (output.status.success(), text(output.stdout), text(output.stderr))
}

fn days(bed: &Bed) -> Vec<String> {
    let day = |day: usize| name(&bed.file(&format!("{day}.jsonl.zst"), bed.hours(24 * day..24 * day + 24)));
    (0..3).map(day).collect()
}

fn parts(bed: &Bed) -> Vec<(PathBuf, SystemTime)> {
    let entries = fs::read_dir(bed.path("parts")).unwrap().map(|entry| entry.unwrap().path());
    let entries = entries.filter(|path| path.extension().is_some_and(|ending| ending == "zst"));
    let mut parts: Vec<_> =
        entries.map(|path| (path.clone(), fs::metadata(path).unwrap().modified().unwrap())).collect();
    parts.sort();
    parts
}

#[test]
fn jobs_with_nothing_but_files_in_common_do_what_one_run_does() {
    let bed = Bed::new(60.0);
    let files = days(&bed);
    let files: Vec<&str> = files.iter().map(String::as_str).collect();
    let with = |more: &[&'static str]| [&["--config", "config.toml"], &files[..], more].concat();
    let (_, whole, _) = review(&bed, &with(&["--json", "-"]));
    for share in ["1/2", "2/2"] {
        let (done, _, said) = review(&bed, &with(&["--parts", "parts", "--share", share]));
        assert!(done, "{said}");
        let (_, early, said) = review(&bed, &["--merge", "parts"]);
        assert_eq!(said.contains("job 2 of 2 is not done"), share == "1/2", "{said}");
        assert_eq!(early.contains("job 2 of 2 is not done"), share == "1/2", "{early}");
    }
    assert_eq!(parts(&bed).len(), 3);
    let (_, merged, said) = review(&bed, &["--merge", "parts", "--json", "-"]);
    assert!(said.is_empty(), "{said}");
    assert_eq!(merged, whole);
}

#[test]
fn it_goes_on_where_it_was_stopped() {
    let bed = Bed::new(60.0);
    let files = days(&bed);
    let files: Vec<&str> = files.iter().map(String::as_str).collect();
    let run = || review(&bed, &[&["--config", "config.toml", "--parts", "parts", "--json", "-"], &files[..]].concat());
    let (_, whole, _) = run();
    let first = parts(&bed);
    fs::remove_file(&first[1].0).unwrap();
    fs::write(&first[2].0, "half a p").unwrap();
    let (_, again, _) = run();
    assert_eq!(again, whole);
    let second = parts(&bed);
    assert_eq!(second[0], first[0], "what was done is not done again");
    assert!(second[1].1 > first[1].1 && second[2].1 > first[2].1);
    // Another file under the same name is another day.
    bed.file("0.jsonl.zst", bed.hours(0..5));
    let (_, other, _) = run();
    assert_ne!(other, whole);
}

#[test]
fn parts_that_do_not_go_together_are_refused() {
    let bed = Bed::new(30.0);
    let file = name(&bed.file("0.jsonl", bed.hours(0..24)));
    let next = name(&bed.file("1.jsonl", bed.hours(24..30)));
    let half = name(&bed.file("half.jsonl", bed.hours(0..3)));
    let base = ["--config", "config.toml"];
    review(&bed, &[&base[..], &["--parts", "a", &file]].concat());
    review(&bed, &[&base[..], &["--parts", "b", "--sources", "configured", &next]].concat());
    review(&bed, &[&base[..], &["--parts", "c", &half]].concat());
    let said = |more: &[&str]| {
        let (done, _, said) = review(&bed, more);
        assert!(!done);
        said
    };
    assert!(said(&["--merge", "a", "b"]).contains("another --sources"));
    assert!(said(&["--merge", "a", "c"]).contains("2031-03-14 is in"));
    fs::create_dir(bed.path("d")).unwrap();
    assert!(said(&["--merge", "d"]).contains("no reviewed day in there"));
    assert!(
        said(&["--merge", "0.jsonl"]).contains("not a reviewed day")
            || said(&["--merge", "0.jsonl"]).contains("0.jsonl")
    );
    let (done, ..) = review(&bed, &["--merge", "a", "a"]);
    assert!(done, "the same part twice is one part");
}

/// Files that share days: cut at noon, with an overlap to be told of.
fn cut_at_noon(bed: &Bed) -> [String; 3] {
    [0..30, 29..54, 54..60].map(|hours| name(&bed.file(&format!("from-{}.jsonl", hours.start), bed.hours(hours))))
}

#[test]
fn what_cannot_be_done_is_refused_before_the_work() {
    let bed = Bed::new(3.0);
    let file = name(&bed.file("0.jsonl", bed.hours(0..3)));
    bed.file("words.txt", [&"no frame at all\n".to_owned()]);
    fs::write(bed.path("old.json"), "old").unwrap();
    let run = |more: &[&str]| review(&bed, &[&["--config", "config.toml", "--parts", "parts"], more].concat());
    for (more, what) in [
        (&["--json", "-", "--csv", "-"][..], "only one of"),
        (&["--json", "old.json", "--html", "not/there.html"], "cannot write not/there.html"),
        (&["--csv", "."], "cannot write ."),
        (&["--with", "shut 1-A"], "begins with no change"),
    ] {
        let (done, _, said) = run(&[&[&*file], more].concat());
        assert!(!done && said.contains(what), "{said}");
        assert!(!bed.path("parts").exists(), "{what}");
    }
    assert_eq!(fs::read_to_string(bed.path("old.json")).unwrap(), "old");
    let (done, _, said) = run(&["words.txt"]);
    assert!(!done && said.contains("words.txt: not a single frame; 1 malformed lines skipped"), "{said}");
    let (done, _, said) = run(&["."]);
    assert!(!done && said.contains("name the files in it"), "{said}");
    // One of more jobs than there are days.
    let (done, text, said) = run(&[&file, "--share", "2/3"]);
    assert!(done && text.is_empty() && said.contains("none falls to share 2"), "{said}");
    assert!(run(&[&file, "--share", "1/3"]).0);
}

#[test]
fn no_day_is_left_out_whatever_was_kept() {
    let bed = Bed::new(60.0);
    let files = cut_at_noon(&bed);
    let files = files.each_ref().map(String::as_str);
    let run = |more: &[&str]| {
        let (done, json, said) =
            review(&bed, &[&["--config", "config.toml", "--parts", "parts", "--json", "-"], more, &files].concat());
        assert!(done, "{said}");
        json
    };
    let whole = run(&[]);
    assert!(whole.contains("overlaps with"));
    for gone in [0, 1, 2] {
        fs::remove_file(&parts(&bed)[gone].0).unwrap();
        assert_eq!(run(&[]), whole, "without day {gone}");
    }
    // The first day is kept under other terms, as a run that was stopped leaves it.
    let others = [&["--config", "config.toml", "--parts", "parts", "--sources", "configured"], &files[..1]].concat();
    assert!(review(&bed, &others).0);
    assert_eq!(run(&[]), whole);
    assert_eq!(run(&["--threads", "1"]), whole);
}

#[test]
fn carried_over_days_go_on_with_the_same_words() {
    let bed = Bed::new(60.0);
    let files = cut_at_noon(&bed);
    let files = files.each_ref().map(String::as_str);
    let run = || {
        review(&bed, &[&["--config", "config.toml", "--carry", "--parts", "parts", "--json", "-"], &files[..]].concat())
            .1
    };
    let whole = run();
    assert!(whole.contains("overlaps with"));
    fs::remove_file(&parts(&bed)[1].0).unwrap();
    assert_eq!(run(), whole);
}

/// A table that was made with another change is made anew, also where the day itself is kept.
#[test]
fn a_table_is_that_of_the_review() {
    let bed = Bed::new(3.0);
    let file = name(&bed.file("0.jsonl", bed.hours(0..3)));
    let run = |parts: &str, more: &[&str]| {
        let base = ["--config", "config.toml", "--parquet", "tables", "--parts", parts, &file];
        let (done, _, said) = review(&bed, &[&base[..], more].concat());
        assert!(done, "{said}");
        fs::read(bed.path("tables/2031-03-14.parquet")).unwrap()
    };
    let plain = run("plain", &[]);
    let changed = run("changed", &["--with", "open 1-A"]);
    assert_ne!(changed, plain);
    assert_eq!(run("plain", &[]), plain);
}
