//! Lines that are no frames, and bytes that are no lines: counted, never fatal.

use proptest::prelude::*;
use tautline::feed::{Decoder, Format, Frame, Tally};

use crate::bed::{channels, decode, lines, seconds};

#[test]
fn a_broken_line_costs_only_itself() {
    let time = r#""time":"2031-03-14T05:00:00Z""#;
    let broken: &[(&str, &[u8])] = &[
        ("no JSON", b"hello"),
        ("truncated", br#"{"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":40"#),
        ("an array", br#"["2031-03-14T05:00:00Z",{},{}]"#),
        ("a number", b"12"),
        ("null", b"null"),
        ("two objects", format!("{{{time},\"values\":{{}}}}{{{time},\"values\":{{}}}}").leak().as_bytes()),
        ("invalid UTF-8", b"{\"time\":\"2031-03-14T05:00:00Z\",\"values\":{\"Sk\xff.kv\":1}}"),
        ("a lone surrogate", format!(r#"{{{time},"values":{{"\ud800":1}}}}"#).leak().as_bytes()),
        ("a raw control character", format!("{{{time},\"values\":{{\"a\u{1}\":1}}}}").leak().as_bytes()),
        ("no time", br#"{"values":{"Skarn.kv":400}}"#),
        ("no values", format!("{{{time}}}").leak().as_bytes()),
        ("a local time", br#"{"time":"2031-03-14T05:00:00","values":{}}"#),
        ("an impossible time", br#"{"time":"2031-02-30T05:00:00Z","values":{}}"#),
        ("a time in seconds", br#"{"time":1931320800,"values":{}}"#),
        ("a time twice", format!("{{{time},{time},\"values\":{{}}}}").leak().as_bytes()),
        ("values twice", format!("{{{time},\"values\":{{}},\"values\":{{}}}}").leak().as_bytes()),
        ("values in a list", format!("{{{time},\"values\":[1]}}").leak().as_bytes()),
        ("quality in a list", format!("{{{time},\"values\":{{}},\"quality\":[]}}").leak().as_bytes()),
        ("a word", format!("{{{time},\"values\":{{\"Skarn.kv\":nonsense}}}}").leak().as_bytes()),
        ("half a NaN", format!("{{{time},\"values\":{{\"Skarn.kv\":NaNs}}}}").leak().as_bytes()),
        ("deep nesting", "[".repeat(100_000).leak().as_bytes()),
        (
            "deep nesting inside",
            format!("{{{time},\"values\":{{\"Skarn.kv\":{}}}}}", "[".repeat(100_000)).leak().as_bytes(),
        ),
    ];
    for (what, line) in broken {
        let stream = [lines([1]).as_bytes(), line, b"\n", lines([2]).as_bytes()].concat();
        let (frames, tally) = decode(Format::JsonLines, stream);
        assert_eq!(seconds(&frames), [1, 2], "{what}");
        assert_eq!((tally.malformed, tally.reasons[0].0), (1, 2), "{what}");
        let findings = tally.findings().join("");
        assert!(findings.starts_with("1 malformed lines skipped, such as line 2: "), "{what}: {findings}");
        assert!(!findings.contains(char::is_control), "{what}");
    }
}

#[test]
fn empty_lines_carriage_returns_and_byte_order_marks_are_nothing() {
    let stream = format!("\u{feff}{}\r\n\n   \n{}\r", lines([1]).trim(), lines([2]).trim());
    let (frames, tally) = decode(Format::JsonLines, stream);
    assert_eq!(seconds(&frames), [1, 2]);
    assert_eq!(tally.findings(), [""; 0]);
    assert_eq!(decode(Format::JsonLines, "").0, []);
    assert_eq!(decode(Format::Csv, "").0, []);
}

#[test]
fn a_huge_line_is_skipped_to_its_end() {
    for piece in [1 << 10, (8 << 20) - 1, 8 << 20, 10 << 20] {
        let (mut frames, mut tally) = (Vec::new(), Tally::default());
        let mut decoder = Decoder::new(Format::JsonLines, channels());
        let stream = [lines([1]).into_bytes(), vec![b'{'; 10 << 20], b"\n".to_vec(), lines([2]).into_bytes()].concat();
        for piece in stream.chunks(piece) {
            decoder.push(piece, &mut tally, &mut frames);
        }
        assert_eq!(seconds(&frames), [1, 2], "in pieces of {piece}");
        assert_eq!(tally.reasons, [(2, "longer than 8388608 bytes".to_owned())]);
    }
}

#[test]
fn control_characters_of_a_feed_never_reach_a_report() {
    let line = r#"{"time":"2031-03-14T05:00:00Z","values":{"\u001b[2J\u202e\u0007":1,"Skarn.kv":400}}"#;
    let bad_time = r#"{"time":"\u001b]0;owned\u0007","values":{}}"#;
    let bad_type = r#"{"time":{"\u001b[31m":1},"values":{}}"#;
    let (frames, tally) = decode(Format::JsonLines, format!("{line}\n{bad_time}\n{bad_type}\n"));
    assert_eq!((frames.len(), tally.malformed, tally.unknown.count), (1, 2, 1));
    let report = tally.findings().join("\n");
    assert!(report.chars().all(|c| c == '\n' || !c.is_control() && c != '\u{202e}'), "{report:?}");
}

#[test]
fn what_a_tally_keeps_is_bounded() {
    let long = "x".repeat(100_000);
    let stream: String = (0..1000)
        .map(|n| {
            format!(
                "{{\"time\":\"2031-03-14T05:00:00Z\",\"values\":{{\"{n}{long}\":1}}}}\n{{\"time\":\"{n}{long}\"}}\n"
            )
        })
        .take(50)
        .chain((0..5000).map(|n| format!("{{\"time\":\"2031-03-14T05:00:00Z\",\"values\":{{\"{n}\":1}}}}\n")))
        .collect();
    let (_, tally) = decode(Format::JsonLines, stream);
    assert_eq!((tally.unknown.count, tally.malformed), (5050, 50));
    assert!(tally.findings().join("").len() < 4000);
}

#[test]
fn a_csv_without_a_usable_header_gives_nothing_and_says_why() {
    for header in ["Skarn.kv,SM.from.mw", "time,Skarn.kv,time", "\"time,Skarn.kv", "\u{1}"] {
        let (frames, tally) =
            decode(Format::Csv, format!("{header}\n2031-03-14T05:00:00Z,400\n2031-03-14T05:00:01Z,400\n"));
        assert_eq!((frames.len(), tally.malformed), (0, 3), "{header}");
        assert!(tally.reasons[0].1.contains("exactly one column named `time`"), "{:?}", tally.reasons);
    }
}

#[test]
fn a_broken_csv_row_costs_only_itself() {
    for broken in [
        "2031-03-14T05:00:00Z,400",
        "2031-03-14T05:00:00Z,400,1,2",
        ",400,1",
        "yesterday,400,1",
        "2031-03-14T05:00:00Z,\"400,1",
        "2031-03-14T05:00:00Z,400\r2031-03-14T05:00:00Z,400,1",
    ] {
        let stream = format!("time,Skarn.kv,SM.from.mw\n{broken}\n2031-03-14T05:00:02Z,400,1\n");
        let (frames, tally) = decode(Format::Csv, stream);
        assert_eq!((frames.len(), tally.malformed, tally.reasons[0].0), (1, 1, 2), "{broken}: {:?}", tally.reasons);
    }
    let invalid_utf8 = b"time,Skarn.kv\n2031-03-14T05:00:00Z,\xff\n2031-03-14T05:00:00Z,400\n";
    let (frames, tally) = decode(Format::Csv, invalid_utf8);
    assert_eq!((frames.len(), tally.reasons), (1, vec![(2, "not UTF-8".to_owned())]));
}

fn decode_in_pieces(format: Format, bytes: &[u8], sizes: &[usize]) -> (Vec<Frame>, Tally) {
    let (mut frames, mut tally) = (Vec::new(), Tally::default());
    let mut decoder = Decoder::new(format, channels());
    let mut rest = bytes;
    for size in sizes.iter().cycle().take_while(|_| !sizes.is_empty()) {
        let (piece, after) = rest.split_at((*size).min(rest.len()));
        decoder.push(piece, &mut tally, &mut frames);
        rest = after;
        if rest.is_empty() {
            break;
        }
    }
    decoder.push(rest, &mut tally, &mut frames);
    decoder.finish(&mut tally, &mut frames);
    (frames, tally)
}

/// Pieces of frames in any order: far likelier to get deep into the parsers than plain noise.
fn almost_frames() -> impl Strategy<Value = Vec<u8>> {
    let token = prop::sample::select(vec![
        "{",
        "}",
        "[",
        "]",
        ",",
        ":",
        "\"",
        "\\",
        "\n",
        "\r\n",
        "time",
        "\"time\":",
        "\"values\":{",
        "\"quality\":{",
        "\"2031-03-14T05:00:00Z\"",
        "2031-03-14T05:00:00+25:00",
        "\"Skarn.kv\":",
        "\"SM.closed\":",
        "400",
        "-1e999",
        "NaN",
        "-Infinity",
        "null",
        "\"invalid\"",
        "\u{feff}",
        "\u{0}",
        "å",
        ".quality",
        "\"\\ud800\"",
    ]);
    let piece = prop_oneof![
        8 => token.prop_map(|token| token.as_bytes().to_vec()),
        1 => prop::collection::vec(any::<u8>(), 0..6),
        2 => (0..9_i64).prop_map(|second| lines([second]).into_bytes()),
    ];
    prop::collection::vec(piece, 0..60).prop_map(|pieces| pieces.concat())
}

proptest! {
    #[test]
    fn no_bytes_panic_and_no_cut_matters(
        bytes in prop_oneof![almost_frames(), prop::collection::vec(any::<u8>(), 0..400)],
        sizes in prop::collection::vec(1..50_usize, 1..8),
        csv in any::<bool>(),
        header in any::<bool>(),
    ) {
        let format = if csv { Format::Csv } else { Format::JsonLines };
        let bytes = if header { [b"time,Skarn.kv,SM.closed,SM.closed.quality\n", &bytes[..]].concat() } else { bytes };
        let (whole, tally) = decode(format, &bytes);
        let (cut, tally_of_cut) = decode_in_pieces(format, &bytes, &sizes);
        prop_assert_eq!(format!("{whole:?}"), format!("{cut:?}"));
        prop_assert_eq!(tally, tally_of_cut);
    }
}
