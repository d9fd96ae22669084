//! The equal-area criterion in terms of energy (Kimbark 1948, vol. 1, ch. 4; Athay, Podmore and Virmani 1979).

use std::f64::consts::{PI, TAU};

use super::PowerAngle;

/// A machine that delivers P_m on a curve: its equilibrium, its tipping point, its potential. Energies are MW·rad.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Well {
    curve: PowerAngle,
    p_m_mw: f64,
    cosine: f64,
    /// δ1 = γ + arcsin((P_m − C)/D).
    pub equilibrium_rad: f64,
    /// δu = 180° + 2γ − δ1.
    pub tipping_rad: f64,
    /// V(δu).
    pub critical: f64,
}

impl Well {
    /// `None` where the curve does not carry P_m.
    pub fn new(curve: PowerAngle, p_m_mw: f64) -> Option<Self> {
        let sine = (p_m_mw - curve.mean_mw) / curve.amplitude_mw;
        if sine.is_nan() || sine.abs() > 1.0 {
            return None;
        }
        let from_shift = sine.asin();
        let cosine = (1.0 - sine * sine).sqrt();
        let equilibrium_rad = curve.shift_rad + from_shift;
        let critical = curve.amplitude_mw * (2.0 * cosine - sine * (PI - 2.0 * from_shift));
        let tipping_rad = PI + 2.0 * curve.shift_rad - equilibrium_rad;
        Some(Self { curve, p_m_mw, cosine, equilibrium_rad, tipping_rad, critical })
    }

    /// V(δ) = ∫ from δ1 to δ of (P − P_m).
    pub fn potential(&self, angle_rad: f64) -> f64 {
        (self.curve.mean_mw - self.p_m_mw) * (angle_rad - self.equilibrium_rad)
            - self.curve.amplitude_mw * ((angle_rad - self.curve.shift_rad).cos() - self.cosine)
    }

    /// (V_crit − V_cl)/max(V_crit, V_cl), or −1 past the tipping point.
    pub fn area_margin(&self, angle_rad: f64, energy: f64) -> f64 {
        if angle_rad > self.tipping_rad {
            return -1.0;
        }
        let largest = self.critical.max(energy);
        if largest > 0.0 { (self.critical - energy) / largest } else { 0.0 }
    }

    /// Along the swing from rest at `start_rad` with `fault` on, the first angle at which ½ M ω² + V(δ) reaches
    /// V_crit. That energy is V(start) + ∫ (P − P_fault), whatever the inertia; whether the swing gets there is not
    /// looked at.
    pub fn spent_rad(&self, fault: &PowerAngle, start_rad: f64) -> Option<f64> {
        let needed = self.critical - self.potential(start_rad);
        let gain = self.curve.less(fault);
        if self.p_m_mw >= fault.at(start_rad) {
            gain.first_climb(start_rad, needed, self.tipping_rad)
        } else {
            gain.mirrored().first_climb(-start_rad, needed, -start_rad + TAU).map(|angle| -angle)
        }
    }

    /// The angle past the equilibrium at which the potential has taken up `energy`; `None` when it never does.
    pub fn swing_peak_rad(&self, energy: f64) -> Option<f64> {
        if energy >= self.critical {
            return None;
        }
        let energy = energy.max(0.0);
        let (mut low, mut high) = (self.equilibrium_rad, self.tipping_rad);
        let stiffness = self.curve.amplitude_mw * self.cosine;
        let mut angle = (low + (2.0 * energy / stiffness).sqrt()).min(0.5 * (low + high));
        for _ in 0..60 {
            let excess = self.potential(angle) - energy;
            if excess > 0.0 {
                high = angle;
            } else {
                low = angle;
            }
            let newton = angle - excess / (self.curve.at(angle) - self.p_m_mw);
            let next = if newton > low && newton < high { newton } else { 0.5 * (low + high) };
            let moved = (next - angle).abs();
            angle = next;
            if moved < 1e-12 {
                break;
            }
        }
        Some(angle)
    }
}
