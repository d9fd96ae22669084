//! A growing file, rotated and truncated under the reader.

use std::{
    fs::{self, OpenOptions},
    io::Write,
    path::{Path, PathBuf},
};

use tautline::feed::{Feed, InputState};
use tempfile::TempDir;

use crate::bed::{lines, next, open, rest, seconds, status, until};

async fn follow(name: &str) -> (Feed, PathBuf, TempDir) {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join(name);
    (open(&[&format!("follow:{}", path.display())], false).await, path, folder)
}

fn append(path: &Path, text: &str) {
    OpenOptions::new().create(true).append(true).open(path).unwrap().write_all(text.as_bytes()).unwrap();
}

#[tokio::test]
async fn a_file_is_waited_for_and_read_as_it_grows() {
    let (mut feed, path, _folder) = follow("day.jsonl").await;
    until(&feed, |status| status.tally.trouble.is_some()).await;
    assert_eq!(status(&feed).state, InputState::Waiting);
    append(&path, &lines([1]));
    assert_eq!(seconds(&next(&mut feed, 1).await), [1]);
    // A line may come in pieces.
    let (piece, remains) = (&lines([2, 3])[..30], &lines([2, 3])[30..]);
    append(&path, piece);
    append(&path, remains);
    assert_eq!(seconds(&next(&mut feed, 2).await), [2, 3]);
    assert_eq!(status(&feed).tally.findings(), [""; 0]);
}

#[tokio::test]
async fn a_rotated_file_is_read_to_its_end_and_then_the_new_one() {
    let (mut feed, path, folder) = follow("day.jsonl").await;
    append(&path, &lines([1, 2]));
    assert_eq!(seconds(&next(&mut feed, 2).await), [1, 2]);
    let old = folder.path().join("day.jsonl.1");
    fs::rename(&path, &old).unwrap();
    // The writer has not noticed yet.
    append(&old, &lines([3]));
    assert_eq!(seconds(&next(&mut feed, 1).await), [3]);
    append(&path, "");
    append(&old, lines([4]).trim_end());
    append(&path, &lines([5]));
    assert_eq!(seconds(&next(&mut feed, 2).await), [4, 5]);
    fs::remove_file(&path).unwrap();
    append(&path, &lines([6]));
    assert_eq!(seconds(&next(&mut feed, 1).await), [6]);
    assert_eq!(status(&feed).tally.findings(), [""; 0]);
}

#[tokio::test]
async fn a_truncated_file_is_read_from_its_start() {
    let (mut feed, path, _folder) = follow("day.jsonl").await;
    append(&path, &(lines([1, 2]) + "{\"half a line"));
    assert_eq!(seconds(&next(&mut feed, 2).await), [1, 2]);
    fs::write(&path, lines([3])).unwrap();
    assert_eq!(seconds(&next(&mut feed, 1).await), [3]);
    append(&path, &lines([4]));
    assert_eq!(seconds(&next(&mut feed, 1).await), [4]);
}

#[tokio::test]
async fn a_rotated_csv_has_a_header_of_its_own() {
    let (mut feed, path, folder) = follow("day.csv").await;
    append(&path, "time,Skarn.kv\n2031-03-15T10:00:00Z,400\n");
    assert_eq!(next(&mut feed, 1).await[0].readings.len(), 1);
    fs::rename(&path, folder.path().join("old")).unwrap();
    append(&path, "Skarn.deg,Skarn.kv,time\n1,400,2031-03-15T10:00:01Z\n");
    assert_eq!(next(&mut feed, 1).await[0].readings.len(), 2);
}

#[tokio::test]
async fn once_reads_what_is_there() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("day.jsonl");
    append(&path, lines([1, 2]).trim_end());
    let mut feed = open(&[&format!("follow:{}", path.display())], true).await;
    assert_eq!(seconds(&rest(&mut feed).await), [1, 2]);
}
