//! The board: deadbands, delays, the operator, and time.

use chrono::TimeDelta;
use tautline::{
    alarm::{Action, Board, Kind, Refusal, State, Transition},
    desk::{self, Assessment, Basis},
};

use super::bed::{at, blind, config, headroom, healthy, id, open, short};

const ONLY: &str = r#"[[alarm]]
name = "room"
on = "headroom_mw"
setpoint = 200
deadband = 20
on_delay_s = 10
off_delay_s = 30
"#;

/// A board on which only some alarm is looked at.
fn board(table: &str) -> Board {
    Board::new(&config(table, ""))
}

/// What one alarm does over assessments of the first corridor.
fn run(board: &mut Board, alarm: &str, assessments: impl IntoIterator<Item = Assessment>) -> Vec<Transition> {
    let all = assessments.into_iter().flat_map(|assessment| board.observe(&[assessment]));
    all.filter(|transition| *transition.alarm == *alarm).collect()
}

fn states(transitions: &[Transition]) -> Vec<(i64, State)> {
    transitions.iter().map(|t| ((t.time - at(0)).num_seconds(), t.to)).collect()
}

#[test]
fn deadband_and_delays_hold_an_alarm_still() {
    let course = |seconds: i64| match seconds {
        // A dip shorter than the on-delay.
        20..=25 => 150.0,
        // Below from 40 on; back over the setpoint at 70, over the deadband for 20 s at 100, and for good at 140.
        40..70 => 199.0,
        70..100 => 210.0,
        120..140 => 215.0,
        100.. => 230.0,
        _ => 300.0,
    };
    let mut board = board(ONLY);
    let seen = run(&mut board, "room", (0..=200).step_by(5).map(|s| headroom(s, course(s))));
    assert_eq!(states(&seen), [(50, State::Unacknowledged), (170, State::ReturnedUnacknowledged)]);
    assert_eq!(seen[0].value, Some(199.0));
}

#[test]
fn the_setpoint_itself_is_beyond_and_the_end_of_the_deadband_not_yet_clear() {
    let table = ONLY.replace("on_delay_s = 10", "on_delay_s = 0").replace("off_delay_s = 30", "off_delay_s = 0");
    let mut board = board(&table);
    let course = [200.1, 200.0, 220.0, 220.1];
    let seen = run(&mut board, "room", (0..).zip(course).map(|(s, mw)| headroom(s, mw)));
    assert_eq!(states(&seen), [(1, State::Unacknowledged), (3, State::ReturnedUnacknowledged)]);
}

#[test]
fn the_headroom_is_judged_as_the_state_is() {
    let mut board = Board::new(&config(ONLY, "state_spreads = 2"));
    // A spread of 10 MW: 221 is judged as 201, and 219 as 199.
    let seen = run(&mut board, "room", (0..).zip([221.0, 219.0]).map(|(s, mw)| headroom(20 * s, mw)));
    assert_eq!(seen, []);
    let seen = run(&mut board, "room", [headroom(40, 219.0)]);
    assert_eq!((states(&seen), seen[0].value), (vec![(40, State::Unacknowledged)], Some(199.0)));
}

#[test]
fn what_is_not_known_changes_nothing() {
    let mut board = board(ONLY);
    let course = |s| match s {
        0..=5 | 15..=20 => headroom(s, 100.0),
        // Blind in between: the delay begins again.
        6..15 => blind(s),
        _ => headroom(s, f64::NAN),
    };
    assert_eq!(run(&mut board, "room", (0..=24).map(course)), []);
    let seen = run(&mut board, "room", (25..=35).map(|s| headroom(s, 100.0)));
    assert_eq!(states(&seen), [(35, State::Unacknowledged)]);
    assert_eq!(run(&mut board, "room", (36..=300).map(blind)), [], "neither better nor worse");
}

#[test]
fn an_operator_acknowledges_shelves_and_takes_out_of_service() {
    let mut board = board(ONLY);
    let room = id(&board, "room");
    let low = |from: i64, to: i64| (from..=to).map(|s| headroom(s, 100.0));
    let acknowledge = Action::Acknowledge;
    let refused = board.act(room, &acknowledge, at(0)).unwrap_err();
    assert_eq!(refused.to_string(), "an alarm that is normal cannot acknowledge");

    run(&mut board, "room", low(0, 10));
    assert_eq!(board.summary().unacknowledged, [0, 1, 0, 0]);
    assert_eq!(board.act(room, &acknowledge, at(11)).unwrap().to, State::Acknowledged);
    assert_eq!(run(&mut board, "room", low(12, 300)), [], "acknowledged once, it stays so");

    let shelve = |until: i64, reason: &str| Action::Shelve { until: at(until), reason: reason.into() };
    assert_eq!(board.act(room, &shelve(400, " \u{1b} "), at(301)), Err(Refusal::NoText));
    assert_eq!(board.act(room, &shelve(301, "test"), at(301)), Err(Refusal::ShelvingTime));
    assert_eq!(board.act(room, &shelve(100_000, "test"), at(301)), Err(Refusal::ShelvingTime));
    let shelved = board.act(room, &shelve(400, "known \u{1b}[31mtest"), at(301)).unwrap();
    assert_eq!(
        (shelved.to, shelved.until, shelved.reason.as_deref()),
        (State::Shelved, Some(at(400)), Some("known [31mtest"))
    );
    assert_eq!(run(&mut board, "room", low(302, 399)), []);
    let ended = run(&mut board, "room", low(400, 401));
    assert_eq!(short(&ended), [(400, "room".into(), "shelving ends", "unacknowledged")], "still active: it comes back");

    let out = Action::RemoveFromService { reason: "maintenance".into() };
    assert_eq!(board.act(room, &out, at(402)).unwrap().to, State::OutOfService);
    assert_eq!(run(&mut board, "room", (403..=500).map(healthy)), []);
    assert_eq!(board.act(room, &Action::ReturnToService, at(501)).unwrap().to, State::Normal);
    assert_eq!(board.get(room).unwrap().standing.state, State::Normal);
}

#[test]
fn acknowledging_all_takes_those_that_wait_newest_first() {
    let mut board = board("");
    for s in 0..=120 {
        let suspects = if s > 40 { vec!["SV1.to.mw".into()] } else { Vec::new() };
        let mut seen = headroom(s, -10.0);
        seen.fit.suspects = suspects;
        board.observe(&[seen]);
    }
    let names = |board: &Board| -> Vec<String> {
        board.abnormal().into_iter().map(|id| board.get(id).unwrap().definition.name.to_string()).collect()
    };
    assert_eq!(names(&board), ["suspect meter", "headroom thin", "headroom spent"]);
    let ids = board.abnormal();
    assert_eq!(board.acknowledge_all(ids.clone(), at(121)).len(), 3);
    assert_eq!(board.acknowledge_all(ids, at(122)), []);
    assert_eq!(board.summary().acknowledged, [1, 0, 1, 1]);
    let spent = id(&board, "headroom spent");
    let note = board.note(spent, "  told the neighbour\n", at(123)).unwrap();
    assert_eq!((&*note.alarm, &*note.text), ("headroom spent", "told the neighbour"));
    assert_eq!(board.get(spent).unwrap().standing.note.as_deref(), Some("told the neighbour"));
}

#[test]
fn a_design_suppresses_while_its_condition_holds() {
    let table = format!("{ONLY}suppress_while = {{ circuits_out = [\"SV2\"], transfer_below_mw = 100 }}\n");
    let mut board = board(&table);
    let course = |s: i64| {
        let mut seen = headroom(s, 100.0);
        if (20..40).contains(&s) {
            seen.reclose = vec![open("SV2", 12.0)];
        }
        if (60..80).contains(&s) {
            seen.transfer_mw = Some(99.0);
        }
        if (65..75).contains(&s) { blind(s) } else { seen }
    };
    let seen = run(&mut board, "room", (0..100).map(course));
    let expected = [
        (10, State::Unacknowledged),
        (20, State::Suppressed),
        (40, State::Unacknowledged),
        (60, State::Suppressed),
        (80, State::Unacknowledged),
    ];
    assert_eq!(states(&seen), expected);
}

#[test]
fn silence_is_told_at_its_time_whenever_it_is_noticed() {
    let frames = [0, 5, 400, 405, 440];
    let mut replayed = board("");
    let seen = run(&mut replayed, "data silent", frames.map(healthy));
    assert_eq!(states(&seen), [(65, State::Unacknowledged), (440, State::ReturnedUnacknowledged)]);
    // Live, somebody looks in between.
    let mut live = board("");
    let mut told = Vec::new();
    for frame in frames {
        told.extend(run(&mut live, "data silent", [healthy(frame)]));
        for later in [3, 64, 100] {
            let next = frames.iter().find(|next| **next > frame).copied().unwrap_or(i64::MAX);
            if frame + later < next && frame < 440 {
                told.extend(live.elapse(at(frame + later)).into_iter().filter(|t| &*t.alarm == "data silent"));
            }
        }
    }
    assert_eq!(told, seen);
}

#[test]
fn the_same_frames_give_the_same_transitions_and_older_ones_nothing() {
    let course = |s: i64| headroom(s, 300.0 * (s as f64 / 97.0).sin() + 40.0 * (s as f64 / 3.0).cos());
    let all = |step: usize| {
        let mut board = board("");
        let mut seen = Vec::new();
        for s in (0..4000).step_by(step) {
            seen.extend(board.observe(&[course(s)]));
            seen.extend(board.observe(&[course(s - 50)]));
        }
        seen
    };
    assert!(all(2).len() >= 20, "{}", all(2).len());
    assert_eq!(all(2), all(2));
}

#[test]
fn every_kind_reads_its_value() {
    let base = || healthy(0);
    let with = |change: fn(&mut Assessment)| {
        let mut seen = base();
        change(&mut seen);
        seen
    };
    let cases: Vec<(Kind, Assessment, f64, Option<&str>)> = vec![
        (Kind::HeadroomMw, headroom(0, 123.0), 123.0, None),
        (Kind::HeadroomPct, headroom(0, 250.0), 20.0, None),
        (Kind::HeadroomPct, headroom(0, -1200.0), -100.0, None),
        (Kind::AngleMargin, base(), 50.0, Some("SV1")),
        (Kind::AngleMargin, with(|a| a.outages[0].angle_margin_deg = None), 0.0, Some("SV1")),
        (Kind::AreaMargin, base(), 0.6, Some("SV1")),
        (Kind::ClearingReserve, base(), 200.0, Some("SV1")),
        (Kind::StandingAngle, with(|a| a.reclose = vec![open("SV1", 8.0), open("SV2", 31.0)]), 31.0, Some("SV2")),
        (Kind::MinutesLeft, with(|a| a.minutes_to_spent = Some(7.0)), 7.0, None),
        (Kind::MinutesLeft, with(|a| a.state = desk::State::Spent), 0.0, None),
        (Kind::Loading, base(), 50.0, Some("SV1")),
        (Kind::Blind, blind(0), 1.0, None),
        (Kind::Suspects, with(|a| a.fit.suspects = vec!["SV1.to.mw".into()]), 1.0, Some("SV1.to.mw")),
        (Kind::Fit, base(), 0.25, None),
        (
            Kind::SourceMoved,
            with(|a| {
                a.sources[0].basis = Basis::Learned;
                (a.sources[0].x_ohm, a.sources[0].x_sd) = (26.0, 1.0);
            }),
            30.0,
            Some("Skarn"),
        ),
        (
            Kind::SourceMoved,
            with(|a| {
                a.sources[0].basis = Basis::Learned;
                (a.sources[0].x_ohm, a.sources[0].x_sd) = (26.0, 4.0);
            }),
            0.0,
            Some("Skarn"),
        ),
    ];
    for (kind, seen, value, about) in cases {
        // A setpoint that the value is just at, then one it is just short of.
        for (nudge, raised) in [(0.0, true), (1e-9, false)] {
            let low = kind.direction() == tautline::alarm::Direction::Low;
            let setpoint = if low { value - nudge } else { value + nudge };
            let mut definition = config("", "").alarms[0][0].clone();
            (definition.kind, definition.setpoint, definition.on_delay) = (kind, setpoint, TimeDelta::zero());
            let mut board = tautline::alarm::CorridorBoard::new(&config("", "").grid.corridors[0], &[definition]);
            let mut transitions = Vec::new();
            board.observe(&seen, &mut transitions);
            assert_eq!(!transitions.is_empty(), raised, "{kind} {value}");
            if raised {
                assert_eq!((transitions[0].value, transitions[0].about.as_deref()), (Some(value), about), "{kind}");
            }
        }
    }
}

#[test]
fn what_does_not_exist_raises_nothing() {
    let mut seen = healthy(0);
    seen.outages[0].critical_ms = None;
    (seen.intact, seen.fit.limit) = (None, None);
    let all: String = [Kind::ClearingReserve, Kind::StandingAngle, Kind::MinutesLeft, Kind::Loading, Kind::Fit]
        .map(|kind| {
            let [low, high] = kind.setpoints();
            let setpoint = if kind.direction() == tautline::alarm::Direction::Low { high } else { low };
            format!("[[alarm]]\nname = \"{kind}\"\non = \"{kind}\"\nsetpoint = {setpoint}\non_delay_s = 0\n")
        })
        .concat();
    assert_eq!(board(&all).observe(&[seen]), []);
}

#[test]
fn a_source_widens_only_after_it_was_narrow() {
    let seen = |s: i64, x_sd: f64, basis: Basis| {
        let mut seen = healthy(s);
        (seen.sources[0].x_sd, seen.sources[0].basis) = (x_sd, basis);
        seen
    };
    let mut board = board("");
    // The configured spread is 10 ohm.
    let course = [(0, 10.0), (60, 9.5), (120, 6.0), (180, 4.9), (240, 2.0), (300, 9.75)];
    let seen = run(&mut board, "source widened", course.map(|(s, x_sd)| seen(s, x_sd, Basis::Learned)));
    assert_eq!(states(&seen), [(300, State::Unacknowledged)]);
    assert_eq!((seen[0].value, seen[0].about.as_deref()), (Some(97.5), Some("Skarn")));
}

#[test]
fn another_configuration_keeps_the_states() {
    let mut board = board(ONLY);
    run(&mut board, "room", (0..=10).map(|s| headroom(s, 100.0)));
    run(&mut board, "headroom thin", (11..=30).map(|s| headroom(s, 100.0)));
    board.act(id(&board, "headroom thin"), &Action::Acknowledge, at(31)).unwrap();
    // "room" is gone; "headroom thin" has another setpoint, at which it would not be raised, and a deadband.
    let other = config("[[alarm]]\nname = \"headroom thin\"\nsetpoint = 95", "");
    let seen = board.reconfigure(&other, at(32));
    assert_eq!(short(&seen), [(32, "room".into(), "withdraw", "normal")]);
    let thin = board.get(id(&board, "headroom thin")).unwrap();
    assert_eq!((thin.standing.state, thin.definition.setpoint), (State::Acknowledged, 95.0));
    assert_eq!(run(&mut board, "headroom thin", (33..=200).map(|s| headroom(s, 100.0))), [], "within the deadband");
}
