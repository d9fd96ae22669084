//! What the frames say agrees with Kirchhoff, Ohm, and the two-machine equivalent.

use nalgebra::Complex;
use tautline::drill::{Source, Truth, What};

use super::{CONFIG, Played, play, play_with};

type C64 = Complex<f64>;

/// Values to the last digit that matters here.
const EXACT: &str = "[metering]\nresolution = { kv = 1e-9, deg = 1e-9, mw = 1e-9, mvar = 1e-9 }\n";

fn voltage(frame: &Played, bus: &str) -> C64 {
    C64::from_polar(frame.get(&format!("{bus}.kv")), frame.get(&format!("{bus}.deg")).to_radians())
}

fn power(frame: &Played, channel: &str) -> C64 {
    C64::new(frame.get(&format!("{channel}.mw")), frame.get(&format!("{channel}.mvar")))
}

/// E of a source from what its terminal sends: V + Z I.
fn behind(frame: &Played, bus: &str, sends: &[&str], z: C64) -> (C64, f64) {
    let v = voltage(frame, bus);
    let sent: C64 = sends.iter().map(|channel| power(frame, channel)).sum();
    let current = (sent / v).conj();
    let e = v + z * current;
    (e, (e * current.conj()).re)
}

/// E and MW of both sources of Hask-Prell.
fn hask_prell(frame: &Played) -> [(C64, f64); 2] {
    [
        behind(frame, "Hask", &["Hask", "HP1.from", "HP2.from"], C64::new(2.0, 25.0)),
        behind(frame, "Prell", &["Prell", "HP1.to", "HP2.to"], C64::new(1.2, 16.0)),
    ]
}

/// What the two-machine equivalent delivers: a·P_from − b·P_to.
fn p_e(frame: &Played) -> f64 {
    let [(_, from), (_, to)] = hask_prell(frame);
    (90_000.0 * from - 50_000.0 * to) / 140_000.0
}

fn internal_angle(frame: &Played) -> f64 {
    let [(from, _), (to, _)] = hask_prell(frame);
    (from / to).arg()
}

fn states(truth: &[Truth]) -> Vec<&[Source; 2]> {
    let state = |fact: &'_ Truth| matches!(fact.what, What::State { .. });
    truth
        .iter()
        .filter(|fact| state(fact))
        .filter_map(|fact| if let What::State { sources, .. } = &fact.what { Some(sources) } else { None })
        .collect()
}

fn scenario(more: &str) -> String {
    format!(
        "hours = 0.1\ninterval_s = 0.1\n{EXACT}\
         [[corridor]]\nname = \"Hask-Prell\"\nreports_angles = true\ntransfer_mw = 700\n\
         from = {{ r_ohm = 2.0, x_ohm = 25.0, e_kv = 432 }}\n{more}"
    )
}

#[test]
fn the_sources_are_those_of_the_truth() {
    let (frames, truth) =
        play(&scenario("wander = { mw = 30, minutes = 1 }\nto = { wander = { kv = 1, minutes = 1 } }"));
    let states = states(&truth);
    assert_eq!(states.len(), 6);
    for (frame, sources) in frames.iter().step_by(600).zip(states) {
        for ((e, _), source) in hask_prell(frame).iter().zip(sources) {
            assert!((e.norm() - source.e_kv).abs() < 1e-5, "{} {} {}", source.bus, e.norm(), source.e_kv);
        }
    }
    let wandered = |side: usize| frames.iter().map(|frame| hask_prell(frame)[side].0.norm()).fold(0.0, f64::max);
    assert!((wandered(0) - 432.0).abs() < 1e-6);
    assert!(wandered(1) > 421.0);
}

#[test]
fn the_transfer_is_what_was_asked_for() {
    let (frames, _) = play(&scenario(""));
    let sent = power(&frames[0], "HP1.from") + power(&frames[0], "HP2.from");
    assert!((sent.re - 700.0).abs() < 1e-6);
}

#[test]
fn circuits_obey_their_own_equations() {
    let (frames, _) = play(&scenario(""));
    let frame = &frames[7];
    let current = |bus: &str, channel: &str| (power(frame, channel) / voltage(frame, bus)).conj();
    // HP1 by the long-line equations (Grainger & Stevenson 1994, §6.5), apart from the program's own.
    let (z, y) = (C64::new(0.028, 0.31), C64::new(0.0, 3.7e-6));
    let (gamma_l, surge) = ((z * y).sqrt() * 240.0, (z / y).sqrt());
    let (v, i) = (voltage(frame, "Prell"), -current("Prell", "HP1.to"));
    assert!((gamma_l.cosh() * v + surge * gamma_l.sinh() * i - voltage(frame, "Hask")).norm() < 1e-6);
    assert!((gamma_l.sinh() / surge * v + gamma_l.cosh() * i - current("Hask", "HP1.from")).norm() < 1e-9);
}

#[test]
fn nothing_is_lost_at_a_station_and_reversal_only_turns_the_flows() {
    let day = "hours = 0.5\ninterval_s = 10\n".to_owned()
        + EXACT
        + "[[corridor]]\nname = \"Olt-Ume\"\ntransfer_mw = [[0, 250], [1800, -250]]\n[[event]]\nat = 900\ntrip = \"MU2\"\n";
    let (frames, _) = play(&day);
    for frame in &frames {
        let drawn: C64 = ["Mire", "OM1.to", "OM2.to", "MU1.from", "MU2.from"].iter().map(|c| power(frame, c)).sum();
        assert!(drawn.norm() < 1e-6, "{} s: {drawn}", frame.time_s);
    }
    assert!(frames[0].get("MU1.from.mw") > 50.0 && frames[170].get("MU1.from.mw") < -50.0);
    assert!(frames[91].get("MU2.from.mw") == 0.0 && frames[91].get("MU2.closed") == 0.0);
}

#[test]
fn after_a_trip_the_machines_deliver_what_they_did() {
    let (frames, _) = play(&scenario("[[event]]\nat = 10.05\ntrip = \"HP1\"\n"));
    let (before, just_after, long_after) = (&frames[100], &frames[101], &frames[700]);
    assert!(p_e(just_after) < p_e(before) - 50.0, "the angle cannot jump, so the power must");
    assert!((p_e(long_after) - p_e(before)).abs() < 1e-3, "{} {}", p_e(long_after), p_e(before));
    assert!(internal_angle(long_after) > internal_angle(before) + 0.08);
    let overshoot = frames[101..200].iter().map(internal_angle).fold(0.0, f64::max);
    assert!(overshoot > internal_angle(long_after) + 0.02, "it swings past the new equilibrium");
}

#[test]
fn a_fault_swings_and_fades() {
    let (frames, truth) = play(&scenario("[[event]]\nat = 10\nfault = \"HP2\"\n"));
    let rest = internal_angle(&frames[1200]);
    let widest =
        |from: usize| frames[from..from + 30].iter().map(|f| (internal_angle(f) - rest).abs()).fold(0.0, f64::max);
    let widths: Vec<f64> = (0..5).map(|n| widest(102 + 30 * n)).collect();
    assert!(widths[0] > 0.1, "{widths:?}");
    for pair in widths.windows(2) {
        // Three seconds of a decay of four.
        assert!((pair[1] / pair[0] - (-0.75_f64).exp()).abs() < 0.15, "{widths:?}");
    }
    assert!(frames[102].get("HP2.closed") == 0.0);
    assert!(truth.iter().any(|fact| matches!(&fact.what, What::Fault { name } if &**name == "HP2")));
}

#[test]
fn a_fault_shows_in_frames_that_fall_on_it() {
    let more = "[[event]]\nat = 10.01\nfault = \"HP2\"\nplace = 0.0\nclear_ms = 150\n";
    let (frames, _) = play(&scenario(more));
    // At the exporting end a bolted fault leaves nothing of the voltage there.
    assert!(frames[101].get("Hask.kv") == 0.0);
    assert!(frames[102].get("Hask.kv") > 350.0 && frames[100].get("Hask.kv") > 350.0);
}

#[test]
fn a_fault_that_lasts_too_long_ends_out_of_step() {
    let (frames, truth) = play(&scenario("[[event]]\nat = 10\nfault = \"HP2\"\nclear_ms = 1500\n"));
    assert!(truth.iter().any(|fact| fact.what == What::OutOfStep));
    let last = frames.last().unwrap();
    assert!(last.get("HP1.closed") == 0.0 && last.get("HP1.from.mw") == 0.0 && last.get("Hask.kv") > 300.0);
}

#[test]
fn between_infinite_buses_the_angle_only_follows() {
    let config = CONFIG.replace("stored_energy_mws = 20000\n", "");
    let day = format!(
        "hours = 0.02\ninterval_s = 1\n{EXACT}[[corridor]]\nname = \"Olt-Ume\"\nreports_angles = true\ntransfer_mw = 200\n\
         [[event]]\nat = 10\nfault = \"OM1\"\nplace = 0.5\n"
    );
    let (frames, truth) = play_with(&config, &day);
    assert!(truth.iter().all(|fact| fact.what != What::OutOfStep));
    let sent = |frame: &Played| frame.get("OM1.from.mw") + frame.get("OM2.from.mw");
    assert!((sent(&frames[9]) - 200.0).abs() < 1e-6);
    assert!((sent(&frames[11]) - sent(&frames[60])).abs() < 1e-9);
    assert!((sent(&frames[60]) - 200.0).abs() < 10.0);
}

#[test]
fn a_circuit_returns_only_where_the_angle_fits() {
    let refused = "reports_angles = true\ntransfer_mw = [[0, 500], [20, 1200], [120, 1200], [200, 400]]\n\
                   from = { e_kv = 432 }\n[[event]]\nat = 1\ntrip = \"HP2\"\n[[event]]\nat = 100\nreturn = \"HP2\"\n\
                   [[event]]\nat = 300\nreturn = \"HP2\"\n";
    let day = format!("hours = 0.1\ninterval_s = 1\n[[corridor]]\nname = \"Hask-Prell\"\n{refused}");
    let (frames, truth) = play(&day);
    let standing = |frame: &Played| frame.get("Hask.deg") - frame.get("Prell.deg");
    assert!(standing(&frames[99]) > 30.0 && standing(&frames[299]) < 30.0);
    assert!(frames[150].get("HP2.closed") == 0.0 && frames[301].get("HP2.closed") > 0.5);
    assert!(truth.iter().any(|fact| matches!(fact.what, What::CloseRefused { angle_deg, .. } if angle_deg > 30.0)));
}

#[test]
fn steps_move_what_they_should() {
    let more = "[[event]]\nat = 10\nstep = \"Hask\"\nkv = -4\n[[event]]\nat = 60\nstep = \"Prell\"\npct = 1\n\
                [[event]]\nat = 120\nimpedance = \"Hask\"\nr_ohm = 3\nx_ohm = 30\n[[event]]\nat = 200\nbypass = \"HP2-SC\"\n";
    let (frames, truth) = play(&scenario(more));
    let e = |frame: usize| hask_prell(&frames[frame]).map(|(e, _)| e.norm());
    assert!((e(110)[0] - 428.0).abs() < 1e-6 && (e(110)[1] - 420.0).abs() < 1e-6);
    assert!((e(700)[0] - 428.0).abs() < 1e-6 && (e(700)[1] - 424.2).abs() < 1e-6);
    let z = C64::new(3.0, 30.0);
    let (after, _) = behind(&frames[1500], "Hask", &["Hask", "HP1.from", "HP2.from"], z);
    assert!((after.norm() - 428.0).abs() < 1e-6);
    assert!(frames[2100].get("HP2.from.mw") < frames[1990].get("HP2.from.mw") - 20.0);
    assert!(frames[2100].get("HP2-SC.inserted") == 0.0);
    assert!(truth.iter().any(|fact| fact.what == What::Step { kv: [-4.0, 0.0] }));
}
