//! What stands behind each terminal.

use nalgebra::{Matrix4, Vector4};

use crate::grid::ConfiguredSource;

/// Both sides' Thevenin impedances as they are known now: R `from`, X `from`, R `to`, X `to`, ohm.
#[derive(Debug, Clone, Copy, PartialEq)]
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

    /// Standard deviation of each.
    pub fn sd(&self) -> Vector4<f64> {
        self.covariance.diagonal().map(|v| v.max(0.0).sqrt())
    }

    /// The impedances behind `from` and `to`, ohm.
    pub fn z_ohm(&self) -> [nalgebra::Complex<f64>; 2] {
        [0, 2].map(|k| nalgebra::Complex::new(self.mean[k], self.mean[k + 1]))
    }
}
