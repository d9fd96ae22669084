//! What recording costs: a frame of twenty corridors, one that brings a start, and taking that up. Says also how large the
//! recording of an hour at one frame a second is.

use std::{
    fs,
    hint::black_box,
    path::Path,
    sync::Arc,
    time::{Duration, Instant},
};

use criterion::{Criterion, criterion_group, criterion_main};
use tautline::{
    alarm::Board,
    config::Config,
    desk::Desk,
    drill::{Drill, Invention},
    feed::{Channels, Frame, Holder},
    recording::{Present, Recorder},
};

/// Everything beside a recorder.
struct Station {
    config: Config,
    text: String,
    channels: Arc<Channels>,
    holder: Holder,
    desk: Desk,
    board: Board,
    frames: Vec<Frame>,
}

impl Station {
    fn new() -> Self {
        let invention = Invention { corridors: 20, hours: 2.0, interval_s: 1.0, ..Invention::default() };
        let invented = invention.invent();
        let (config, scenario) = invented.read().unwrap_or_else(|errors| panic!("{errors}"));
        let channels = Arc::new(Channels::new(&config));
        Self {
            holder: Holder::new(&channels, config.feed.max_age()),
            desk: Desk::new(&config, &channels),
            board: Board::new(&config),
            frames: Drill::new(&config, &channels, &scenario).collect(),
            text: invented.config,
            channels,
            config,
        }
    }

    fn recorder(&self, folder: &Path) -> Recorder {
        Recorder::open(folder, &self.config, &self.text, &self.channels).expect("a folder of our own")
    }

    fn take(&mut self, frame: &Frame) {
        if let Some(snapshot) = self.holder.take(frame) {
            for desk in &mut self.desk.corridors {
                desk.follow(&snapshot);
            }
        }
    }

    fn present(&self) -> Present<'_> {
        Present { holder: &self.holder, desk: &self.desk, board: &self.board }
    }
}

fn record(criterion: &mut Criterion) {
    let folder = tempfile::tempdir().expect("a folder for a while");
    let mut station = Station::new();
    let frames = std::mem::take(&mut station.frames);
    let (learned, hour) = frames.split_at(3600);
    for frame in learned {
        station.take(frame);
    }

    let mut recorder = station.recorder(&folder.path().join("hour"));
    for frame in hour {
        let frame = recorder.take(frame, &station.present());
        station.take(&frame);
    }
    let status = recorder.end();
    let file = status.file.expect("it was written");
    let packed = fs::metadata(&file).expect("it is there").len();
    let lines = zstd::decode_all(fs::File::open(&file).expect("it is there")).expect("it is whole");
    let mut lines = lines.split(|byte| *byte == b'\n');
    let [start, other] = [lines.next(), lines.next()].map(Option::unwrap_or_default);
    let start_packed = zstd::encode_all(start, 3).expect("in memory").len();
    let (start, other) = (start.len(), other.len());
    println!("an hour of {} frames: {packed} bytes; {} lost", hour.len(), status.lost);
    println!("a line: {other} bytes; with a start: {start}, {start_packed} packed");

    // Without the thread that writes: what it does not take in time is none of this cost.
    let mut group = criterion.benchmark_group("record");
    let mut recorder = station.recorder(&folder.path().join("frames"));
    let frame = hour.last().expect("an hour of them");
    group.bench_function("a frame", |bencher| {
        bencher.iter(|| recorder.take(black_box(frame), &station.present()));
    });
    group.bench_function("a frame with a start", |bencher| {
        bencher.iter(|| {
            recorder.reconfigure(&station.config, &station.text, &station.channels);
            recorder.take(black_box(frame), &station.present())
        });
    });
    recorder.reconfigure(&station.config, &station.text, &station.channels);
    let started = recorder.take(frame, &station.present());
    group.bench_function("taking a start up", |bencher| {
        bencher.iter_custom(|times| {
            let mut spent = Duration::ZERO;
            for _ in 0..times {
                let begun = Instant::now();
                station.take(black_box(&started));
                spent += begun.elapsed();
            }
            spent
        });
    });
    group.finish();
}

criterion_group!(benches, record);
criterion_main!(benches);
