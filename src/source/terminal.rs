//! The corridor seen from its two terminals: voltages, currents, and the voltages behind the sources.

use chrono::{DateTime, Utc};
use nalgebra::{Complex, Matrix2, Matrix3, SMatrix, SVector, Vector3};

/// Measured at the terminals: kV `from`, kV `to`, MW `from`, MW `to`, Mvar `from`, Mvar `to`.
pub(super) type Measured = SVector<f64, 6>;
/// Covariance of [`Measured`].
pub(super) type MeasuredCovariance = SMatrix<f64, 6, 6>;
/// R `from`, X `from`, R `to`, X `to`, ohm.
pub(super) type Impedances = SVector<f64, 4>;

/// One corridor at one frame, seen from its two terminals.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Observation {
    /// The frame's time.
    pub time: DateTime<Utc>,
    /// Line-to-line voltage at `from` and `to`, kV.
    pub kv: [f64; 2],
    /// Active power that leaves each source: into the circuits and the terminal's load, MW.
    pub mw: [f64; 2],
    /// Reactive power, likewise, Mvar.
    pub mvar: [f64; 2],
    /// Admittance matrix of circuits and loads, the terminals' included, reduced to the terminals, siemens.
    pub y: Matrix2<Complex<f64>>,
    /// Any number that changes when a status changes.
    pub topology: u64,
    /// Metering class (standard deviation) of kV, MW and Mvar, `from` and `to` each, in their units.
    pub sigma: [f64; 6],
    /// Whether the frame agrees with itself.
    pub fit_ok: bool,
}

impl Observation {
    pub(super) fn measured(&self) -> Measured {
        Measured::new(self.kv[0], self.kv[1], self.mw[0], self.mw[1], self.mvar[0], self.mvar[1])
    }

    pub(super) fn is_usable(&self) -> bool {
        self.fit_ok
            && self.kv.iter().all(|kv| *kv > 0.0)
            && self.sigma.iter().all(|s| s.is_finite() && *s > 0.0)
            && self.measured().iter().all(|z| z.is_finite() && z.abs() < 1e9)
            && self.y.iter().all(|y| y.re.is_finite() && y.im.is_finite())
    }
}

/// Terminal voltages that fit a set of measurements best.
#[derive(Debug, Clone, Copy)]
pub(super) struct Terminal {
    /// kV `from`, kV `to`, angle of `from` against `to` in radians.
    pub(super) state: Vector3<f64>,
    /// What a small change of each measurement does to the state.
    pub(super) gain: SMatrix<f64, 3, 6>,
}

/// Magnitude of the voltage behind a source, and its derivatives.
#[derive(Debug, Clone, Copy)]
pub(super) struct Behind {
    pub(super) e_kv: f64,
    /// By R and X, kV/ohm.
    pub(super) by_impedance: [f64; 2],
    /// By the terminal state.
    pub(super) by_state: Vector3<f64>,
}

impl Terminal {
    /// Weighted least squares, Gauss-Newton (Schweppe 1970). `None` where the measurements do not fix a state.
    pub(super) fn fit(measured: &Measured, sigma: &[f64; 6], y: &Matrix2<Complex<f64>>) -> Option<Self> {
        const ITERATIONS: usize = 4;
        let mut state = Vector3::new(measured[0], measured[1], angle(measured, y)?);
        let mut gain = SMatrix::zeros();
        for _ in 0..ITERATIONS {
            let (predicted, jacobian) = predict(&state, y);
            let mut weighted = jacobian.transpose();
            for (mut column, sigma) in weighted.column_iter_mut().zip(sigma) {
                column /= sigma * sigma;
            }
            gain = (weighted * jacobian).cholesky()?.inverse() * weighted;
            state += gain * (measured - predicted);
        }
        let fits = state.iter().all(|s| s.is_finite()) && state[0] > 0.0 && state[1] > 0.0;
        fits.then_some(Self { state, gain })
    }
}

/// The angle across the corridor that the `from` end alone says.
fn angle(measured: &Measured, y: &Matrix2<Complex<f64>>) -> Option<f64> {
    let kv = measured[0];
    let current = Complex::new(measured[2], -measured[4]) / kv;
    let far = (current - y[(0, 0)] * kv) / y[(0, 1)];
    let angle = -far.arg();
    (angle.is_finite() && y[(0, 1)].norm() > 1e-9).then_some(angle)
}

/// Voltages and currents in each terminal's own frame (its voltage real), with the currents' derivatives by the state.
fn currents(state: &Vector3<f64>, y: &Matrix2<Complex<f64>>) -> [(Complex<f64>, [Complex<f64>; 3]); 2] {
    let j = Complex::<f64>::i();
    let turn = Complex::from_polar(1.0, state[2]);
    let from_share = y[(0, 1)] * turn.conj();
    let to_share = y[(1, 0)] * turn;
    [
        (y[(0, 0)] * state[0] + from_share * state[1], [y[(0, 0)], from_share, -j * from_share * state[1]]),
        (y[(1, 1)] * state[1] + to_share * state[0], [to_share, y[(1, 1)], j * to_share * state[0]]),
    ]
}

/// What would be measured, S = V·conj(I), and its derivatives by the state.
fn predict(state: &Vector3<f64>, y: &Matrix2<Complex<f64>>) -> (Measured, SMatrix<f64, 6, 3>) {
    let mut measured = Measured::zeros();
    let mut jacobian = SMatrix::zeros();
    for (end, (current, slopes)) in currents(state, y).into_iter().enumerate() {
        let kv = state[end];
        measured[end] = kv;
        measured[2 + end] = kv * current.re;
        measured[4 + end] = -kv * current.im;
        jacobian[(end, end)] = 1.0;
        for (k, slope) in slopes.into_iter().enumerate() {
            let own = if k == end { current } else { Complex::ZERO };
            let power = (slope * kv + own).conj();
            jacobian[(2 + end, k)] = power.re;
            jacobian[(4 + end, k)] = power.im;
        }
    }
    (measured, jacobian)
}

/// E = |V + Z·I| behind both terminals (Vu et al. 1999).
pub(super) fn behind(z: &Impedances, state: &Vector3<f64>, y: &Matrix2<Complex<f64>>) -> [Behind; 2] {
    let both = currents(state, y);
    std::array::from_fn(|end| {
        let (current, slopes) = both[end];
        let impedance = Complex::new(z[2 * end], z[2 * end + 1]);
        let e = impedance * current + state[end];
        let magnitude = e.norm().max(f64::MIN_POSITIVE);
        let along = |change: Complex<f64>| (e.conj() * change).re / magnitude;
        Behind {
            e_kv: magnitude,
            by_impedance: [along(current), along(Complex::<f64>::i() * current)],
            by_state: Vector3::from_fn(|k, _| {
                along(impedance * slopes[k] + if k == end { Complex::ONE } else { Complex::ZERO })
            }),
        }
    })
}

/// Covariance of a state fitted to a mean of `count` measurements.
pub(super) fn state_covariance(fit: &Terminal, noise: &MeasuredCovariance, count: usize) -> Matrix3<f64> {
    fit.gain * noise * fit.gain.transpose() / count as f64
}
