//! Days that `watch` has recorded stand alone.

use std::sync::Arc;

use tautline::{
    alarm::Board,
    config::Config,
    desk::Desk,
    events::EventKind,
    feed::{Channels, Decoder, Format, Holder, Tally},
    recording::{Present, Recorder},
    review::Beginning,
};

use crate::bed::{Bed, without_files};

/// Records all frames of a bed under a configuration.
fn record(bed: &Bed, configuration: &str) -> Vec<std::path::PathBuf> {
    let config = Config::parse(configuration, "recorded.toml").unwrap();
    let channels = Arc::new(Channels::new(&config));
    let (mut desk, mut board) = (Desk::new(&config, &channels), Board::new(&config));
    let mut holder = Holder::new(&channels, config.feed.max_age());
    let folder = bed.path("recorded");
    let mut recorder = Recorder::open(&folder, &config, configuration, &channels).unwrap();
    let (mut decoder, mut frames) = (Decoder::new(Format::JsonLines, channels), Vec::new());
    for line in &bed.lines {
        decoder.push(line.as_bytes(), &mut Tally::default(), &mut frames);
        let frame = frames.pop().unwrap();
        let frame = recorder.take(&frame, &Present { holder: &holder, desk: &desk, board: &board });
        let snapshot = holder.take(&frame).unwrap();
        snapshot.start().into_iter().for_each(|start| board.begin(start));
        board.observe(&desk.assess(&snapshot));
    }
    assert!(recorder.end().trouble.is_none());
    (14..=16).map(|day| folder.join(format!("2031-03-{day}.jsonl.zst"))).collect()
}

#[test]
fn they_come_out_the_same_alone_and_together() {
    let bed = Bed::new(50.0);
    let files = record(&bed, bed.configuration());
    let together = bed.days(&files, 2, false);
    let alone = files.iter().rev().flat_map(|file| bed.days(std::slice::from_ref(file), 1, false));
    let mut alone: Vec<_> = alone.collect();
    alone.reverse();
    assert_eq!(without_files(alone), without_files(together.clone()));
    assert!(together.iter().all(|day| day.beginning == Beginning::Recorded && day.findings.is_empty()));
    let steps = |day: usize, end: usize| together[day].corridors[0].sources.as_ref().unwrap()[end][0].steps;
    assert!(steps(0, 1) > 0);
    assert_eq!(steps(1, 0), steps(0, 1), "the second day begins with what the first had learned");
    let told: Vec<_> = together[0].events.iter().filter(|event| event.kind == EventKind::Program).collect();
    assert_eq!(told.len(), 1, "the recording program was started: {told:?}");
}

#[test]
fn another_configuration_is_said() {
    let bed = Bed::new(26.0);
    let thin = bed.configuration().replacen("thin_mw = ", "thin_mw = 321 # ", 1);
    assert_ne!(thin, bed.configuration());
    let files = record(&bed, &thin);
    let days = bed.days(&files[..2], 2, false);
    for day in &days {
        let said = day.findings.join("\n");
        assert!(said.contains("with another configuration") && said.contains("321"), "{said}");
    }
}
