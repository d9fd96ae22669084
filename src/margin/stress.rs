//! The corridor under stress: sources, loads and topology stay, the internal angle opens from zero transfer to the
//! present curve's peak. The sources of the swing follow from the voltages and currents at each point.

use std::f64::consts::{FRAC_PI_2, PI};

use super::{
    Machine, PowerAngle,
    case::Case,
    face::{Face, Kernel},
    power_angle::{Phasor, Wave},
};
use crate::network::{C64, M2};

/// What stands behind the terminals, exporter first.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sources {
    /// Settled impedances, ohm.
    pub z: [C64; 2],
    /// Reactance added for the first swing, ohm.
    pub swing_x_ohm: [f64; 2],
    /// Magnitudes of the settled voltages, kV.
    pub e_kv: [f64; 2],
}

impl Sources {
    /// Impedances in the first swing, ohm.
    pub fn swing_z(&self) -> [C64; 2] {
        [0, 1].map(|k| self.z[k] + C64::new(0.0, self.swing_x_ohm[k]))
    }
}

/// A network between settled sources.
#[derive(Debug, Clone, Copy)]
pub(super) struct Settled {
    pub face: Face,
    /// P_e.
    pub curve: PowerAngle,
    /// MW from the exporter's terminal into the circuits.
    pub transfer: Wave,
}

impl Settled {
    /// `load` is the exporter terminal's, S.
    pub fn new(case: &Case, sources: &Sources, machine: &Machine, load: C64) -> Self {
        let face = Face::new(&case.network.reduced.y, sources.z);
        let [ex, ei] = sources.e_kv;
        let voltage = Phasor { x: face.terminal.m11 * ex, i: face.terminal.m12 * ei };
        let into_circuits = Phasor { x: face.y.m11 * ex - load * voltage.x, i: face.y.m12 * ei - load * voltage.i };
        let curve = face.kernel(machine).curve(sources.e_kv);
        Self { face, curve, transfer: voltage.power(&into_circuits) }
    }

    /// Transfer at the curve's peak, MW.
    pub fn peak_mw(&self) -> f64 {
        self.transfer.at(self.curve.peak_rad())
    }
}

/// The sources of the swing at one point of the stress.
#[derive(Debug, Clone, Copy)]
pub(super) struct SwingPoint {
    pub e_kv: [f64; 2],
    pub angle_rad: f64,
    pub p_m_mw: f64,
}

/// The present network on its way from zero transfer to its peak.
#[derive(Debug, Clone, Copy)]
pub(super) struct Stress {
    pub sources: Sources,
    pub machine: Machine,
    /// Load at the exporter's terminal, S.
    pub load: C64,
    pub settled: Settled,
    swing: Kernel,
    /// Internal angle of zero transfer, rad.
    pub start_rad: f64,
    /// Internal angle of the peak, rad.
    pub end_rad: f64,
}

impl Stress {
    pub fn new(present: &Case, sources: Sources, machine: Machine, load: C64) -> Self {
        let settled = Settled::new(present, &sources, &machine, load);
        let swing = Face::new(&present.network.reduced.y, sources.swing_z()).kernel(&machine);
        let end_rad = settled.curve.peak_rad();
        let transfer = PowerAngle::from(settled.transfer);
        let zero = transfer.rising_rad(0.0).unwrap_or(transfer.shift_rad - FRAC_PI_2);
        // The same angle, in the half turn that ends at the peak.
        let start_rad = (zero + (end_rad - zero).div_euclid(2.0 * PI) * 2.0 * PI).max(end_rad - PI);
        Self { sources, machine, load, settled, swing, start_rad, end_rad }
    }

    /// The same sources round another network with the same loads.
    pub fn in_network(&self, present: &Case) -> Self {
        Self::new(present, self.sources, self.machine, self.load)
    }

    /// The internal angle that transfers so many MW more than another one, on the rising side of the curve, which
    /// goes on through zero transfer; `None` beyond it.
    pub fn shifted_rad(&self, angle_rad: f64, shift_mw: f64) -> Option<f64> {
        if shift_mw == 0.0 {
            return Some(angle_rad);
        }
        let transfer = PowerAngle::from(self.settled.transfer);
        let angle = transfer.rising_rad(self.transfer_at(angle_rad) + shift_mw)?;
        let lowest = self.end_rad - PI;
        // A turn that has the rising side in its middle.
        let above_lowest = (angle - lowest + FRAC_PI_2).rem_euclid(2.0 * PI) - FRAC_PI_2;
        (0.0..=PI).contains(&above_lowest).then_some(lowest + above_lowest)
    }

    /// Settled P_m at an internal angle, MW.
    pub fn p_m_mw(&self, angle_rad: f64) -> f64 {
        self.settled.curve.at(angle_rad)
    }

    /// The transfer at which the settled machines deliver P_m; `None` where only the peak or more would do.
    pub fn transfer_for(&self, p_m_mw: f64) -> Option<f64> {
        if p_m_mw >= self.settled.curve.peak_mw() {
            return None;
        }
        let angle = self.settled.curve.rising_rad(p_m_mw).unwrap_or(self.start_rad);
        Some(self.transfer_at(angle.max(self.start_rad)))
    }

    /// Transfer at an internal angle, MW.
    pub fn transfer_at(&self, angle_rad: f64) -> f64 {
        self.settled.transfer.at(angle_rad)
    }

    /// E_s = V + Z_s·I = E + j·swing_x·I at an internal angle, and P_m = P_e = a·P_x + b·P_i of the present network
    /// there, from voltages and currents.
    pub fn swing_at(&self, angle_rad: f64) -> SwingPoint {
        let Sources { e_kv: [ex, ei], swing_x_ohm: [xx, xi], .. } = self.sources;
        let y: &M2 = &self.settled.face.y;
        let rotation = C64::cis(angle_rad);
        // Each side turned so that its settled source is real.
        let current_x = y.m11 * ex + y.m12 * ei * rotation.conj();
        let current_i = y.m21 * ex * rotation + y.m22 * ei;
        let swing_x = C64::new(ex - xx * current_x.im, xx * current_x.re);
        let swing_i = C64::new(ei - xi * current_i.im, xi * current_i.re);
        let power_x = (swing_x * current_x.conj()).re;
        let power_i = (swing_i * current_i.conj()).re;
        let turned = if xx == 0.0 && xi == 0.0 { 0.0 } else { (swing_x * swing_i.conj()).arg() };
        SwingPoint {
            e_kv: [swing_x.norm_sqr().sqrt(), swing_i.norm_sqr().sqrt()],
            angle_rad: angle_rad + turned,
            p_m_mw: self.machine.exporter_share * power_x - self.machine.importer_share * power_i,
        }
    }

    /// P_e of the present network with the sources of a swing.
    pub fn swing_curve(&self, point: &SwingPoint) -> PowerAngle {
        self.swing.curve(point.e_kv)
    }
}
