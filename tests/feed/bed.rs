//! A corridor, and short ways to write and read its frames.

use std::{sync::Arc, time::Duration};

use chrono::{DateTime, TimeDelta, Utc};
use tautline::{
    config::Config,
    feed::{Channels, Decoder, Feed, Format, Frame, Input, InputStatus, Patience, Quality, Reading, Tally},
};

const CONFIG: &str = r#"
[grid]
frequency_hz = 50
[[corridor]]
name = "Skarn-Velm"
[corridor.from]
bus = "Skarn"
nominal_kv = 400
stored_energy_mws = 60000
source = { r_ohm = 1.5, x_ohm = 20.0, spread = 0.3 }
[corridor.to]
bus = "Velm"
nominal_kv = 400
source = { r_ohm = 1.0, x_ohm = 0.0, spread = 0.3 }
[[corridor.station]]
bus = "Mid å"
nominal_kv = 400
[[corridor.circuit]]
name = "SM"
between = ["Skarn", "Mid å"]
r_ohm = 3.0
x_ohm = 80.0
b_us = 900.0
series_capacitors = [ { name = "SM-SC", x_ohm = 26.0, at = 0.5 } ]
[[corridor.circuit]]
name = "MV"
between = ["Mid å", "Velm"]
r_ohm = 3.0
x_ohm = 40.0
b_us = 900.0
[channels]
"Velm.kv" = "RTU7/U_bus"
"#;

/// Long enough for a loaded machine; nothing waits for it to pass.
pub const PATIENTLY: Duration = Duration::from_secs(60);

pub fn channels() -> Arc<Channels> {
    Arc::new(Channels::new(&Config::parse(CONFIG, "bed.toml").unwrap_or_else(|errors| panic!("{errors}"))))
}

pub fn decode(format: Format, bytes: impl AsRef<[u8]>) -> (Vec<Frame>, Tally) {
    let (mut frames, mut tally) = (Vec::new(), Tally::default());
    let mut decoder = Decoder::new(format, channels());
    decoder.push(bytes.as_ref(), &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    assert_eq!(tally.frames, frames.len() as u64);
    (frames, tally)
}

/// The only frame on a line that is used.
pub fn frame(line: &str) -> Frame {
    let (mut frames, tally) = decode(Format::JsonLines, line);
    assert_eq!(frames.len(), 1, "{line}: {:?}", tally.findings());
    frames.remove(0)
}

/// A frame with these values, `"Skarn.kv":408.0` and the like.
pub fn frame_with(values: &str) -> Frame {
    frame(&format!(r#"{{"time":"2031-03-14T05:00:00Z","values":{{{values}}}}}"#))
}

pub fn reading(frame: &Frame, name: &str) -> Option<Reading> {
    let channels = channels();
    let mut found = frame.readings.iter().filter(|(slot, _)| &**channels.name(*slot) == name);
    let reading = found.next().map(|(_, reading)| *reading);
    assert!(found.next().is_none(), "{name} stands twice in a frame");
    reading
}

/// The value of a channel that is good.
pub fn good(frame: &Frame, name: &str) -> Option<f64> {
    reading(frame, name).filter(|reading| reading.quality == Quality::Good).map(|reading| reading.value)
}

pub fn is_invalid(frame: &Frame, name: &str) -> bool {
    reading(frame, name).is_some_and(|reading| reading.quality == Quality::Invalid)
}

pub fn time(second: i64) -> DateTime<Utc> {
    DateTime::from_timestamp(1_931_320_800, 0).unwrap() + TimeDelta::seconds(second)
}

/// A line with one value at a second.
pub fn line(second: i64, channel: &str, value: f64) -> String {
    let time = time(second).to_rfc3339();
    format!("{{\"time\":\"{time}\",\"values\":{{\"{channel}\":{value}}}}}\n")
}

/// Lines of these seconds.
pub fn lines(seconds: impl IntoIterator<Item = i64>) -> String {
    seconds.into_iter().map(|second| line(second, "Skarn.kv", 400.0)).collect()
}

pub fn seconds(frames: &[Frame]) -> Vec<i64> {
    frames.iter().map(|frame| (frame.time - time(0)).num_seconds()).collect()
}

pub async fn open(inputs: &[&str], once: bool) -> Feed {
    let inputs: Vec<Input> = inputs.iter().map(|input| input.parse().unwrap()).collect();
    Feed::open(&inputs, &channels(), Patience { once, ..Patience::default() }).await.unwrap()
}

/// The next frames of a feed that are not of its end.
pub async fn next(feed: &mut Feed, count: usize) -> Vec<Frame> {
    let mut frames = Vec::new();
    while frames.len() < count {
        let batch = tokio::time::timeout(PATIENTLY, feed.next_batch(count - frames.len())).await;
        frames.extend(batch.expect("frames come in time").expect("the feed goes on"));
    }
    frames
}

/// All frames up to the end of a feed.
pub async fn rest(feed: &mut Feed) -> Vec<Frame> {
    let mut frames = Vec::new();
    while let Some(batch) = tokio::time::timeout(PATIENTLY, feed.next_batch(64)).await.expect("frames come in time") {
        assert!(!batch.is_empty() && batch.len() <= 64);
        frames.extend(batch);
    }
    frames
}

pub fn status(feed: &Feed) -> InputStatus {
    feed.monitor().inputs().remove(0)
}

/// Waits until an input's status is as wanted.
pub async fn until(feed: &Feed, wanted: impl Fn(&InputStatus) -> bool) {
    let seen = async {
        while !wanted(&status(feed)) {
            tokio::time::sleep(Duration::from_millis(5)).await;
        }
    };
    tokio::time::timeout(PATIENTLY, seen).await.unwrap_or_else(|_| panic!("{:?}", status(feed)));
}
