//! Ten alarms of one corridor at a frame that changes nothing: what it costs beside the assessment.

use std::{hint::black_box, sync::Arc};

use chrono::TimeDelta;
use criterion::{Criterion, criterion_group, criterion_main};
use tautline::{
    alarm::{CorridorBoard, Definition, Kind, Suppression},
    config::Config,
    desk::Desk,
    feed::{Channels, Decoder, Format, Holder, Tally},
};

const CONFIG: &str = include_str!("three-circuits.toml");
const FRAME: &[u8] = include_bytes!("three-circuits.jsonl");
const ALARMS: usize = 10;

fn alarms(criterion: &mut Criterion) {
    let config = Config::parse(CONFIG, "three-circuits.toml").expect("the configuration is right");
    let channels = Arc::new(Channels::new(&config));
    let (mut frames, mut tally) = (Vec::new(), Tally::default());
    let mut decoder = Decoder::new(Format::JsonLines, channels.clone());
    decoder.push(FRAME, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
    let snapshot = holder.take(&frames[0]).expect("the first frame is never late");
    let mut assessment = Desk::new(&config, &channels).assess(&snapshot).remove(0);

    // The kinds that take longest, each with a design that has to be looked at.
    let corridor = &config.grid.corridors[0];
    let pattern = config.alarms[0][0].clone();
    let definition = |kind: Kind| Definition {
        name: kind.word().into(),
        kind,
        setpoint: -1.0,
        suppress_while: Suppression {
            circuits_out: vec![corridor.circuits[0].name.clone()],
            transfer_below_mw: Some(1.0),
        },
        ..pattern.clone()
    };
    let definitions: Vec<_> = Kind::ALL.into_iter().take(ALARMS).map(definition).collect();
    let mut board = CorridorBoard::new(corridor, &definitions);
    let mut transitions = Vec::new();
    criterion.bench_function("alarms/ten of a corridor", |bencher| {
        bencher.iter(|| {
            assessment.time += TimeDelta::seconds(1);
            transitions.clear();
            board.observe(black_box(&assessment), &mut transitions);
        });
    });
}

criterion_group!(benches, alarms);
criterion_main!(benches);
