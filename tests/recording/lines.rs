//! A frame as a line, and back.

use std::sync::Arc;

use chrono::{TimeDelta, Utc};
use proptest::prelude::*;
use tautline::feed::{Channels, Decoder, Format, Frame, FrameText, Quality, Reading, Tally};

use super::bed::{at, parse};

/// Names that need care, and one that looks like another's.
const CONFIG: &str = r#"
[grid]
frequency_hz = 50
[[corridor]]
name = "A"
from = { bus = "Skarn", nominal_kv = 400, source = { x_ohm = 20 } }
to = { bus = "Velm \"süd\" \\", nominal_kv = 400, source = { x_ohm = 10 } }
circuit = [{ name = "SV1", r_ohm = 3, x_ohm = 60, b_us = 400 }]
[channels]
"Skarn.kv" = "RTU7/U, \"kV\""
"#;

fn read(line: &[u8], channels: &Channels) -> (Vec<Frame>, Tally) {
    let mut decoder = Decoder::new(Format::JsonLines, Arc::new(channels.clone()));
    let (mut tally, mut frames) = (Tally::default(), Vec::new());
    decoder.push(line, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    (frames, tally)
}

fn value(channels: &Channels, slot: usize) -> BoxedStrategy<f64> {
    let is_status = channels.is_status(slot);
    let channels = channels.clone();
    let any = prop_oneof![any::<f64>(), -1e4..1e4_f64, Just(-0.0), Just(5e-324), Just(0.1 + 0.2), Just(f64::NAN)];
    let status = prop_oneof![Just(0.0), Just(1.0)];
    let value = if is_status { status.boxed() } else { any.boxed() };
    value.prop_map(move |value| if channels.is_plausible(slot, value) { value } else { f64::NAN }).boxed()
}

fn frame(channels: &Channels) -> impl Strategy<Value = Frame> + use<> {
    let quality = prop_oneof![Just(Quality::Good), Just(Quality::Questionable), Just(Quality::Invalid)];
    let readings: Vec<_> =
        (0..channels.len()).map(|slot| (Just(slot), value(channels, slot), quality.clone(), any::<bool>())).collect();
    (readings, any::<u32>(), 0..2_000_000_000_u32).prop_map(|(readings, seconds, nanos)| Frame {
        time: chrono::DateTime::<Utc>::from_timestamp(seconds.into(), nanos % 1_000_000_000).unwrap(),
        readings: readings
            .into_iter()
            .filter(|(.., there)| *there)
            .map(|(slot, value, quality, _)| {
                let quality = if value.is_nan() { Quality::Invalid } else { quality };
                (slot, Reading { value, quality })
            })
            .collect(),
        aside: None,
    })
}

proptest! {
    #[test]
    fn what_is_written_is_read(frame in frame(&Channels::new(&parse(CONFIG)))) {
        let config = parse(CONFIG);
        let channels = Channels::new(&config);
        let mut line = Vec::new();
        FrameText::new(&config, &channels).write(&frame, &mut line).unwrap();
        let (read, tally) = read(&line, &channels);
        prop_assert_eq!(read.len(), 1);
        prop_assert_eq!(tally.unknown.count + tally.malformed, 0);
        prop_assert_eq!(read[0].time, frame.time);
        let bits = |frame: &Frame| -> Vec<_> {
            frame.readings.iter().map(|(slot, r)| (*slot, r.quality, r.value.is_nan() || r.value.to_bits() != 0)).collect()
        };
        prop_assert_eq!(bits(&read[0]), bits(&frame));
        for ((_, read), (_, written)) in read[0].readings.iter().zip(&frame.readings) {
            prop_assert!(read.value.to_bits() == written.value.to_bits() || read.value.is_nan() && written.value.is_nan());
        }
    }
}

#[test]
fn a_line_is_as_the_format_says() {
    let config = parse(CONFIG);
    let channels = Channels::new(&config);
    let slot = |name: &str| channels.in_feed(name).unwrap();
    let good = |value| Reading { value, quality: Quality::Good };
    let questionable = Reading { value: 712.4, quality: Quality::Questionable };
    let invalid = Reading { value: f64::NAN, quality: Quality::Invalid };
    let readings = vec![
        (slot("RTU7/U, \"kV\""), good(408.0)),
        (slot("SV1.from.mw"), questionable),
        (slot("SV1.to.mw"), invalid),
        (slot("SV1.closed"), good(1.0)),
    ];
    let frame = Frame { time: at("2031-03-14T05:00:00Z") + TimeDelta::milliseconds(20), readings, aside: None };
    let mut line = Vec::new();
    FrameText::new(&config, &channels).write(&frame, &mut line).unwrap();
    let expected = concat!(
        r#"{"time":"2031-03-14T05:00:00.020Z","values":{"RTU7/U, \"kV\"":408,"SV1.from.mw":712.4,"SV1.to.mw":null,"#,
        r#""SV1.closed":1},"quality":{"SV1.from.mw":"questionable","SV1.to.mw":"invalid"}}"#,
        "\n"
    );
    assert_eq!(String::from_utf8(line).unwrap(), expected);
}

/// A channel that another configuration forgot must not come back under a name that now belongs to another.
#[test]
fn forgotten_channels_are_not_written() {
    let before = parse(CONFIG);
    let text = CONFIG.replace("Skarn.kv", "Other.kv").replace("bus = \"Skarn\"", "bus = \"Other\"");
    let after = parse(&text.replace("RTU7/U, \\\"kV\\\"", "Skarn.kv"));
    let old = Channels::new(&before);
    let channels = old.extended(&after);
    let [forgotten, new] = [old.in_feed("RTU7/U, \"kV\"").unwrap(), channels.in_feed("Skarn.kv").unwrap()];
    assert_ne!(forgotten, new);
    let reading = |value| Reading { value, quality: Quality::Good };
    let readings = vec![(forgotten, reading(401.0)), (new, reading(402.0))];
    let mut line = Vec::new();
    let frame = Frame { time: at("2031-03-14T05:00:00Z"), readings, aside: None };
    FrameText::new(&after, &channels).write(&frame, &mut line).unwrap();
    assert_eq!(read(&line, &channels).0[0].readings, [(new, reading(402.0))]);
}
