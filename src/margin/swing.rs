//! The swing of one machine on one curve, by Taylor series with error control (Jorba and Zou, Experimental
//! Mathematics 14, 2005): M δ'' = P_m − C − D sin(δ − γ) is analytic, so a step of high order spans a clearing time.

use super::PowerAngle;

const ORDER: usize = 16;
/// A step spans about a radian: more of them are a swing too quick to be that of any grid.
const MOST_STEPS: usize = 1000;
/// Largest last term of a step, rad.
const TOLERANCE_RAD: f64 = 1e-13;

/// 1/k.
const RECIPROCAL: [f64; ORDER + 1] = {
    let mut reciprocal = [0.0; ORDER + 1];
    let mut k = 1;
    while k <= ORDER {
        reciprocal[k] = 1.0 / k as f64;
        k += 1;
    }
    reciprocal
};

/// M δ'' = P_m − P(δ).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Swing {
    /// P(δ), MW.
    pub curve: PowerAngle,
    /// P_m, MW.
    pub p_m_mw: f64,
    /// M, MW·s²/rad.
    pub inertia: f64,
}

/// A moment of a swing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Moment {
    /// Since its start, s.
    pub time_s: f64,
    /// δ, rad.
    pub angle_rad: f64,
    /// δ', rad/s.
    pub speed_rad_s: f64,
}

impl Moment {
    /// At rest at an angle.
    pub fn at_rest(angle_rad: f64) -> Self {
        Self { time_s: 0.0, angle_rad, speed_rad_s: 0.0 }
    }
}

/// Taylor coefficients of the angle around a moment.
struct Jet {
    start: Moment,
    angle: [f64; ORDER + 1],
}

impl Swing {
    /// Kinetic energy, MW·rad.
    pub fn kinetic(&self, moment: &Moment) -> f64 {
        0.5 * self.inertia * moment.speed_rad_s * moment.speed_rad_s
    }

    /// Swings on for a time; `None` when it is too quick to be followed.
    pub fn after(&self, mut moment: Moment, duration_s: f64) -> Option<Moment> {
        let end = moment.time_s + duration_s;
        for _ in 0..MOST_STEPS {
            let jet = self.jet(moment);
            let left = end - moment.time_s;
            if jet.last_term(left) <= TOLERANCE_RAD {
                let reached = Moment { time_s: end, ..jet.at(left) };
                return (reached.angle_rad + self.kinetic(&reached)).is_finite().then_some(reached);
            }
            moment = jet.at(jet.reach_s().min(left));
        }
        None
    }

    /// The time at which it gets from rest at one angle to another; `None` where it turns before, or within `limit_s`.
    pub(super) fn time_between(&self, start_rad: f64, target_rad: f64, limit_s: f64) -> Option<f64> {
        let ahead = (target_rad - start_rad).signum();
        let mut moment = Moment::at_rest(start_rad);
        while moment.time_s < limit_s {
            let jet = self.jet(moment);
            let length = jet.reach_s().min(limit_s - moment.time_s);
            let short = |time_s: f64| ahead * (target_rad - jet.at(time_s).angle_rad);
            let speed = |time_s: f64| ahead * jet.at(time_s).speed_rad_s;
            let turned = speed(length) <= 0.0;
            let end = if turned {
                let start = 1e-6 * length;
                super::root::bracketed((start, speed(start)), (length, speed(length)), 1e-12, speed)
            } else {
                length
            };
            if short(end) <= 0.0 {
                return Some(
                    moment.time_s + super::root::bracketed((0.0, short(0.0)), (end, short(end)), 1e-10, short),
                );
            }
            if turned {
                return None;
            }
            moment = jet.at(length);
        }
        None
    }

    fn jet(&self, start: Moment) -> Jet {
        // From rest, time runs alike both ways, and only the even terms are there.
        if start.speed_rad_s == 0.0 { self.series::<2>(start) } else { self.series::<1>(start) }
    }

    /// By the recursion (sin)' = cos·δ', (cos)' = −sin·δ' over every `STRIDE`-th term.
    fn series<const STRIDE: usize>(&self, start: Moment) -> Jet {
        let mut angle = [0.0; ORDER + 1];
        // slope[i] = i · angle[i], the coefficients of t·δ'.
        let mut slope = [0.0; ORDER + 1];
        let mut sin = [0.0; ORDER + 1];
        let mut cos = [0.0; ORDER + 1];
        (sin[0], cos[0]) = (start.angle_rad - self.curve.shift_rad).sin_cos();
        angle[0] = start.angle_rad;
        angle[1] = start.speed_rad_s;
        slope[1] = start.speed_rad_s;
        let restoring = self.curve.amplitude_mw / self.inertia;
        let mut acceleration = (self.p_m_mw - self.curve.mean_mw) / self.inertia - restoring * sin[0];
        let mut k = 0;
        loop {
            slope[k + 2] = acceleration * RECIPROCAL[k + 1];
            angle[k + 2] = slope[k + 2] * RECIPROCAL[k + 2];
            k += STRIDE;
            if k > ORDER - 2 {
                return Jet { start, angle };
            }
            let (mut up, mut down) = (0.0, 0.0);
            for j in (0..k).step_by(STRIDE) {
                up += slope[k - j] * cos[j];
                down += slope[k - j] * sin[j];
            }
            sin[k] = up * RECIPROCAL[k];
            cos[k] = -down * RECIPROCAL[k];
            acceleration = -restoring * sin[k];
        }
    }
}

impl Jet {
    fn at(&self, time_s: f64) -> Moment {
        let (mut angle_rad, mut speed_rad_s) = (0.0, 0.0);
        for coefficient in self.angle.iter().rev() {
            speed_rad_s = speed_rad_s * time_s + angle_rad;
            angle_rad = angle_rad * time_s + coefficient;
        }
        Moment { time_s: self.start.time_s + time_s, angle_rad, speed_rad_s }
    }

    /// The larger of the last two terms after a time: from rest, every other term is zero.
    fn last_term(&self, time_s: f64) -> f64 {
        const { assert!(ORDER == 16) };
        let power = time_s.powi(15);
        (self.angle[ORDER - 1] * power).abs().max((self.angle[ORDER] * power * time_s).abs())
    }

    /// The time for which the last terms stay within the tolerance.
    fn reach_s(&self) -> f64 {
        let reach = |order: usize| (TOLERANCE_RAD / self.angle[order].abs()).powf(1.0 / order as f64);
        reach(ORDER).min(reach(ORDER - 1))
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn swing() -> Swing {
        let curve = PowerAngle { mean_mw: 40.0, amplitude_mw: 700.0, shift_rad: 0.1 };
        Swing { curve, p_m_mw: 1000.0, inertia: 60.0 }
    }

    /// scipy 1.x, solve_ivp DOP853 with rtol = atol = 1e-13, of 60 δ'' = 1000 − 40 − 700 sin(δ − 0.1) from (0.5, 0).
    #[test]
    fn agrees_with_scipy() {
        for (time_s, angle_rad, speed_rad_s) in [
            (0.1, 0.556_775_315_237_833_9, 1.125_421_507_077_01),
            (0.4, 1.303_854_553_502_364_7, 3.550_077_038_794_47),
            (1.0, 4.828_878_434_395_638, 10.835_932_041_062_215),
        ] {
            let moment = swing().after(Moment::at_rest(0.5), time_s).expect("it is slow");
            assert!((moment.angle_rad - angle_rad).abs() < 1e-10, "{moment:?}");
            assert!((moment.speed_rad_s - speed_rad_s).abs() < 1e-9, "{moment:?}");
        }
    }

    /// A constant push: δ = δ0 + t²·P/(2M).
    #[test]
    fn a_dead_short_accelerates_evenly() {
        let swing = Swing { curve: PowerAngle::default(), p_m_mw: 500.0, inertia: 80.0 };
        let moment = swing.after(Moment::at_rest(0.3), 0.25).expect("it is slow");
        assert!((moment.angle_rad - (0.3 + 0.25 * 0.25 * 500.0 / 160.0)).abs() < 1e-14);
    }

    #[test]
    fn an_angle_is_reached_on_the_way_and_never_past_the_turn() {
        let swing = swing();
        let at = swing.after(Moment::at_rest(0.5), 0.37).expect("it is slow");
        let time = swing.time_between(0.5, at.angle_rad, 2.0).expect("it passes there");
        assert!((time - 0.37).abs() < 1e-9);
        let stable = Swing { p_m_mw: 200.0, ..swing };
        assert_eq!(stable.time_between(0.3, 2.0, 60.0), None);
        assert_eq!(swing.time_between(0.5, 0.4, 2.0), None, "it goes the other way");
        let even = Swing { curve: PowerAngle::default(), p_m_mw: 500.0, inertia: 80.0 };
        let time = even.time_between(0.0, 1.0, 2.0).expect("a constant push gets everywhere");
        assert!((time - (160.0_f64 / 500.0).sqrt()).abs() < 1e-9);
    }

    proptest! {
        #[test]
        fn energy_is_conserved(
            mean in -500.0..500.0, amplitude in 0.0..5000.0, shift in -0.5..0.5, p_m in -3000.0..3000.0,
            inertia in 30.0..1000.0, start in -1.0..2.5, duration in 0.0..3.0,
        ) {
            let curve = PowerAngle { mean_mw: mean, amplitude_mw: amplitude, shift_rad: shift };
            let swing = Swing { curve, p_m_mw: p_m, inertia };
            let potential = |angle: f64| (mean - p_m) * angle - amplitude * (angle - shift).cos();
            let moment = swing.after(Moment::at_rest(start), duration).expect("it is slow");
            let gained = swing.kinetic(&moment) + potential(moment.angle_rad) - potential(start);
            let scale = amplitude + swing.kinetic(&moment) + (mean - p_m).abs();
            prop_assert!(gained.abs() <= 1e-8 * scale, "{gained} of {scale}");
        }
    }
}
