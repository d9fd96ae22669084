//! From a line to a frame: 17 values, as one corridor of three circuits sends them.

use std::{hint::black_box, path::Path, sync::Arc};

use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use tautline::{
    config::Config,
    feed::{Channels, Decoder, Format, Tally},
};

const VALUES: [(&str, f64); 17] = [
    ("Orrin.kv", 424.492),
    ("Tesk.kv", 419.187),
    ("OT1.from.mw", 164.404),
    ("OT1.from.mvar", -70.865),
    ("OT1.to.mw", -162.692),
    ("OT1.to.mvar", -81.054),
    ("OT2.from.mw", 162.472),
    ("OT2.from.mvar", -69.147),
    ("OT2.to.mw", -164.261),
    ("OT2.to.mvar", -81.572),
    ("OT3.from.mw", 216.312),
    ("OT3.from.mvar", -74.533),
    ("OT3.to.mw", -214.91),
    ("OT3.to.mvar", -83.701),
    ("OT1.closed", 1.0),
    ("OT2.closed", 1.0),
    ("OT3-SC.inserted", 1.0),
];
const LINES: u64 = 100;

fn parse(criterion: &mut Criterion) {
    let config =
        Config::load(Path::new("tests/feeds/orrin-tesk/config.toml")).unwrap_or_else(|errors| panic!("{errors}"));
    let channels = Arc::new(Channels::new(&config));
    let time = "2031-03-14T05:00:00.000Z";
    let values: Vec<String> = VALUES.iter().map(|(name, value)| format!("\"{name}\":{value}")).collect();
    let line = format!("{{\"time\":\"{time}\",\"values\":{{{}}}}}\n", values.join(","));
    let cells: Vec<String> = VALUES.iter().map(|(_, value)| value.to_string()).collect();
    let row = format!("{time},{}\n", cells.join(","));
    let header = format!("time,{}\n", VALUES.map(|(name, _)| name).join(","));

    let mut group = criterion.benchmark_group("parse");
    for (name, format, header, line) in
        [("JSON Lines", Format::JsonLines, "", line), ("CSV", Format::Csv, &header, row)]
    {
        let lines = line.repeat(usize::try_from(LINES).expect("small"));
        let mut decoder = Decoder::new(format, channels.clone());
        let (mut tally, mut frames) = (Tally::default(), Vec::new());
        decoder.push(header.as_bytes(), &mut tally, &mut frames);
        group.throughput(Throughput::ElementsAndBytes { elements: LINES, bytes: lines.len() as u64 });
        group.bench_function(name, |bencher| {
            bencher.iter(|| {
                frames.clear();
                decoder.push(black_box(lines.as_bytes()), &mut tally, &mut frames);
                assert_eq!(frames.len() as u64, LINES);
            });
        });
    }
    group.finish();
}

criterion_group!(benches, parse);
criterion_main!(benches);
