//! The network as the two sources see it: their internal nodes added behind Z, everything else eliminated.

use super::{Machine, PowerAngle, power_angle::Phasor};
use crate::network::{C64, M2, Reduced};

/// Currents and terminal voltages per source voltage; the exporter comes first.
#[derive(Debug, Clone, Copy)]
pub(super) struct Face {
    /// Current leaving each internal node = `y` · E, S.
    pub y: M2,
    /// Terminal voltages = `terminal` · E.
    pub terminal: M2,
}

impl Face {
    /// With V = E − Z·I and I = Y·V: V = (1 + Z·Y)⁻¹·E and I = Y·V, which also holds for a stiff bus (Z = 0).
    pub fn new(y: &M2, z: [C64; 2]) -> Self {
        let one = C64::new(1.0, 0.0);
        let (a, b) = (one + z[0] * y.m11, z[0] * y.m12);
        let (c, d) = (z[1] * y.m21, one + z[1] * y.m22);
        let determinant = (a * d - b * c).inv();
        let terminal = M2::new(d * determinant, -b * determinant, -c * determinant, a * determinant);
        Self { y: y * terminal, terminal }
    }

    /// With a terminal held at zero voltage: its source feeds the short, the other sees what is left.
    ///
    /// A stiff bus under the short delivers no power, as the limit of a lossless source does.
    pub fn shorted(y: &M2, z: [C64; 2], terminal: usize) -> Self {
        let zero = C64::new(0.0, 0.0);
        let other = 1 - terminal;
        let mut face = Self { y: M2::zeros(), terminal: M2::zeros() };
        face.y[(terminal, terminal)] = if z[terminal] == zero { zero } else { z[terminal].inv() };
        let ratio = (z[other] * y[(other, other)] + 1.0).inv();
        face.terminal[(other, other)] = ratio;
        face.y[(other, other)] = y[(other, other)] * ratio;
        face
    }

    /// Voltage of a bus, given the magnitudes of the sources.
    pub fn voltage(&self, reduced: &Reduced, seat: usize, e_kv: [f64; 2]) -> Phasor {
        let [r0, r1] = reduced.row(seat);
        Phasor {
            x: (r0 * self.terminal.m11 + r1 * self.terminal.m21) * e_kv[0],
            i: (r0 * self.terminal.m12 + r1 * self.terminal.m22) * e_kv[1],
        }
    }

    /// The part of P_e that does not depend on the magnitudes of the sources.
    pub fn kernel(&self, machine: &Machine) -> Kernel {
        let (g12, b12) = (self.y.m12.re, self.y.m12.im);
        let cos = (machine.exporter_share - machine.importer_share) * g12;
        Kernel {
            exporter: machine.exporter_share * self.y.m11.re,
            importer: machine.importer_share * self.y.m22.re,
            mutual: (cos * cos + b12 * b12).sqrt(),
            shift_rad: (-cos).atan2(b12),
        }
    }
}

/// P_e = E_x² `exporter` − E_i² `importer` + E_x E_i `mutual` sin(δ − `shift`), the weighted sum a·P_x + b·P_i of
/// the two-machine equivalent (Kimbark 1948, vol. 1, ch. 4).
#[derive(Debug, Clone, Copy)]
pub(super) struct Kernel {
    exporter: f64,
    importer: f64,
    mutual: f64,
    shift_rad: f64,
}

impl Kernel {
    pub fn curve(&self, [ex, ei]: [f64; 2]) -> PowerAngle {
        PowerAngle {
            mean_mw: ex * ex * self.exporter - ei * ei * self.importer,
            amplitude_mw: ex * ei * self.mutual,
            shift_rad: self.shift_rad,
        }
    }
}
