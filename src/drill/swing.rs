//! The two-machine swing, damped.

use crate::margin::PowerAngle;

/// Longest step of the integration, s: about a two-hundredth of the period of common swings.
const LONGEST_STEP_S: f64 = 0.004;

/// The angle between the sides and how fast it opens.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Swing {
    /// Internal angle, `from` minus `to`, rad.
    pub angle_rad: f64,
    /// Its speed, rad/s.
    pub speed_rad_per_s: f64,
}

/// What resists the swing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Inertia {
    /// M, MW·s²/rad.
    pub m: f64,
    /// Time in which a swing fades to 1/e, s.
    pub decay_s: f64,
}

impl Inertia {
    /// M = 2/ω_s · W1·W2/(W1 + W2), an infinite bus having none of its own (Kimbark 1948, vol. 1, ch. 5).
    ///
    /// `None` where both sides are infinite.
    pub fn of(stored_energy_mws: [Option<f64>; 2], frequency_hz: f64, decay_s: f64) -> Option<Self> {
        let joint_mws = match stored_energy_mws {
            [Some(from), Some(to)] => from * to / (from + to),
            [one, other] => one.or(other)?,
        };
        Some(Self { m: joint_mws / (std::f64::consts::PI * frequency_hz), decay_s })
    }

    /// Angular frequency of small swings about a curve's zero, rad/s: √(D/M) (Kundur 1994, §12.3).
    pub fn pace(self, curve: &PowerAngle) -> f64 {
        (curve.amplitude_mw / self.m).sqrt()
    }
}

impl Swing {
    /// Follows M δ'' = P_m − P_e(δ) − (2M/τ) δ' for a time (Kundur 1994, §13.1), by the classical Runge-Kutta method.
    pub fn advance(&mut self, curve: &PowerAngle, p_m_mw: f64, inertia: Inertia, time_s: f64) {
        let steps = (time_s / LONGEST_STEP_S).ceil();
        let h = time_s / steps;
        let slope =
            |[angle, speed]: [f64; 2]| [speed, (p_m_mw - curve.at(angle)) / inertia.m - 2.0 / inertia.decay_s * speed];
        let mut state = [self.angle_rad, self.speed_rad_per_s];
        let mut step = 0.0;
        while step < steps {
            let along = |k: [f64; 2], h: f64| [state[0] + h * k[0], state[1] + h * k[1]];
            let k1 = slope(state);
            let k2 = slope(along(k1, h / 2.0));
            let k3 = slope(along(k2, h / 2.0));
            let k4 = slope(along(k3, h));
            state = [0, 1].map(|i| state[i] + h / 6.0 * (k1[i] + 2.0 * (k2[i] + k3[i]) + k4[i]));
            step += 1.0;
        }
        [self.angle_rad, self.speed_rad_per_s] = state;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const CURVE: PowerAngle = PowerAngle { mean_mw: 40.0, amplitude_mw: 2400.0, shift_rad: 0.02 };
    const P_M_MW: f64 = 1300.0;

    fn energy(swing: Swing, m: f64) -> f64 {
        let potential = -P_M_MW * swing.angle_rad + CURVE.mean_mw * swing.angle_rad
            - CURVE.amplitude_mw * (swing.angle_rad - CURVE.shift_rad).cos();
        0.5 * m * swing.speed_rad_per_s.powi(2) + potential
    }

    #[test]
    fn without_damping_the_energy_stays() {
        let inertia = Inertia { m: 200.0, decay_s: f64::INFINITY };
        let mut swing = Swing { angle_rad: 1.2, speed_rad_per_s: 0.0 };
        let began = energy(swing, inertia.m);
        for _ in 0..200 {
            swing.advance(&CURVE, P_M_MW, inertia, 0.1);
            assert!((energy(swing, inertia.m) - began).abs() < 1e-7 * began.abs());
        }
    }

    #[test]
    fn with_damping_the_energy_only_falls_and_the_angle_comes_to_rest() {
        let inertia = Inertia { m: 200.0, decay_s: 3.0 };
        let mut swing = Swing { angle_rad: 1.2, speed_rad_per_s: 0.0 };
        let mut last = energy(swing, inertia.m);
        for _ in 0..600 {
            swing.advance(&CURVE, P_M_MW, inertia, 0.05);
            let now = energy(swing, inertia.m);
            assert!(now <= last + 1e-9 * last.abs());
            last = now;
        }
        let rest = CURVE.shift_rad + ((P_M_MW - CURVE.mean_mw) / CURVE.amplitude_mw).asin();
        assert!((swing.angle_rad - rest).abs() < 1e-4);
    }

    #[test]
    fn a_small_swing_fades_as_configured() {
        let inertia = Inertia { m: 200.0, decay_s: 3.0 };
        let rest = CURVE.shift_rad + ((P_M_MW - CURVE.mean_mw) / CURVE.amplitude_mw).asin();
        // Linear theory: δ'' + 2δ'/τ + ω²δ = 0 rings at √(ω² − 1/τ²).
        let stiffness = CURVE.amplitude_mw * (rest - CURVE.shift_rad).cos() / inertia.m;
        let period_s = std::f64::consts::TAU / (stiffness - 1.0 / 9.0).sqrt();
        let mut swing = Swing { angle_rad: rest + 1e-5, speed_rad_per_s: 0.0 };
        swing.advance(&CURVE, P_M_MW, inertia, 3.0 * period_s);
        let expected = 1e-5 * (-3.0 * period_s / inertia.decay_s).exp();
        assert!(((swing.angle_rad - rest) / expected - 1.0).abs() < 1e-3);
    }

    #[test]
    fn an_infinite_bus_has_no_inertia_of_its_own() {
        let m = |stored| Inertia::of(stored, 50.0, 1.0).map(|inertia| inertia.m);
        let alone = 60_000.0 / (std::f64::consts::PI * 50.0);
        assert_eq!(m([Some(60_000.0), None]), Some(alone));
        assert_eq!(m([None, Some(60_000.0)]), Some(alone));
        assert_eq!(m([Some(120_000.0), Some(120_000.0)]), Some(alone));
        assert_eq!(m([None, None]), None);
    }
}
