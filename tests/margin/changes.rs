//! Changes as one writes them, right and wrong.

use tautline::{config::Config, desk::Alternative};

const GRID: &str = r#"
[grid]
frequency_hz = 50

[[corridor]]
name = "Skarn-Velm"
from = { bus = "Skarn", nominal_kv = 400, source = { r_ohm = 1, x_ohm = 20 } }
to = { bus = "Velm", nominal_kv = 400, source = { r_ohm = 1, x_ohm = 15 } }
outage = [{ name = "tower", circuits = ["SV1", "SV 2"] }]
[[corridor.circuit]]
name = "SV1"
r_ohm = 8
x_ohm = 80
b_us = 900
[[corridor.circuit]]
name = "SV 2"
r_ohm = 8
x_ohm = 80
b_us = 900
series_capacitors = [{ name = "SV2-SC", x_ohm = 20, at = 0.5 }]

[[corridor]]
name = "Velm north"
from = { bus = "Velm", nominal_kv = 400, source = { r_ohm = 1, x_ohm = 20 } }
to = { bus = "Orrin", nominal_kv = 400, source = { r_ohm = 1, x_ohm = 15 } }
outage = [{ name = "tower", circuits = ["VO1", "VO2"] }]
[[corridor.circuit]]
name = "VO1"
r_ohm = 8
x_ohm = 80
b_us = 900
[[corridor.circuit]]
name = "VO2"
r_ohm = 8
x_ohm = 80
b_us = 900
"#;

fn parse(with: &[&str], without: &[&str]) -> Result<Vec<bool>, Vec<String>> {
    let grid = Config::parse(GRID, "grid.toml").unwrap_or_else(|errors| panic!("{errors}")).grid;
    let [with, without] = [with, without].map(|texts| texts.iter().map(ToString::to_string).collect::<Vec<_>>());
    let touched = |alternatives: Vec<Option<Alternative>>| alternatives.iter().map(Option::is_some).collect();
    Alternative::parse(&with, &without, &grid).map(touched).map_err(|errors| errors.0)
}

#[test]
fn only_what_a_change_touches_has_an_alternative() {
    for (with, without, touched) in [
        (&[][..], &[][..], [false, false]),
        (&["close SV1"], &[], [true, false]),
        (&["open VO1", "open VO1"], &[], [false, true]),
        (&["  open   SV 2 "], &[], [true, false]),
        (&["insert SV2-SC", "bypass SV2-SC "][..1], &[], [true, false]),
        (&["bypass SV2-SC", "close VO1"], &[], [true, true]),
        (&["transfer Velm north -200", "transfer Velm north +1.5e2"], &[], [false, true]),
        (&["transfer Skarn-Velm 50", "transfer Skarn-Velm -50"], &[], [false, false]),
        (&[], &["SV 2"], [true, false]),
        (&[], &["SV2-SC", "Velm north: tower"], [true, true]),
        (&[], &["Skarn-Velm: SV1"], [true, false]),
    ] {
        assert_eq!(parse(with, without), Ok(touched.to_vec()), "{with:?} {without:?}");
    }
}

#[test]
fn every_wrong_change_says_what_is_wrong_and_what_there_is() {
    for (with, without, said) in [
        ("", "", &["begins with no change; possible: \"close\", \"open\", \"insert\", \"bypass\", \"transfer\""][..]),
        ("clsoe SV1", "SV1", &["--with \"clsoe SV1\": begins with no change; did you mean \"close\"?"]),
        ("close", "SV1", &["names no circuit; possible: \"SV1\", \"SV 2\", \"VO1\", \"VO2\""]),
        ("close SV3", "SV1", &["there is no circuit \"SV3\"; did you mean \"SV1\"?"]),
        ("open SV2-SC", "SV1", &["there is no circuit \"SV2-SC\""]),
        ("insert SV1", "SV1", &["there is no series capacitor \"SV1\"", "\"SV2-SC\""]),
        ("transfer", "SV1", &["ends without a number of MW"]),
        ("transfer Skarn-Velm", "SV1", &["ends without a number of MW"]),
        ("transfer Velm north", "SV1", &["ends without a number of MW"]),
        ("transfer Skarn-Velm nan", "SV1", &["ends without a number of MW"]),
        ("transfer Skarn-Velm inf", "SV1", &["ends without a number of MW"]),
        ("transfer Skarn-Welm 20", "SV1", &["there is no corridor \"Skarn-Welm\"; did you mean \"Skarn-Velm\"?"]),
        ("close \u{1b}[2J\u{7}", "SV1", &["there is no circuit \"\\u{1b}[2J\\u{7}\""]),
        ("close SV1", "SV9", &["--without \"SV9\": there is no such outage; did you mean \"SV1\"?"]),
        ("close SV1", "tower", &["several corridors", "say which, as in \"Skarn-Velm: tower\""]),
        ("close SV1", "Velm north: SV1", &["there is no such outage"]),
    ] {
        let errors = parse(&[with], &[without]).expect_err("it is wrong").join("\n");
        for said in said {
            assert!(errors.contains(said), "{with:?} {without:?}: {errors}");
        }
        assert!(!errors.chars().any(|c| c.is_control() && c != '\n'), "{errors:?}");
    }
}

#[test]
fn all_that_is_wrong_is_said_at_once() {
    let errors = parse(&["close SV1", "open SV1", "insert SV2-SC", "bypass SV2-SC", "shut VO1"], &["VO3"]);
    let errors = errors.expect_err("four are wrong");
    assert_eq!(errors.len(), 4, "{errors:?}");
    assert!(errors[0].contains("--with \"open SV1\": contradicts"), "{errors:?}");
    assert!(errors[1].contains("--with \"bypass SV2-SC\": contradicts"), "{errors:?}");
}
