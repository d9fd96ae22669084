//! Textbook examples. Inputs and results are quoted from memory of the named books and were recomputed with numpy/scipy.
//! Per-unit data as they stand: 1 kV nominal, ohm = per unit, MW = per unit, stored energy = H.

use std::f64::consts::FRAC_PI_2;

use tautline::{
    desk::Assessment,
    margin::{Machine, Moment, PowerAngle, Swing},
};

use super::bench::{Values, assess, outage};

/// A machine behind X'd + transformer, two circuits, an infinite bus.
struct Example {
    source_x: f64,
    stored_energy: f64,
    circuits: [f64; 2],
    fault_at: f64,
    /// Terminal magnitude and angle, infinite bus.
    machine_kv: f64,
    machine_deg: f64,
    infinite_kv: f64,
}

impl Example {
    fn assess(&self) -> Assessment {
        let Self { source_x, stored_energy, circuits: [first, second], fault_at, .. } = self;
        let config = format!(
            r#"
            [grid]
            frequency_hz = 60
            [[corridor]]
            name = "Example"
            [corridor.from]
            bus = "Machine"
            nominal_kv = 1
            stored_energy_mws = {stored_energy}
            source = {{ r_ohm = 0, x_ohm = {source_x}, spread = 0.1 }}
            [corridor.to]
            bus = "Infinite"
            nominal_kv = 1
            source = {{ r_ohm = 0, x_ohm = 0 }}
            [[corridor.circuit]]
            name = "1"
            r_ohm = 0
            x_ohm = {first}
            b_us = 0
            [[corridor.circuit]]
            name = "2"
            r_ohm = 0
            x_ohm = {second}
            b_us = 0
            [corridor.fault]
            kind = "three-phase"
            at = {fault_at}
            clear_ms = 50
            "#
        );
        let mut values =
            Values::from([("Machine.kv".into(), self.machine_kv), ("Infinite.kv".into(), self.infinite_kv)]);
        for (name, x) in [("1", first), ("2", second)] {
            let angle = self.machine_deg.to_radians();
            let mw = self.machine_kv * self.infinite_kv * angle.sin() / x;
            let mvar = |own: f64, other: f64| (own * own - own * other * angle.cos()) / x;
            for (channel, value) in [
                ("from.mw", mw),
                ("from.mvar", mvar(self.machine_kv, self.infinite_kv)),
                ("to.mw", -mw),
                ("to.mvar", mvar(self.infinite_kv, self.machine_kv)),
            ] {
                values.insert(format!("{name}.{channel}"), value);
            }
        }
        assess(&config, &values)
    }
}

fn close(found: f64, published: f64, within: f64) {
    assert!((found - published).abs() <= within, "{found} instead of {published}");
}

/// The angle at which the fault must be cleared, by the critical clearing time and the fault-on swing.
fn critical_deg(assessment: &Assessment, name: &str, inertia: f64) -> f64 {
    let detail = assessment.detail.as_ref().expect("a state").picture;
    let judged = outage(assessment, name);
    let curve = judged.picture.and_then(|picture| picture.fault).expect("a fault");
    let swing = Swing { curve, p_m_mw: detail.p_m_mw, inertia };
    let seconds = judged.critical_ms.expect("reached") / 1000.0;
    swing.after(Moment::at_rest(detail.angle_rad), seconds).expect("it is slow").angle_rad.to_degrees()
}

/// Critical angle (degrees) and time (s) when the whole network is back after the fault: equal area on one curve.
fn both_back(assessment: &Assessment, fault_peak: f64, stored_energy: f64) -> (f64, f64) {
    let picture = assessment.detail.as_ref().expect("a state").picture;
    let PowerAngle { amplitude_mw: peak, .. } = picture.curve;
    let (start, p_m) = (picture.angle_rad, picture.p_m_mw);
    let tipping = 2.0 * FRAC_PI_2 - start;
    // Kundur 1994, §13.1; Kimbark 1948, ch. 5.
    let cosine = (p_m * (tipping - start) + peak * tipping.cos() - fault_peak * start.cos()) / (peak - fault_peak);
    let critical = cosine.acos();
    let machine = Machine::new([Some(stored_energy), None], 60.0);
    let swing = Swing { curve: PowerAngle::default(), p_m_mw: p_m, inertia: machine.inertia };
    let time = (2.0 * (critical - start) * machine.inertia / p_m).sqrt();
    close(swing.after(Moment::at_rest(start), time).expect("it is slow").angle_rad, critical, 1e-9);
    (critical.to_degrees(), time)
}

fn inertia(stored_energy: f64) -> f64 {
    Machine::new([Some(stored_energy), None], 60.0).inertia
}

/// Grainger & Stevenson, Power System Analysis (1994), ch. 16.
#[test]
fn grainger_and_stevenson_chapter_16() {
    let example = Example {
        source_x: 0.3,
        stored_energy: 5.0,
        circuits: [0.4, 0.4],
        fault_at: 0.5,
        machine_kv: 1.0,
        machine_deg: 17.458,
        infinite_kv: 1.0,
    };
    // X'd 0.2 + transformer 0.1: the terminal held at 1.0 is the machine's, before the transformer.
    let terminal_deg = 0.3_f64.asin().to_degrees();
    close(terminal_deg, example.machine_deg, 1e-3);
    // The high-voltage bus, from the terminal's voltage and current.
    let (sin, cos) = terminal_deg.to_radians().sin_cos();
    let (re, im) = (cos * 0.2 / 0.3 + 0.1 / 0.3, sin * 0.2 / 0.3);
    let example = Example { machine_kv: re.hypot(im), machine_deg: im.atan2(re).to_degrees(), ..example };
    let assessment = example.assess();
    let picture = assessment.detail.as_ref().expect("a state").picture;
    close(assessment.sources[0].e_kv.expect("known"), 1.05, 0.001);
    close(assessment.internal_angle_deg.expect("known"), 28.44, 0.01);
    close(picture.p_m_mw, 1.0, 1e-9);
    close(picture.curve.amplitude_mw, 2.10, 0.001);
    let lost = outage(&assessment, "1");
    let curves = lost.picture.expect("drawn");
    close(curves.fault.expect("a fault").amplitude_mw, 0.808, 0.001);
    close(curves.curve.amplitude_mw, 1.5, 0.001);
    close(critical_deg(&assessment, "1", inertia(5.0)), 82.7, 0.1);
    let (angle, time) = both_back(&assessment, 0.0, 5.0);
    close(angle, 81.7, 0.1);
    close(time, 0.222, 0.001);
}

/// Saadat, Power System Analysis (1999), ch. 11.
#[test]
fn saadat_chapter_11() {
    // The machine's transformer side from the infinite bus that receives 0.8 + j0.074 at 1.0.
    let (re, im) = (1.0 + 0.15 * 0.074, 0.15 * 0.8);
    let example = Example {
        source_x: 0.5,
        stored_energy: 5.0,
        circuits: [0.3, 0.3],
        fault_at: 0.5,
        machine_kv: f64::hypot(re, im),
        machine_deg: f64::atan2(im, re).to_degrees(),
        infinite_kv: 1.0,
    };
    let assessment = example.assess();
    close(assessment.sources[0].e_kv.expect("known"), 1.17, 0.001);
    close(assessment.internal_angle_deg.expect("known"), 26.388, 0.01);
    let curves = outage(&assessment, "1").picture.expect("drawn");
    close(curves.fault.expect("a fault").amplitude_mw, 0.65, 0.001);
    close(curves.curve.amplitude_mw, 1.4625, 0.001);
    close(critical_deg(&assessment, "1", inertia(5.0)), 98.834, 0.05);
    close(outage(&assessment, "1").critical_ms.expect("reached"), 411.0, 2.0);
    let (angle, time) = both_back(&assessment, 0.0, 5.0);
    close(angle, 84.775, 0.05);
    close(time, 0.260, 0.001);
}

/// Kundur, Power System Stability and Control (1994), example 13.1.
#[test]
fn kundur_example_13_1() {
    // From the machine's terminal, 1.0 at 28.34° with 0.9 + j0.436, through its transformer of 0.15.
    let turned = 28.34_f64.to_radians();
    let (re, im) = (1.0 - 0.15 * 0.436, -0.15 * 0.9);
    let angle = turned + f64::atan2(im, re);
    let example = Example {
        source_x: 0.45,
        stored_energy: 3.5,
        circuits: [0.5, 0.93],
        fault_at: 0.0,
        machine_kv: f64::hypot(re, im),
        machine_deg: angle.to_degrees(),
        infinite_kv: 0.90081,
    };
    let assessment = example.assess();
    let picture = assessment.detail.as_ref().expect("a state").picture;
    close(assessment.sources[0].e_kv.expect("known"), 1.1626, 0.001);
    close(assessment.internal_angle_deg.expect("known"), 41.77, 0.02);
    close(picture.curve.amplitude_mw, 1.351, 0.001);
    let lost = outage(&assessment, "2");
    close(lost.picture.expect("drawn").curve.amplitude_mw, 1.1024, 0.001);
    close(critical_deg(&assessment, "2", inertia(3.5)), 52.24, 0.05);
    let critical_ms = lost.critical_ms.expect("reached");
    close(critical_ms, 86.8, 0.3);
    assert!(critical_ms > 70.0 && critical_ms < 87.0, "stable at 0.07 s, unstable at 0.087 s: {critical_ms}");
}

/// Kundur (1994), two-area system of example 12.6 with classical machines and constant-admittance loads: a
/// four-machine time-domain run (scipy) clears a fault at bus 7 with loss of one 7-8 circuit until 158 to 160 ms.
#[test]
fn kundur_two_areas_against_four_machines() {
    let config = include_str!("../cases/two-area/config.toml");
    let frames = include_bytes!("../cases/two-area/frames.jsonl");
    let assessment = super::bench::assess_lines(config, frames).remove(0);
    close(outage(&assessment, "7-8 a").critical_ms.expect("reached"), 159.0, 0.05 * 159.0);
}

/// Dunlop, Gutman & Marchenko (1979) after St. Clair (1953): Kundur's (1994, table 6.1) lines between two systems of
/// 50 kA, 5 % voltage drop or 30 % stability margin: about 1.0 SIL over 300 miles, 0.8 over 400, at about 44°.
#[test]
fn long_lines_carry_what_the_loadability_curve_says() {
    let lines: [[f64; 4]; 3] = [[345.0, 0.037, 0.367, 4.518], [500.0, 0.028, 0.325, 5.2], [765.0, 0.012, 0.329, 4.978]];
    for [nominal_kv, r, x, b] in lines {
        let sil = nominal_kv * nominal_kv / (x / (b * 1e-6)).sqrt();
        for (miles, of_sil) in [(300.0, 1.0), (400.0, 0.8)] {
            let source_x = nominal_kv / 3.0_f64.sqrt() / 50.0;
            let found = loadability(nominal_kv, [r, x, b], miles * 1.609, source_x) / sil;
            close(found, of_sil, 0.13);
        }
    }
}

/// The transfer at an angle of asin(0.7) between the sources, both terminals held at nominal and 95 % voltage: the
/// stability limit that sets long lines, by the angle limit of the intact corridor.
fn loadability(nominal_kv: f64, [r, x, b]: [f64; 3], length_km: f64, source_x: f64) -> f64 {
    use tautline::network::{C64, TwoPort};
    let z = C64::new(r, x) * length_km;
    let y = C64::new(0.0, b * 1e-6) * length_km;
    let line = TwoPort::line(z, y);
    // The terminal angle that brings the internal angle to 44°, by bisection: both grow together.
    let (mut low, mut high) = (0.0_f64, FRAC_PI_2);
    let flows = |angle: f64| {
        let (sent, received) = (C64::from_polar(nominal_kv, angle), C64::new(0.95 * nominal_kv, 0.0));
        let into = (line.d * sent - received) / line.b;
        let out_of = (sent - line.a * received) / line.b;
        let behind =
            (sent + C64::new(0.0, source_x) * into).arg() - (received - C64::new(0.0, source_x) * out_of).arg();
        ((received * out_of.conj()).re, behind.to_degrees())
    };
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if flows(middle).1 < 44.0 { low = middle } else { high = middle }
    }
    flows(low).0
}
