//! ABCD two-ports (Grainger & Stevenson 1994, ch. 6).

use std::ops::Mul;

use super::C64;

/// Sending end = \[a b; c d\] · receiving end, with current leaving at the receiving end.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TwoPort {
    /// Voltage ratio with the far end open.
    pub a: C64,
    /// Transfer impedance, ohm.
    pub b: C64,
    /// Transfer admittance, S.
    pub c: C64,
    /// Current ratio with the far end shorted.
    pub d: C64,
}

const ONE: C64 = C64::new(1.0, 0.0);
const ZERO: C64 = C64::new(0.0, 0.0);

impl TwoPort {
    /// A straight connection.
    pub const THROUGH: Self = Self { a: ONE, b: ZERO, c: ZERO, d: ONE };

    /// The exact uniform line of series impedance `z` (ohm) and shunt admittance `y` (S) in total: with θ = √(zy),
    /// \[cosh θ, z sinh θ/θ; y sinh θ/θ, cosh θ\] (Grainger & Stevenson 1994, §6.5).
    pub fn line(z: C64, y: C64) -> Self {
        let theta = (z * y).sqrt();
        let cosh = theta.cosh();
        let sinhc = if theta.norm_sqr() < 1e-24 { ONE } else { theta.sinh() / theta };
        Self { a: cosh, b: z * sinhc, c: y * sinhc, d: cosh }
    }

    /// A series impedance, ohm.
    pub fn series(z: C64) -> Self {
        Self { b: z, ..Self::THROUGH }
    }

    /// A shunt admittance, S.
    pub fn shunt(y: C64) -> Self {
        Self { c: y, ..Self::THROUGH }
    }
}

impl Mul for TwoPort {
    type Output = Self;

    fn mul(self, next: Self) -> Self {
        Self {
            a: self.a * next.a + self.b * next.c,
            b: self.a * next.b + self.b * next.d,
            c: self.c * next.a + self.d * next.c,
            d: self.c * next.b + self.d * next.d,
        }
    }
}
