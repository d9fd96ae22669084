//! Exact long lines between two terminals, a few lines of textbook (Kundur 1994, 6.1; Grainger and Stevenson 1994, 6).

use nalgebra::{Complex, Matrix2};

pub type C = Complex<f64>;

/// Length km; r and x ohm/km; b µS/km.
#[derive(Debug, Clone, Copy)]
pub struct Line {
    pub km: f64,
    pub r: f64,
    pub x: f64,
    pub b: f64,
    /// Series capacitor in the middle, ohm.
    pub capacitor: f64,
}

impl Line {
    fn chain(&self, km: f64) -> Matrix2<C> {
        let (z, y) = (C::new(self.r, self.x), C::new(0.0, self.b * 1e-6));
        let (angle, surge) = ((z * y).sqrt() * km, (z / y).sqrt());
        Matrix2::new(angle.cosh(), surge * angle.sinh(), angle.sinh() / surge, angle.cosh())
    }

    pub fn admittance(&self, inserted: bool) -> Matrix2<C> {
        let half = self.chain(0.5 * self.km);
        let x = if inserted { -self.capacitor } else { 0.0 };
        let t = half * Matrix2::new(C::ONE, C::new(0.0, x), C::ZERO, C::ONE) * half;
        Matrix2::new(t[(1, 1)], -C::ONE, -C::ONE, t[(0, 0)]) / t[(0, 1)]
    }
}
