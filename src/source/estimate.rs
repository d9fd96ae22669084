//! What is known of both impedances: a normal distribution, and what remains of it where R ≥ 0 and X > 0.

use nalgebra::{Complex, Matrix4, Vector4};
use serde::{Deserialize, Serialize};
use statrs::function::erf::erfc;

use crate::grid::ConfiguredSource;

/// Both sides' Thevenin impedances as they are known now: R `from`, X `from`, R `to`, X `to`, ohm.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Estimate {
    /// Mean.
    pub mean: Vector4<f64>,
    /// Covariance.
    pub covariance: Matrix4<f64>,
    /// Steps that each side's impedance was learned from.
    pub steps: [u64; 2],
}

impl Estimate {
    /// As configured.
    pub fn configured(sources: &[ConfiguredSource; 2]) -> Self {
        let [a, b] = sources;
        let sd = Vector4::new(a.r_sd_ohm(), a.x_sd_ohm(), b.r_sd_ohm(), b.x_sd_ohm());
        Self {
            mean: Vector4::new(a.r_ohm, a.x_ohm, b.r_ohm, b.x_ohm),
            covariance: Matrix4::from_diagonal(&sd.component_mul(&sd)),
            steps: [0, 0],
        }
    }

    /// The impedances behind `from` and `to`, ohm.
    pub fn z_ohm(&self) -> [Complex<f64>; 2] {
        [0, 2].map(|k| Complex::new(self.mean[k], self.mean[k + 1]))
    }

    /// Standard deviation of each.
    pub fn sd(&self) -> Vector4<f64> {
        self.covariance.diagonal().map(|v| v.max(0.0).sqrt())
    }
}

/// A normal distribution of the four, not yet cut off at zero: the cut is knowledge from elsewhere, to be applied once.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub(super) struct Belief {
    pub(super) mean: Vector4<f64>,
    pub(super) covariance: Matrix4<f64>,
}

impl Belief {
    pub(super) fn configured(sources: &[ConfiguredSource; 2]) -> Self {
        let Estimate { mean, covariance, .. } = Estimate::configured(sources);
        Self { mean, covariance }
    }

    /// The same with one side's spread as configured.
    pub(super) fn opened(&self, side: usize, configured: &Self) -> Self {
        let mut open = *self;
        for k in [2 * side, 2 * side + 1] {
            open.covariance.row_mut(k).fill(0.0);
            open.covariance.column_mut(k).fill(0.0);
            open.covariance[(k, k)] = configured.covariance[(k, k)];
        }
        open
    }

    /// The same with what `other` is sure of exactly as it is there.
    pub(super) fn pinned_as(&self, other: &Self) -> Self {
        let mut pinned = *self;
        for k in (0..4).filter(|&k| other.covariance[(k, k)] <= 0.0) {
            pinned.mean[k] = other.mean[k];
            pinned.covariance.row_mut(k).fill(0.0);
            pinned.covariance.column_mut(k).fill(0.0);
        }
        pinned
    }

    /// The same with a covariance larger by `factor`, but no spread beyond the configured one.
    pub(super) fn scaled(&self, factor: f64, configured: &Self) -> Self {
        let root = Vector4::from_fn(|k, _| {
            let room = configured.covariance[(k, k)] / self.covariance[(k, k)];
            if room.is_finite() { factor.min(room.max(1.0)).sqrt() } else { 1.0 }
        });
        let scale = Matrix4::from_diagonal(&root);
        Self { mean: self.mean, covariance: scale * self.covariance * scale }
    }

    /// Whether it is a distribution that learning can come to from the configured one.
    pub(super) fn is_within(&self, configured: &Self) -> bool {
        const ROUNDING: f64 = 1e-9;
        let largest = configured.covariance.diagonal().max();
        self.mean.iter().chain(&self.covariance).all(|v| v.is_finite() && v.abs() < 1e6)
            && (self.covariance - self.covariance.transpose()).amax() <= ROUNDING * largest
            && self.covariance.symmetric_eigenvalues().min() >= -ROUNDING * largest
            && (0..4).all(|k| {
                let pinned = configured.covariance[(k, k)] <= 0.0;
                !pinned || (self.covariance[(k, k)] == 0.0 && (self.mean[k] - configured.mean[k]).abs() <= ROUNDING)
            })
    }

    /// Logarithm of the probability that all four are possible, each taken alone.
    pub(super) fn log_possible(&self) -> f64 {
        (0..4)
            .filter(|&k| self.covariance[(k, k)] > 0.0)
            .map(|k| log_normal_cdf(self.mean[k] / self.covariance[(k, k)].sqrt()))
            .sum()
    }

    /// Mean and covariance given that all four are possible: moments of the truncated normal, one coordinate after the
    /// other (Johnson, Kotz and Balakrishnan, *Continuous Univariate Distributions* 1, 1994, ch. 13).
    pub(super) fn cut_at_zero(&self) -> Self {
        let mut belief = *self;
        for k in [1, 3, 0, 2] {
            belief.cut_one(k);
        }
        belief
    }

    fn cut_one(&mut self, k: usize) {
        let variance = self.covariance[(k, k)];
        if variance <= 0.0 {
            return;
        }
        let sd = variance.sqrt();
        let at = -self.mean[k] / sd;
        let hazard = (-0.5 * at * at - 0.5 * std::f64::consts::TAU.ln() - log_normal_cdf(-at)).exp();
        let shrink = (hazard * (hazard - at)).clamp(0.0, 1.0);
        let column = self.covariance.column(k).into_owned();
        self.mean += column * (hazard / sd);
        self.covariance -= column * column.transpose() * (shrink / variance);
    }
}

/// ln Φ(x), also far out.
fn log_normal_cdf(x: f64) -> f64 {
    if x > -30.0 {
        (0.5 * erfc(-x / std::f64::consts::SQRT_2)).ln()
    } else {
        // Leading term of the asymptotic series (Abramowitz and Stegun 26.2.12).
        -0.5 * x * x - (-x).ln() - 0.5 * std::f64::consts::TAU.ln()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn half_a_normal_has_the_textbook_moments() {
        let half = Belief { mean: Vector4::zeros(), covariance: Matrix4::identity() }.cut_at_zero();
        for k in 0..4 {
            assert!((half.mean[k] - (2.0 / std::f64::consts::PI).sqrt()).abs() < 1e-9);
            assert!((half.covariance[(k, k)] - (1.0 - 2.0 / std::f64::consts::PI)).abs() < 1e-9);
        }
    }

    #[test]
    fn log_normal_cdf_is_smooth_where_the_series_takes_over() {
        assert!((log_normal_cdf(-30.0 + 1e-9) - log_normal_cdf(-30.0)).abs() < 2e-3);
        assert!((log_normal_cdf(0.0) - 0.5_f64.ln()).abs() < 1e-12);
    }
}
