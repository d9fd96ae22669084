//! What a step was, and what it says about the impedances.
//!
//! With the terminal states before and after it, the voltages behind the sources may be eliminated: a side that did not
//! move has the same E = |V + Z·I| on both sides of the step, but for its background wander; a side that moved has it to
//! within the size of steps. So all four cases are the same two measurements, E_after − E_before = 0 for either side, with
//! different variances, of x = (Z, state before, state after). δ is free in all of them.

use nalgebra::{Complex, Matrix2, SMatrix, SVector, Vector2, Vector3, Vector4};

use super::{estimate::Belief, log::Moved, terminal::behind};

const CASES: [Moved; 4] = [Moved::Neither, Moved::From, Moved::To, Moved::Both];
/// Iterations of the extended Kalman update.
const ITERATIONS: usize = 5;
/// Stands for any change of a voltage that may move freely.
const FREE_KV: f64 = 1e4;

type State = SVector<f64, 10>;
type Covariance = SMatrix<f64, 10, 10>;
type Jacobian = SMatrix<f64, 2, 10>;

/// One side of a step: terminal state, its covariance, and the network at the time.
#[derive(Debug, Clone, Copy)]
pub(super) struct Moment {
    pub(super) state: Vector3<f64>,
    pub(super) covariance: nalgebra::Matrix3<f64>,
    pub(super) y: Matrix2<Complex<f64>>,
}

/// A step to be judged.
#[derive(Debug, Clone, Copy)]
pub(super) struct Event {
    pub(super) before: Moment,
    pub(super) after: Moment,
    /// Variance of the wander of each side's voltage, kV².
    pub(super) wander: [f64; 2],
    /// Variance of the voltage of a side that moves, kV².
    pub(super) move_variance: f64,
    /// Probabilities of the cases beforehand: neither, from, to, both.
    pub(super) prior: [f64; 4],
}

/// The step judged.
#[derive(Debug, Clone, Copy)]
pub(super) struct Verdict {
    pub(super) belief: Belief,
    /// Of the cases: neither, from, to, both.
    pub(super) probability: [f64; 4],
    pub(super) de_kv: [f64; 2],
    /// Neither, from, to, both; `None` where a case cannot be computed.
    pub(super) cases: [Option<Updated>; 4],
}

impl Verdict {
    pub(super) fn most_probable(&self) -> (Moved, f64) {
        let best = (0..4).max_by(|&a, &b| self.probability[a].total_cmp(&self.probability[b])).unwrap_or(0);
        (CASES[best], self.probability[best])
    }
}

/// One case, updated.
#[derive(Debug, Clone, Copy)]
pub(super) struct Updated {
    pub(super) belief: Belief,
    log_likelihood: f64,
    /// Normalised innovation: root of the squared sum over the sides that stood still.
    pub(super) innovation: f64,
}

impl Event {
    /// Updates each case, weighs it by its likelihood, and merges all to one mean and covariance (Bar-Shalom, Li and
    /// Kirubarajan 2001, 11.6). `None` where no case can be computed.
    pub(super) fn judge(&self, prior: &Belief) -> Option<Verdict> {
        let cases = CASES.map(|case| self.update(prior, case));
        let possible = prior.log_possible();
        let log_weight: [f64; 4] = std::array::from_fn(|k| match &cases[k] {
            Some(case) => self.prior[k].ln() + case.log_likelihood + case.belief.log_possible() - possible,
            None => f64::NEG_INFINITY,
        });
        let largest = log_weight.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        if !largest.is_finite() {
            return None;
        }
        let weight = log_weight.map(|w| (w - largest).exp());
        let total: f64 = weight.iter().sum();
        let probability = weight.map(|w| w / total);
        let belief = merge(&cases, &probability).pinned_as(prior);
        let de_kv = self.change(&belief.cut_at_zero().mean, &self.before.state, &self.after.state).0.into();
        Some(Verdict { belief, probability, de_kv, cases })
    }

    /// E_after − E_before of both sides, and its Jacobian.
    fn change(&self, z: &Vector4<f64>, before: &Vector3<f64>, after: &Vector3<f64>) -> (Vector2<f64>, Jacobian) {
        let old = behind(z, before, &self.before.y);
        let new = behind(z, after, &self.after.y);
        let mut jacobian = Jacobian::zeros();
        for side in 0..2 {
            for k in 0..2 {
                jacobian[(side, 2 * side + k)] = new[side].by_impedance[k] - old[side].by_impedance[k];
            }
            for k in 0..3 {
                jacobian[(side, 4 + k)] = -old[side].by_state[k];
                jacobian[(side, 7 + k)] = new[side].by_state[k];
            }
        }
        (Vector2::from_fn(|side, _| new[side].e_kv - old[side].e_kv), jacobian)
    }

    /// Iterated extended Kalman update (Bar-Shalom, Li and Kirubarajan 2001, 10.5.2), covariance in Joseph's form.
    ///
    /// A side that moved says nothing about its impedance: its size only weighs the case.
    pub(super) fn update(&self, prior: &Belief, case: Moved) -> Option<Updated> {
        let moved = [matches!(case, Moved::From | Moved::Both), matches!(case, Moved::To | Moved::Both)];
        let noise = |of_move: f64| {
            Matrix2::from_diagonal(&Vector2::from_fn(|side, _| {
                self.wander[side] + if moved[side] { of_move } else { 0.0 }
            }))
        };
        let free = noise(FREE_KV.powi(2));
        let mut mean = State::zeros();
        let mut covariance = Covariance::zeros();
        mean.fixed_rows_mut::<4>(0).copy_from(&prior.mean);
        mean.fixed_rows_mut::<3>(4).copy_from(&self.before.state);
        mean.fixed_rows_mut::<3>(7).copy_from(&self.after.state);
        covariance.fixed_view_mut::<4, 4>(0, 0).copy_from(&prior.covariance);
        covariance.fixed_view_mut::<3, 3>(4, 4).copy_from(&self.before.covariance);
        covariance.fixed_view_mut::<3, 3>(7, 7).copy_from(&self.after.covariance);

        let mut x = mean;
        for _ in 0..ITERATIONS {
            let (innovation, h) = self.innovation(&x, &mean);
            let spread = h * covariance * h.transpose() + free;
            x = mean + covariance * h.transpose() * spread.cholesky()?.solve(&innovation);
        }
        let (innovation, h) = self.innovation(&x, &mean);
        let gain = covariance * h.transpose() * (h * covariance * h.transpose() + free).cholesky()?.inverse();
        let rest = Covariance::identity() - gain * h;
        let posterior = rest * covariance * rest.transpose() + gain * free * gain.transpose();
        let spread = h * covariance * h.transpose() + noise(self.move_variance);
        let root = spread.cholesky()?;
        let distance = innovation.dot(&root.solve(&innovation));
        let still: f64 =
            (0..2).filter(|&side| !moved[side]).map(|side| innovation[side].powi(2) / spread[(side, side)]).sum();
        let covariance_z = symmetric(&posterior.fixed_view::<4, 4>(0, 0).into_owned());
        let mean_z = x.fixed_rows::<4>(0).into_owned();
        let of_state =
            h.fixed_view::<2, 6>(0, 4) * covariance.fixed_view::<6, 6>(4, 4) * h.fixed_view::<2, 6>(0, 4).transpose();
        let share = std::array::from_fn(|side| {
            if moved[side] { 0.0 } else { self.wander[side] / (self.wander[side] + of_state[(side, side)]) }
        });
        let belief =
            Belief { mean: mean_z + covariance_z * self.volume_slope(&mean_z, &share), covariance: covariance_z };
        let finite = belief.mean.iter().chain(belief.covariance.iter()).all(|v| v.is_finite());
        finite.then(|| Updated {
            belief,
            log_likelihood: -0.5 * (distance + root.determinant().ln()),
            innovation: still.sqrt(),
        })
    }

    /// The wander of a side's voltage drives its own current, so that least squares alone reads every impedance too small.
    /// The likelihood of what was measured holds the volume that the voltages behind the impedances gain over
    /// those at the terminals, |∂E/∂V|; this is the slope of its logarithm by the impedances, as far as wander and
    /// not noise makes up the residual (`share`).
    fn volume_slope(&self, z: &Vector4<f64>, share: &[f64; 2]) -> Vector4<f64> {
        const STEP_OHM: f64 = 1e-3;
        let log_volume = |z: &Vector4<f64>| {
            let [a, b] = behind(z, &self.after.state, &self.after.y).map(|side| side.by_state);
            (a[0] * b[1] - a[1] * b[0]).abs().max(f64::MIN_POSITIVE).ln()
        };
        Vector4::from_fn(|k, _| {
            let mut up = *z;
            let mut down = *z;
            up[k] += STEP_OHM;
            down[k] -= STEP_OHM;
            share[k / 2] * (log_volume(&up) - log_volume(&down)) / (2.0 * STEP_OHM)
        })
    }

    /// Innovation about the point `x` and its Jacobian.
    fn innovation(&self, x: &State, mean: &State) -> (Vector2<f64>, Jacobian) {
        let z = x.fixed_rows::<4>(0).into_owned();
        let (change, h) = self.change(&z, &x.fixed_rows::<3>(4).into_owned(), &x.fixed_rows::<3>(7).into_owned());
        (-change - h * (mean - x), h)
    }
}

fn merge(cases: &[Option<Updated>; 4], probability: &[f64; 4]) -> Belief {
    let weighted = || cases.iter().zip(probability).filter_map(|(case, p)| case.as_ref().map(|c| (&c.belief, *p)));
    let mean = weighted().fold(Vector4::zeros(), |sum, (belief, p)| sum + belief.mean * p);
    let covariance = weighted().fold(SMatrix::zeros(), |sum, (belief, p)| {
        let off = belief.mean - mean;
        sum + (belief.covariance + off * off.transpose()) * p
    });
    Belief { mean, covariance: symmetric(&covariance) }
}

fn symmetric(matrix: &SMatrix<f64, 4, 4>) -> SMatrix<f64, 4, 4> {
    (matrix + matrix.transpose()) * 0.5
}
