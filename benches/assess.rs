//! One corridor of three circuits, a series capacitor and a fault, from a parsed frame to its assessment.

use std::{hint::black_box, sync::Arc};

use chrono::TimeDelta;
use criterion::{Criterion, criterion_group, criterion_main};
use tautline::{
    config::Config,
    desk::{Alternative, Desk},
    feed::{Channels, Decoder, Format, Holder, Tally},
};

const CONFIG: &str = include_str!("three-circuits.toml");
const FRAME: &[u8] = include_bytes!("three-circuits.jsonl");

fn assess(criterion: &mut Criterion) {
    let config = Config::parse(CONFIG, "three-circuits.toml").expect("the configuration is right");
    let channels = Arc::new(Channels::new(&config));
    let mut frames = Vec::new();
    let mut tally = Tally::default();
    let mut decoder = Decoder::new(Format::JsonLines, channels.clone());
    decoder.push(FRAME, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
    let snapshot = holder.take(&frames[0]).expect("the first frame is never late");
    let mut desk = Desk::new(&config, &channels);
    assert_eq!(desk.assess(&snapshot)[0].outages.len(), 5);
    criterion.bench_function("assess/three circuits", |bencher| {
        bencher.iter(|| desk.assess(black_box(&snapshot)));
    });
    let with = ["open SV1".to_owned(), "transfer Skarn-Velm -100".to_owned()];
    let alternatives = Alternative::parse(&with, &[], &config.grid).expect("right changes");
    let mut alternative = alternatives.into_iter().next().flatten().expect("the corridor is changed");
    criterion.bench_function("assess/three circuits, with a change", |bencher| {
        bencher.iter(|| desk.corridors[0].assess_with(black_box(&snapshot), &mut alternative));
    });
    let record = &desk.assess(&snapshot)[0];
    let mut bytes = Vec::new();
    criterion.bench_function("record/three circuits", |bencher| {
        bencher.iter(|| {
            bytes.clear();
            serde_json::to_writer(&mut bytes, black_box(record)).expect("a vector takes everything");
        });
    });
}

criterion_group!(benches, assess);
criterion_main!(benches);
