/// P(δ) = C + D sin(δ − γ): any power of a network between two sources (Kimbark 1948, vol. 1, ch. 4).
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct PowerAngle {
    /// C, MW.
    pub mean_mw: f64,
    /// D, MW; at least 0.
    pub amplitude_mw: f64,
    /// γ, rad.
    pub shift_rad: f64,
}

impl PowerAngle {
    /// Power at an angle, MW.
    pub fn at(&self, angle_rad: f64) -> f64 {
        self.mean_mw + self.amplitude_mw * (angle_rad - self.shift_rad).sin()
    }
}
