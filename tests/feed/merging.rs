//! Frames of several inputs in one order of time.

use std::{fs, time::Duration};

use proptest::prelude::*;
use tautline::feed::{Feed, Format, Frame, Patience, Reader, Recorded};
use tempfile::TempDir;
use tokio::{io::AsyncWriteExt, net::TcpListener};

use crate::bed::{PATIENTLY, channels, good, line, lines, next, open, reading, rest, seconds, status};

fn recorded(texts: &[&str]) -> Recorded {
    let channels = channels();
    let reader =
        |text: &&str| Reader::new("text", std::io::Cursor::new(text.to_string()), Format::JsonLines, &channels);
    Recorded::new(texts.iter().map(reader).collect(), &channels)
}

#[test]
fn files_merge_exactly_by_time() {
    let frames: Vec<Frame> = recorded(&[&lines([1, 4, 6]), &lines([2, 3, 9]), "", &lines([5])]).collect();
    assert_eq!(seconds(&frames), [1, 2, 3, 4, 5, 6, 9]);
}

#[test]
fn frames_of_the_same_time_become_one() {
    let first = line(1, "Skarn.kv", 400.0) + &line(2, "Skarn.kv", 401.0);
    let second = line(1, "SM.from.mw", 7.0) + &line(2, "Skarn.kv", 399.0);
    let frames: Vec<Frame> = recorded(&[&first, &second]).collect();
    assert_eq!(seconds(&frames), [1, 2]);
    assert_eq!((good(&frames[0], "Skarn.kv"), good(&frames[0], "SM.from.mw")), (Some(400.0), Some(7.0)));
    assert_eq!(good(&frames[1], "Skarn.kv"), Some(401.0), "the first input counts");
}

#[test]
fn of_two_readings_the_better_counts() {
    let frames: Vec<Frame> = recorded(&[&line(1, "Skarn.kv", 0.0), &line(1, "Skarn.kv", 399.0)]).collect();
    assert_eq!(good(&frames[0], "Skarn.kv"), Some(399.0));
    assert_eq!(frames[0].readings.len(), 1);
}

#[test]
fn frames_of_one_time_in_one_input_stay_apart() {
    let frames: Vec<Frame> = recorded(&[&lines([1, 1, 2]), &line(1, "SM.from.mw", 7.0)]).collect();
    assert_eq!(seconds(&frames), [1, 1, 2]);
    assert!(reading(&frames[0], "SM.from.mw").is_some() && reading(&frames[1], "SM.from.mw").is_none());
}

#[test]
fn time_that_goes_back_is_counted_and_dropped() {
    let mut merged = recorded(&[&lines([1, 5, 3, 4, 5, 6])]);
    assert_eq!(seconds(&merged.by_ref().collect::<Vec<_>>()), [1, 5, 5, 6]);
    let tally = merged.monitor().inputs().remove(0).tally;
    assert_eq!((tally.frames, tally.old), (6, 2));
    assert_eq!(tally.findings(), ["2 frames dropped, older than one before them"]);
}

proptest! {
    #[test]
    fn both_ways_of_merging_agree(inputs in prop::collection::vec(prop::collection::vec(0..50_i64, 0..40), 1..5)) {
        let texts: Vec<String> = inputs.into_iter().map(lines).collect();
        let texts: Vec<&str> = texts.iter().map(String::as_str).collect();
        let synchronous: Vec<Frame> = recorded(&texts).collect();
        let folder = TempDir::new().unwrap();
        let paths: Vec<String> = texts.iter().enumerate().map(|(n, text)| {
            let path = folder.path().join(n.to_string());
            fs::write(&path, text).unwrap();
            path.to_str().unwrap().to_owned()
        }).collect();
        let paths: Vec<&str> = paths.iter().map(String::as_str).collect();
        let runtime = tokio::runtime::Runtime::new().unwrap();
        let live = runtime.block_on(async { rest(&mut open(&paths, false).await).await });
        prop_assert!(seconds(&live).is_sorted());
        prop_assert_eq!(live, synchronous);
    }
}

/// A server that a feed connects to, and the two ends of the connection.
async fn server() -> (TcpListener, String) {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let input = format!("tcp://{}", listener.local_addr().unwrap());
    (listener, input)
}

#[tokio::test]
async fn a_single_live_input_never_waits() {
    let (listener, input) = server().await;
    let patience = Patience { hold: PATIENTLY * 100, once: true, ..Patience::default() };
    let mut feed = Feed::open(&[input.parse().unwrap()], &channels(), patience).await.unwrap();
    let (mut client, _) = listener.accept().await.unwrap();
    for second in 0..3 {
        client.write_all(lines([second]).as_bytes()).await.unwrap();
        assert_eq!(seconds(&next(&mut feed, 1).await), [second]);
    }
}

#[tokio::test]
async fn live_inputs_wait_for_one_another_but_not_for_long() {
    let ((first_listener, first_input), (second_listener, second_input)) = (server().await, server().await);
    let inputs = [first_input.parse().unwrap(), second_input.parse().unwrap()];
    // Far longer than it takes to send: both frames of a time come together.
    let patience = Patience { hold: Duration::from_secs(2), once: true, ..Patience::default() };
    let mut feed = Feed::open(&inputs, &channels(), patience).await.unwrap();
    let (mut first, _) = first_listener.accept().await.unwrap();
    let (mut second, _) = second_listener.accept().await.unwrap();
    first.write_all(line(1, "Skarn.kv", 400.0).as_bytes()).await.unwrap();
    second.write_all(line(1, "SM.from.mw", 7.0).as_bytes()).await.unwrap();
    let frames = next(&mut feed, 1).await;
    assert_eq!(frames[0].readings.len(), 2);

    // The second stays silent: the first goes on without it, and what it then brings is too late.
    first.write_all(lines([2, 3]).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 2).await), [2, 3]);
    second.write_all(lines([2, 4]).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 1).await), [4]);
    assert_eq!(feed.monitor().inputs()[1].tally.old, 1);
    drop((first, second));
    assert_eq!(rest(&mut feed).await, []);
    assert_eq!(status(&feed).tally.old, 0);
}

#[tokio::test]
async fn one_absurd_time_stamp_does_not_age_all_that_follows() {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let mut feed = open(&[&format!("tcp://{}", listener.local_addr().unwrap())], true).await;
    let (mut client, _) = listener.accept().await.unwrap();
    // Dates of a drill may be far ahead of the clock, and gaps in it long.
    client.write_all(lines([1, 2, 1000, 20_000_000, 1001, 4000]).as_bytes()).await.unwrap();
    drop(client);
    assert_eq!(seconds(&rest(&mut feed).await), [1, 2, 1000, 1001, 4000]);
    let tally = status(&feed).tally;
    assert_eq!((tally.ahead, tally.old), (1, 0));
}
