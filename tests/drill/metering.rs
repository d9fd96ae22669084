//! What meters make of the truth.

use tautline::drill::{Says, What};

use super::{Played, play};

fn series(frames: &[Played], name: &str) -> Vec<f64> {
    frames.iter().map(|frame| frame.get(name)).collect()
}

fn scenario(head: &str, more: &str) -> String {
    format!("hours = 1\ninterval_s = 1\n{head}[[corridor]]\nname = \"Hask-Prell\"\ntransfer_mw = 700\n{more}")
}

fn spread(values: &[f64]) -> f64 {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    (values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / n).sqrt()
}

#[test]
fn noise_has_the_standard_deviation_it_should() {
    let (frames, _) = play(&scenario("[metering]\nnoise = { kv = 0.4, mw = 1.5 }\n", ""));
    assert!((spread(&series(&frames, "Hask.kv")) / 0.4 - 1.0).abs() < 0.05);
    assert!((spread(&series(&frames, "HP1.to.mw")) / 1.5 - 1.0).abs() < 0.05);
    assert!(spread(&series(&frames, "HP1.to.mvar")) < 1e-9);
}

#[test]
fn inside_the_deadband_the_last_value_is_said_again() {
    let head = "[metering]\nnoise = { mw = 0.5 }\ndeadband = { mw = 1.0 }\n";
    let (frames, _) = play(&scenario(head, ""));
    assert!(frames.iter().all(|frame| frame.values.len() == frames[0].values.len()));
    let values = series(&frames, "HP1.from.mw");
    let (held, moved): (Vec<f64>, Vec<f64>) =
        values.windows(2).map(|pair| (pair[1] - pair[0]).abs()).partition(|change| *change == 0.0);
    assert!(held.len() > 2000 && moved.len() > 50, "{} {}", held.len(), moved.len());
    // Reported values are rounded, to thousandths.
    assert!(moved.iter().all(|change| *change > 0.998));
}

#[test]
fn values_are_whole_steps_of_the_resolution() {
    let (frames, _) = play(&scenario("[metering]\nnoise = { kv = 1 }\nresolution = { kv = 0.05, mw = 5 }\n", ""));
    for frame in &frames {
        let text = frame.get("Hask.kv").to_string();
        assert!(text.split_once('.').is_none_or(|(_, decimals)| decimals.len() <= 2), "{text}");
        assert!((frame.get("Hask.kv") * 20.0).fract().abs() < 1e-9);
        assert!(frame.get("HP1.from.mw") % 5.0 == 0.0);
    }
}

#[test]
fn skew_makes_channels_follow_one_after_the_other() {
    let step = "[[event]]\nat = 100.1\nstep = \"Hask\"\nkv = 8\n";
    let first_moved = |head: &str| {
        let (frames, _) = play(&scenario(head, step));
        let moved = |name: &String| {
            frames.iter().position(|frame| (frame.get(name) - frames[50].get(name)).abs() > 0.01).unwrap()
        };
        let analog = frames[0].values.keys().filter(|name| !name.ends_with("closed") && !name.ends_with("inserted"));
        analog.map(moved).collect::<std::collections::BTreeSet<_>>()
    };
    assert_eq!(first_moved(""), [101].into());
    assert_eq!(first_moved("[metering]\nskew_s = 2.0\n"), [101, 102, 103].into());
}

#[test]
fn skew_longer_than_many_frames_still_begins_at_the_start() {
    let (frames, _) = play(
        "hours = 0.01\ninterval_s = 0.1\n[metering]\nskew_s = 5\n[[corridor]]\nname = \"Hask-Prell\"\ntransfer_mw = [[0, 700], [36, 1000]]\n",
    );
    assert_eq!(frames.len(), 360);
    assert!((frames[0].get("HP1.from.mw") + frames[0].get("HP2.from.mw") - 700.0).abs() < 0.01);
}

#[test]
fn a_gap_of_everything_has_no_frames_and_one_of_a_channel_only_lacks_it() {
    let gaps =
        "[[gap]]\nfrom = 100\nuntil = 160\n[[gap]]\nfrom = 00:05:00\nuntil = 00:06:00\nchannels = [\"HP1.to.mw\"]\n";
    let (frames, _) = play(&scenario("", gaps));
    assert_eq!(frames.len(), 3600 - 60);
    assert!(frames.iter().all(|frame| !(100.0..160.0).contains(&frame.time_s)));
    for frame in &frames {
        let lacks = (300.0..360.0).contains(&frame.time_s);
        assert_eq!(frame.values.contains_key("HP1.to.mw"), !lacks);
        assert!(frame.values.contains_key("HP1.to.mvar"));
    }
}

#[test]
fn false_meters_lie_for_their_time() {
    let lies = "[[false_meter]]\nchannel = \"HP1.from.mw\"\nfrom = 100\nuntil = 200\nscale = -1\n\
                [[false_meter]]\nchannel = \"Hask.kv\"\nfrom = 100\nuntil = 200\nscale = 1.1\noffset = 2\n\
                [[false_meter]]\nchannel = \"HP2.closed\"\nfrom = 100\nuntil = 200\nvalue = 0\n";
    let (frames, truth) = play(&scenario("", lies));
    let turns = truth.iter().filter(|fact| matches!(fact.what, What::Meter { .. })).collect::<Vec<_>>();
    assert_eq!(turns.len(), 6);
    assert!(turns[..3].iter().all(|fact| matches!(fact.what, What::Meter { says: Says::Falsehood, .. })));
    assert!(turns[3..].iter().all(|fact| matches!(fact.what, What::Meter { says: Says::Truth, .. })));
    let (honest, lying) = (&frames[99], &frames[150]);
    assert!((lying.get("HP1.from.mw") + honest.get("HP1.from.mw")).abs() < 0.01);
    assert!((lying.get("Hask.kv") - 1.1 * honest.get("Hask.kv") - 2.0).abs() < 0.01);
    assert!(lying.get("HP2.closed") == 0.0 && lying.get("HP2.from.mw") > 100.0);
    assert!((frames[200].get("HP1.from.mw") - honest.get("HP1.from.mw")).abs() < 0.01);
}

#[test]
fn random_steps_come_at_their_rate_and_stay_near_the_plan() {
    let sides = "coincident_steps = { per_hour = 20, kv = [1, 3] }\n\
                 from = { e_kv = 430, steps = { per_hour = 60, kv = [1.5, 5.0] } }\n";
    let (_, truth) = play(&scenario("", sides).replace("hours = 1\ninterval_s = 1", "hours = 24\ninterval_s = 60"));
    let (mut alone, mut both, mut offset) = (0, 0, 0.0_f64);
    for fact in &truth {
        if let What::Step { kv: [from, to] } = fact.what {
            if to == 0.0 {
                alone += 1;
                assert!((1.5..=5.0).contains(&from.abs()));
            } else {
                both += 1;
            }
            offset += from;
            assert!(offset.abs() < 30.0);
        }
    }
    assert!((1300..1580).contains(&alone) && (400..560).contains(&both), "{alone} {both}");
}
