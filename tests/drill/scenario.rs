//! Everything wrong with a scenario is named with its line and key.

use tautline::{
    config::Config,
    drill::{Invention, Scenario},
};

use super::CONFIG;

fn errors(text: &str) -> Vec<(Option<usize>, String, String)> {
    let config = Config::parse(CONFIG, "config.toml").unwrap();
    let errors = Scenario::parse(text, "day.toml", &config).expect_err("it has errors");
    errors.errors.into_iter().map(|error| (error.line, error.key, error.message)).collect()
}

/// A sound beginning of four lines, then what is wrong.
fn found(text: &str) -> Vec<(usize, String, String)> {
    let head = "start = 2031-03-14T00:00:00Z\nhours = 1\ninterval_s = 1\n[[corridor]]\nname = \"Hask-Prell\"\n";
    errors(&format!("{head}{text}")).into_iter().map(|(line, key, message)| (line.unwrap(), key, message)).collect()
}

#[track_caller]
fn assert_found(text: &str, line: usize, key: &str, message: &str) {
    let found = found(text);
    let fits = |(l, k, m): &(usize, String, String)| *l == line && k == key && m.contains(message);
    assert!(found.len() == 1 && found.iter().any(fits), "{found:#?}");
}

#[test]
fn each_mistake_is_named() {
    assert_found("", 4, "corridor[0].transfer_mw", "is missing");
    assert_found("transfer_mw = 700\nangle_deg = 20", 6, "corridor[0].transfer_mw", "excludes angle_deg");
    assert_found("transfer_mw = [[0, 1], [0, 2]]", 6, "corridor[0].transfer_mw", "must ascend");
    assert_found("transfer_mw = [[0, 1], [7200, 2]]", 6, "corridor[0].transfer_mw[1][0]", "outside of the scenario");
    assert_found(
        "transfer_mw = [[0, 1],\n [\"noon\", 2]]",
        7,
        "corridor[0].transfer_mw[1][0]",
        "a time since the start",
    );
    assert_found("transfer_mw = [5]", 6, "corridor[0].transfer_mw[0]", "a time and a number");
    assert_found("transfer_mw = 9000", 6, "corridor[0].transfer_mw", "more than the sources can send");
    assert_found("transfer_mw = 1\nwander = { minutes = 3 }", 7, "corridor[0].wander.mw", "is missing");
    assert_found("transfer_mw = 1\nvander = 3", 7, "corridor[0].vander", "did you mean \"wander\"?");
    assert_found("transfer_mw = 1\n[corridor.from]\ne_kv = 4", 8, "corridor[0].from.e_kv", "at least 200");
    assert_found(
        "transfer_mw = 1\n[corridor.from]\nsteps = { per_hour = 3, kv = [5, 1] }",
        8,
        "corridor[0].from.steps.kv",
        "smallest",
    );
    assert_found(
        "transfer_mw = 1\n[[corridor.station]]\nbus = \"Mire\"",
        8,
        "corridor[0].station[0].bus",
        "no station",
    );
    assert_found(
        "transfer_mw = 1\n[[corridor]]\nname = \"Hask-Prel\"",
        8,
        "corridor[1].name",
        "did you mean \"Hask-Prell\"?",
    );
    assert_found(
        "transfer_mw = 1\n[[corridor]]\nname = \"Hask-Prell\"\ntransfer_mw = 1",
        8,
        "corridor[1].name",
        "given twice",
    );
    assert_found("transfer_mw = 1\n[[event]]\nat = 5", 8, "event[0].at", "exactly one of");
    assert_found("transfer_mw = 1\n[[event]]\ntrip = \"HP1\"", 7, "event[0].at", "is missing");
    assert_found("transfer_mw = 1\n[[event]]\nat = 5\ntrip = \"HP9\"", 9, "event[0].trip", "no circuit");
    assert_found("transfer_mw = 1\n[[event]]\nat = 5\ntrip = \"HP2-SC\"", 9, "event[0].trip", "no circuit");
    assert_found("transfer_mw = 1\n[[event]]\nat = 5\ntrip = \"OM1\"", 9, "event[0].trip", "no circuit");
    assert_found("transfer_mw = 1\n[[event]]\nat = 5\nstep = \"Hask\"", 9, "event[0].step", "exactly one of kv, pct");
    assert_found("transfer_mw = 1\n[[event]]\nat = 5\nfault = \"HP1\"\nplace = 2", 10, "event[0].place", "at most 1");
    assert_found(
        "transfer_mw = 1\n[[event]]\nat = 5\ntrip = \"HP1\"\nplace = 0.2",
        10,
        "event[0].place",
        "unknown key",
    );
    assert_found("transfer_mw = 1\n[[gap]]\nfrom = 9\nuntil = 8", 9, "gap[0].until", "later");
    assert_found(
        "transfer_mw = 1\n[[gap]]\nchannels = [\"HP1.from.mw\",\n\"HP1.form.mw\"]",
        9,
        "gap[0].channels[1]",
        "did you mean",
    );
    assert_found("transfer_mw = 1\n[[false_meter]]\nchannel = \"Hask.kv\"", 8, "false_meter[0].channel", "needs scale");
    assert_found("transfer_mw = 1\n[metering]\nresolution = { kv = 0.3 }", 8, "metering.resolution.kv", "go into 1");
}

#[test]
fn the_whole_file_is_read_before_it_is_refused() {
    let found = errors(
        "hours = 0\nseed = -1\nstart = 12:00:00\ninterval_s = \"x\"\n[[event]]\nat = 1\ntrip = \"A\"\nplace = 3\n",
    );
    let keys: Vec<_> = found.iter().map(|(line, key, _)| (line.unwrap(), &**key)).collect();
    let expected = [(1, "hours"), (1, "corridor"), (2, "seed"), (3, "start"), (4, "interval_s"), (7, "event[0].trip")];
    assert_eq!(keys, expected);
}

#[test]
fn what_is_no_toml_is_refused() {
    assert!(errors("hours = ")[0].2.contains("not valid TOML"));
}

#[test]
fn corridors_with_a_common_bus_are_not_played_together() {
    let second = CONFIG.split_once("[[corridor]]").unwrap().1.replace("HP", "XY").replace("Hask-Prell", "Twin");
    let second = second.split_once("[[corridor]]\n").unwrap().0;
    let config = Config::parse(&format!("{CONFIG}[[corridor]]{second}"), "config.toml").unwrap();
    let both = "start = 2031-03-14T00:00:00Z\nhours = 1\ninterval_s = 1\n[[corridor]]\nname = \"Hask-Prell\"\n\
                transfer_mw = 1\n[[corridor]]\nname = \"Twin\"\ntransfer_mw = 1\n";
    let errors = Scenario::parse(both, "day.toml", &config).unwrap_err();
    assert_eq!(errors.errors.len(), 1);
    assert!(errors.errors[0].message.contains("in common with \"Hask-Prell\""), "{errors}");
}

#[test]
fn the_documented_keys_are_the_keys() {
    let config = Config::parse(CONFIG, "config.toml").unwrap();
    let scenario = Scenario::parse(include_str!("../../src/drill/keys.toml"), "keys.toml", &config).unwrap();
    assert_eq!(scenario.corridors.len(), 2);
    assert_eq!(scenario.corridors[0].events.len(), 6);
    assert_eq!(scenario.corridors[1].gaps.len(), 2);
}

#[test]
fn whatever_is_made_up_can_be_played() {
    for seed in 0..200 {
        let invention = Invention {
            seed,
            with_trip: true,
            with_coincident_steps: true,
            with_slow_telemetry: true,
            ..Invention::default()
        };
        let (config, scenario) = invention.invent().read().unwrap();
        let off = |side: usize| {
            config.grid.corridors[0].sides[side].source.x_ohm / scenario.corridors[0].sides[side].x_ohm - 1.0
        };
        assert!([0, 1].into_iter().all(|side| off(side).abs() < 0.401));
    }
}
