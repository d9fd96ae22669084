//! What a line says.

use chrono::{DateTime, Utc};
use tautline::feed::{Format, Quality};

use crate::bed::{decode, frame, frame_with, good, is_invalid, reading};

#[test]
fn a_line_gives_its_time_and_values() {
    let frame = frame(
        r#"{"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":408.0,"SM.from.mw":712.4},"quality":{"SM.to.mw":"invalid"}}"#,
    );
    assert_eq!(frame.time, "2031-03-14T05:00:00Z".parse::<DateTime<Utc>>().unwrap());
    assert_eq!(good(&frame, "Skarn.kv"), Some(408.0));
    assert_eq!(good(&frame, "SM.from.mw"), Some(712.4));
    assert!(is_invalid(&frame, "SM.to.mw"), "what is held of it ends");
    assert_eq!(frame.readings.len(), 3);
}

#[test]
fn any_offset_is_the_same_instant() {
    let at = |time: &str| frame(&format!(r#"{{"time":"{time}","values":{{}}}}"#)).time;
    for same in ["2031-03-14T07:30:00.25+02:30", "2031-03-13T23:00:00.250-06:00", "2031-03-14t05:00:00.25z"] {
        assert_eq!(at(same), at("2031-03-14T05:00:00.25Z"), "{same}");
    }
}

#[test]
fn quality_applies_wherever_it_stands() {
    let frame = frame(
        r#"{"quality":{"Skarn.kv":"questionable","SM.from.mw":"broken","SM.to.mw":"questionable","Skarn.deg":"good",
            "nowhere.kv":"invalid"}, "values":{"Skarn.kv":408.0,"SM.from.mw":1,"Skarn.deg":2},
            "time":"2031-03-14T05:00:00Z"}"#
            .replace('\n', "")
            .as_str(),
    );
    assert_eq!(reading(&frame, "Skarn.kv").unwrap().quality, Quality::Questionable);
    assert_eq!(good(&frame, "Skarn.deg"), Some(2.0));
    assert!(is_invalid(&frame, "SM.from.mw"), "a word nobody knows objects to something");
    assert_eq!(reading(&frame, "SM.to.mw"), None, "no value, nothing to question");
    let without = r#"{"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":400},"quality":null}"#;
    assert_eq!(good(&crate::bed::frame(without), "Skarn.kv"), Some(400.0));
}

#[test]
fn names_may_be_mapped_and_escaped() {
    let frame = frame_with(r#""RTU7/U_bus":401.5,"Velm.kv":1.0,"Mid \u00e5.kv":399.0,"Mid å.deg":-3.5"#);
    assert_eq!(good(&frame, "Velm.kv"), Some(401.5), "only by the name it has in the feed");
    assert_eq!(good(&frame, "Mid å.kv"), Some(399.0));
    assert_eq!(good(&frame, "Mid å.deg"), Some(-3.5));
}

#[test]
fn numbers_are_read_exactly() {
    for text in ["401.48400000000004", "0.1e3", "4E2", "223.41573547370578", "9007199254740993e-13"] {
        assert_eq!(good(&frame_with(&format!(r#""Skarn.kv":{text}"#)), "Skarn.kv"), text.parse().ok(), "{text}");
    }
}

#[test]
fn absurd_values_are_invalid() {
    // U²/X is 2000 MW for SM and 4000 MW for MV, and 8000 MW for the source behind Skarn.
    let cases: &[(&str, &[f64], &[f64])] = &[
        ("Skarn.kv", &[20.1, 400.0, 1199.0], &[0.0, 20.0, -400.0, 1200.0, 1e308]),
        ("Skarn.deg", &[-3600.0, 0.0, 3600.0], &[3600.1, -1e9]),
        ("SM.from.mw", &[0.0, -20_000.0, 20_000.0], &[20_001.0, -20_001.0]),
        ("SM.to.mvar", &[-20_000.0], &[20_001.0]),
        ("MV.to.mw", &[39_000.0], &[41_000.0]),
        ("Mid å.mw", &[0.0, 60_000.0, -60_000.0], &[60_001.0]),
        ("Skarn.mvar", &[100_000.0], &[100_001.0]),
        ("Velm.mw", &[1e9], &[]),
        ("Skarn.stored_energy_mws", &[2.0, 60_000.0], &[1.99, 1e-9, 0.0, -1.0]),
        ("SM.closed", &[0.0, 1.0], &[2.0, 0.5, -1.0]),
        ("SM-SC.inserted", &[0.0, 1.0], &[1.01]),
    ];
    for (channel, possible, absurd) in cases {
        for value in *possible {
            assert_eq!(good(&frame_with(&format!(r#""{channel}":{value}"#)), channel), Some(*value), "{channel}");
        }
        for value in *absurd {
            let line = format!(r#"{{"time":"2031-03-14T05:00:00Z","values":{{"{channel}":{value},"MV.from.mw":1}}}}"#);
            let (frames, tally) = decode(Format::JsonLines, line);
            assert!(is_invalid(&frames[0], channel), "{channel} {value}");
            assert_eq!(good(&frames[0], "MV.from.mw"), Some(1.0), "the rest is used");
            assert_eq!((tally.invalid.count, tally.invalid.names.len()), (1, 1));
        }
    }
}

#[test]
fn what_is_no_number_is_invalid() {
    let values =
        ["NaN", "Infinity", "-Infinity", "null", "true", "\"400\"", "\"NaN\"", "1e999", "-1e999", "{}", "[400]"];
    for value in values {
        let line = format!(r#"{{"time":"2031-03-14T05:00:00Z","values":{{"Skarn.kv":{value},"SM.from.mw":-1.5}}}}"#);
        let (frames, tally) = decode(Format::JsonLines, &line);
        assert_eq!(frames.len(), 1, "{value}: {:?}", tally.findings());
        assert!(is_invalid(&frames[0], "Skarn.kv"), "{value}");
        assert_eq!(good(&frames[0], "SM.from.mw"), Some(-1.5), "{value}");
        assert_eq!(tally.invalid.count, 1, "{value}");
    }
}

#[test]
fn words_that_are_no_numbers_stay_text_inside_strings() {
    let line = r#"{"note":"a \" NaN -Infinity","time":"2031-03-14T05:00:00Z","values":{"NaN":1,"Skarn.kv":NaN}}"#;
    let (frames, tally) = decode(Format::JsonLines, line);
    assert!(is_invalid(&frames[0], "Skarn.kv"));
    assert_eq!(tally.unknown.names.iter().map(|name| &**name).collect::<Vec<_>>(), ["NaN"]);
}

#[test]
fn a_channel_given_twice_is_invalid() {
    let line = r#"{"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":400,"SM.from.mw":1,"Skarn.kv":400}}"#;
    let (frames, tally) = decode(Format::JsonLines, line);
    assert!(is_invalid(&frames[0], "Skarn.kv"));
    assert_eq!(good(&frames[0], "SM.from.mw"), Some(1.0));
    assert_eq!(frames[0].readings.len(), 2);
    assert_eq!(tally.invalid.count, 1);
}

#[test]
fn what_is_unknown_is_counted_and_ignored() {
    let line = r#"{"id":[1,{"a":2}],"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":400,"x.kv":1,"y.kv":"?"}}"#;
    let (frames, tally) = decode(Format::JsonLines, format!("{line}\n{line}\n"));
    assert_eq!(frames[1].readings.len(), 1);
    assert_eq!(tally.unknown.count, 4);
    assert_eq!(tally.findings(), ["4 values of unknown channels ignored, such as x.kv; y.kv"]);
}

#[test]
fn csv_says_the_same() {
    let csv = "time,RTU7/U_bus,\"SM.from.mw\",SM.from.mw.quality,Skarn.kv,x.kv,x.kv.quality\r\n\
               2031-03-14T05:00:00Z, 401.5 ,712.4,questionable,,1,\r\n\
               2031-03-14T06:00:01+01:00,,nan,good,0,,\n\
               \n\
               2031-03-14T05:00:02Z,,,invalid,\"399\",,";
    let (frames, tally) = decode(Format::Csv, csv);
    let jsonl = r#"{"time":"2031-03-14T05:00:00Z","values":{"RTU7/U_bus":401.5,"SM.from.mw":712.4},"quality":{"SM.from.mw":"questionable"}}"#;
    assert_eq!(frames[0], frame(jsonl));
    assert!(is_invalid(&frames[1], "SM.from.mw") && is_invalid(&frames[1], "Skarn.kv"));
    assert_eq!((frames[1].time - frames[0].time).num_seconds(), 1);
    assert!(is_invalid(&frames[2], "SM.from.mw"));
    assert_eq!(good(&frames[2], "Skarn.kv"), Some(399.0));
    assert_eq!((tally.malformed, tally.invalid.count, tally.unknown.count), (0, 2, 1));
}

#[test]
fn a_csv_column_given_twice_is_invalid() {
    let (frames, _) =
        decode(Format::Csv, "Skarn.kv,time,Skarn.kv\n400,2031-03-14T05:00:00Z,400\n,2031-03-14T05:00:01Z,400");
    assert!(is_invalid(&frames[0], "Skarn.kv"));
    assert_eq!(good(&frames[1], "Skarn.kv"), Some(400.0), "given once in this row");
}

#[test]
fn a_time_that_rfc_3339_cannot_write_is_no_time() {
    for time in ["9999-12-31T23:59:59-14:00", "0000-01-01T00:00:00+14:00", "10000-01-01T00:00:00Z"] {
        let (frames, tally) = decode(Format::JsonLines, format!(r#"{{"time":"{time}","values":{{}}}}"#));
        assert_eq!((frames.len(), tally.malformed), (0, 1), "{time}");
    }
    assert_eq!(frame(r#"{"time":"0001-01-01T00:00:00Z","values":{}}"#).readings, []);
}
