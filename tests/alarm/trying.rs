//! Trying alarms on recorded days: the standards' measures, and the command.

use std::{fs, path::Path};

use assert_cmd::{assert::Assert, cargo::cargo_bin_cmd};
use chrono::TimeDelta;
use tautline::alarm::trial::{Figures, Trial};
use tempfile::TempDir;

use super::bed::{config, headroom};

/// Alarms that come and go with the headroom at once, at these setpoints.
fn prompt(setpoints: impl IntoIterator<Item = u32>) -> String {
    let table = |setpoint: u32| {
        format!(
            "[[alarm]]\nname = \"below {setpoint}\"\non = \"headroom_mw\"\nsetpoint = {setpoint}\ndeadband = 0\n\
             on_delay_s = 0\noff_delay_s = 0\n"
        )
    };
    setpoints.into_iter().map(table).collect()
}

/// What comes of these alarms alone.
fn figures(tables: &str, course: impl IntoIterator<Item = (i64, f64)>) -> Figures {
    let config = config(tables, "");
    let alarms: Vec<_> = config.alarms[0].iter().filter(|alarm| alarm.name.starts_with("below")).cloned().collect();
    let mut trial = Trial::new(&config.grid.corridors[0], &alarms);
    course.into_iter().for_each(|(s, headroom_mw)| trial.take(&headroom(s, headroom_mw)));
    Figures::of([trial])
}

/// An hour at a frame a minute, with a dip in each of the minutes named.
fn dips(minutes: &[i64], depth_mw: f64) -> Vec<(i64, f64)> {
    (0..=60).map(|minute| (60 * minute, if minutes.contains(&minute) { depth_mw } else { 900.0 })).collect()
}

/// ANSI/ISA-18.2 (2016) table of alarm performance metrics, from memory: about 6 alarms an hour, that is 1 in 10 minutes.
#[test]
fn rates_are_those_of_the_recorded_time() {
    let six = figures(&prompt([100]), dips(&[1, 11, 21, 31, 41, 51], 50.0));
    assert_eq!((six.alarms(), six.hours, six.per_hour(), six.per_10_min()), (6, 1.0, Some(6.0), Some(1.0)));
    assert_eq!((six.by_priority, six.most_in_10_min), ([0, 6, 0, 0], 1));
    assert!((six.standing_min() - 6.0).abs() < 1e-9);
}

/// A flood begins with more than 10 alarms in 10 minutes and ends with fewer than 5 (ANSI/ISA-18.2 from memory; EEMUA 191
/// has the same numbers).
#[test]
fn floods_begin_above_ten_and_end_below_five() {
    let ten = figures(&prompt(101..=110), dips(&[5], 50.0));
    assert_eq!((ten.most_in_10_min, ten.floods), (10, 0));
    let eleven = figures(&prompt(101..=111), dips(&[5], 50.0));
    assert_eq!((eleven.most_in_10_min, eleven.floods), (11, 1));
    // One interval of the seven that the hour and its last instant touch.
    assert!((eleven.flood_pct - 100.0 / 7.0).abs() < 1e-9);
    // Setpoints of 101 to 111: a dip to 106.5 MW raises five of them, which keep a flood going, one to 107.5 only four.
    let mut course = dips(&[5], 50.0);
    (course[15].1, course[25].1) = (106.5, 106.5);
    let intervals = |figures: &Figures| (7.0 * figures.flood_pct / 100.0).round();
    let long = figures(&prompt(101..=111), course.clone());
    assert_eq!((long.floods, intervals(&long)), (1, 3.0));
    course[15].1 = 107.5;
    let short = figures(&prompt(101..=111), course);
    assert_eq!((short.floods, intervals(&short)), (1, 1.0), "five after the end are no flood of their own");
}

/// Three times within a minute is the customary measure of chattering; stale is what stands for more than 24 hours.
#[test]
fn chattering_and_stale_alarms_are_named() {
    let toggling = |period: i64| (0..6).map(move |n| (n * period, if n % 2 == 1 { 50.0 } else { 900.0 }));
    let name = [("Skarn-Velm".into(), "below 100".into())];
    assert_eq!(figures(&prompt([100]), toggling(15)).chattering, name);
    assert_eq!(figures(&prompt([100]), toggling(16)).chattering, []);
    let standing = |seconds: i64| [(0, 50.0), (seconds, 50.0)];
    assert_eq!(figures(&prompt([100]), standing(86_400)).stale, []);
    assert_eq!(figures(&prompt([100]), standing(86_401)).stale, name);
}

#[test]
fn lead_times_and_missed_ends() {
    let course = [(0, 900.0), (60, 90.0), (600, 10.0), (660, 0.0), (720, 5.0), (900, -5.0), (960, 900.0), (3600, -1.0)];
    let seen = figures(&prompt([100]), course);
    let leads: Vec<_> = seen.ends.iter().map(|end| end.lead).collect();
    assert_eq!(leads, [Some(TimeDelta::minutes(10)), None], "back for three minutes is the same end");
    assert_eq!((seen.missed(), seen.median_lead()), (1, Some(TimeDelta::minutes(10))));
    let late = figures(&prompt([1]), course);
    assert_eq!(late.missed(), 2, "an alarm at the end itself warns of nothing");
}

#[test]
fn nothing_seen_is_nothing_found() {
    let nothing = figures(&prompt([100]), Vec::<(i64, f64)>::new());
    assert_eq!((nothing.alarms(), nothing.per_hour(), nothing.median_lead()), (0, None, None));
}

struct Bed {
    folder: TempDir,
}

impl Bed {
    /// The demo's configuration, another with more and fewer alarms, and the evening of its day.
    fn new() -> Self {
        let folder = TempDir::new().unwrap();
        let project = Path::new(env!("CARGO_MANIFEST_DIR"));
        let demo = fs::read_to_string(project.join("config/demo.toml")).unwrap();
        let day = fs::read(project.join("replay-data/demo-day.jsonl.zst")).unwrap();
        let day = String::from_utf8(zstd::decode_all(&day[..]).unwrap()).unwrap();
        let time = |line: &str| line.split('T').nth(1).map(|time| time[..5].to_owned());
        let evening = day.lines().filter(|line| time(line).is_some_and(|t| ("18:50".."19:50").contains(&&*t)));
        let evening = evening.collect::<Vec<_>>().join("\n");
        let calm =
            "[[alarm]]\nname = \"time short\"\nenabled = false\n[[alarm]]\nname = \"headroom thin\"\nsetpoint = 10\n";
        for (name, text) in [
            ("demo.toml", demo.clone()),
            ("calm.toml", format!("{calm}{demo}")),
            ("other.toml", demo.replace("length_km = 232", "length_km = 233")),
            ("evening.jsonl", evening),
        ] {
            fs::write(folder.path().join(name), text).unwrap();
        }
        Self { folder }
    }

    fn run(&self, arguments: &[&str]) -> Assert {
        let mut command = cargo_bin_cmd!("tautline");
        command.current_dir(self.folder.path()).arg("try").args(arguments).assert()
    }

    fn out(&self, arguments: &[&str]) -> String {
        String::from_utf8(self.run(arguments).success().stderr("").get_output().stdout.clone()).unwrap()
    }
}

/// The cells of the first row that begins with a word.
fn row(text: &str, begins: &str) -> Vec<String> {
    let line = text.lines().find(|line| line.trim_start().starts_with(begins)).unwrap_or_else(|| panic!("{text}"));
    line.trim().split("   ").filter(|cell| !cell.is_empty()).map(|cell| cell.trim().to_owned()).collect()
}

#[test]
fn the_command_compares_and_sweeps() {
    let bed = Bed::new();
    let both = bed.out(&["--config", "demo.toml", "--against", "calm.toml", "evening.jsonl"]);
    assert!(both.starts_with("1.0 hours\n"), "{both}");
    let alarms: Vec<usize> = row(&both, "alarms")[1..].iter().map(|cell| cell.parse().unwrap()).collect();
    assert!(alarms[0] > alarms[1] && alarms[1] > 0, "{both}");
    assert_eq!(row(&both, "minutes_left").len(), 3, "{both}");
    let end = row(&both, "2031-03-14 19:");
    let lead = |cell: &str| cell.strip_suffix(" min").map_or(f64::NAN, |minutes| minutes.parse().unwrap());
    assert!(end[0].ends_with("Ashkel-Rovanth") && lead(&end[1]) > lead(&end[2]), "{both}");

    let swept = bed.out(&["--config", "demo.toml", "--sweep", "headroom thin=1:201:100", "evening.jsonl"]);
    let lines: Vec<&str> = swept.lines().collect();
    assert_eq!(lines.len(), 5, "{swept}");
    let counts: Vec<f64> =
        [1, 101, 201].map(|mw| row(&swept, &format!("headroom thin={mw} "))[7].parse().unwrap()).to_vec();
    assert!(counts.is_sorted() && counts[0] < counts[2], "the higher, the longer it stands: {swept}");
}

#[test]
fn the_command_says_what_cannot_be_tried() {
    let bed = Bed::new();
    for (arguments, said) in [
        (&["--config", "demo.toml", "--against", "other.toml", "evening.jsonl"][..], "differ in its corridors"),
        (&["--config", "demo.toml", "evening.jsonl"], "--against"),
        (&["--config", "demo.toml", "--against", "calm.toml"], "FILE"),
        (&["--config", "demo.toml", "--against", "calm.toml", "none.jsonl"], "cannot open none.jsonl"),
        (&["--config", "demo.toml", "--sweep", "headroom=1:2:1", "evening.jsonl"], "alarms are on headroom_mw"),
        (&["--config", "demo.toml", "--sweep", "headroom_mw=1:2", "evening.jsonl"], "ALARM=FROM:TO:STEP"),
        (&["--config", "demo.toml", "--sweep", "area_margin=1:9:1", "evening.jsonl"], "no alarm is \"area_margin\""),
        (&["--config", "demo.toml", "--sweep", "time short=-5:5:5", "evening.jsonl"], "minutes_left is between"),
        (&["--config", "demo.toml", "--against", "calm.toml", "demo.toml"], "not a single frame was read"),
    ] {
        let failure = bed.run(arguments).code(2);
        let message = String::from_utf8_lossy(&failure.get_output().stderr).into_owned();
        assert!(message.contains(said), "{arguments:?}: {message}");
    }
}
