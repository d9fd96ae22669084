//! Two swinging sides as one machine (Kimbark 1948, vol. 1, ch. 4).

use std::f64::consts::TAU;

/// The equivalent inertia and how much of each side's power counts in P_e.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Machine {
    /// M of M δ'' = P_m − P_e, MW·s²/rad; infinite where both sides are.
    pub inertia: f64,
    /// a = W_i/(W_x + W_i).
    pub exporter_share: f64,
    /// b = 1 − a.
    pub importer_share: f64,
}

impl Machine {
    /// From the stored energies of exporter and importer, MW·s (`None`: infinite), and the frequency, Hz.
    pub fn new(stored_energy_mws: [Option<f64>; 2], frequency_hz: f64) -> Self {
        let (energy, exporter_share) = match stored_energy_mws {
            [None, None] => (f64::INFINITY, 0.5),
            [Some(exporter), None] => (exporter, 1.0),
            [None, Some(importer)] => (importer, 0.0),
            [Some(exporter), Some(importer)] => {
                (exporter * importer / (exporter + importer), importer / (exporter + importer))
            }
        };
        Self { inertia: 2.0 * energy / (TAU * frequency_hz), exporter_share, importer_share: 1.0 - exporter_share }
    }
}
