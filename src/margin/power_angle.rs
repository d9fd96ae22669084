//! Powers, squared voltages and squared currents of a network between two sources, as functions of their angle.

use std::f64::consts::{PI, TAU};

use super::root;
use crate::network::C64;

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

    /// Where the curve peaks, rad.
    pub fn peak_rad(&self) -> f64 {
        self.shift_rad + std::f64::consts::FRAC_PI_2
    }

    /// The curve at its peak, MW.
    pub fn peak_mw(&self) -> f64 {
        self.mean_mw + self.amplitude_mw
    }

    /// The angle on the rising side that carries this power, rad; `None` beyond the curve.
    pub fn rising_rad(&self, power_mw: f64) -> Option<f64> {
        let sine = (power_mw - self.mean_mw) / self.amplitude_mw;
        (sine.abs() <= 1.0).then(|| self.shift_rad + sine.asin())
    }

    /// This curve less another one.
    pub(super) fn less(&self, other: &Self) -> Self {
        let [(sin, cos), (other_sin, other_cos)] = [self, other].map(|curve| curve.shift_rad.sin_cos());
        Wave {
            mean: self.mean_mw - other.mean_mw,
            cos: other.amplitude_mw * other_sin - self.amplitude_mw * sin,
            sin: self.amplitude_mw * cos - other.amplitude_mw * other_cos,
        }
        .into()
    }

    /// −P(−δ): what an integral from δ downwards adds up.
    pub(super) fn mirrored(&self) -> Self {
        Self { mean_mw: -self.mean_mw, amplitude_mw: self.amplitude_mw, shift_rad: -self.shift_rad }
    }

    /// The first angle up to `end_rad` at which the integral from `start_rad` reaches `needed`, which is positive.
    pub(super) fn first_climb(&self, start_rad: f64, needed: f64, end_rad: f64) -> Option<f64> {
        let from = (start_rad - self.shift_rad).cos();
        let missing = |angle: f64| {
            let swept =
                self.mean_mw * (angle - start_rad) - self.amplitude_mw * ((angle - self.shift_rad).cos() - from);
            needed - swept
        };
        // The integral has a maximum where the curve falls through zero.
        let top = self.rising_rad(0.0).map(|zero| {
            let falling = PI + 2.0 * self.shift_rad - zero;
            start_rad + (falling - start_rad).rem_euclid(TAU)
        });
        let mut below = start_rad;
        for angle in top.into_iter().filter(|top| *top < end_rad).chain([end_rad]) {
            if missing(angle) <= 0.0 {
                let bracket = ((below, missing(below)), (angle, missing(angle)));
                return Some(root::bracketed(bracket.0, bracket.1, 1e-12, missing));
            }
            below = angle;
        }
        None
    }
}

/// m + c cos δ + s sin δ.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Wave {
    pub mean: f64,
    pub cos: f64,
    pub sin: f64,
}

impl Wave {
    pub fn at(&self, angle_rad: f64) -> f64 {
        let (sin, cos) = angle_rad.sin_cos();
        self.mean + self.cos * cos + self.sin * sin
    }

    fn amplitude(&self) -> f64 {
        (self.cos * self.cos + self.sin * self.sin).sqrt()
    }

    /// The first angle from `start_rad` on at which the wave is above a level.
    pub fn first_above(&self, level: f64, start_rad: f64) -> Option<f64> {
        let amplitude = self.amplitude();
        if self.mean + amplitude <= level {
            return None;
        }
        if self.at(start_rad) > level {
            return Some(start_rad);
        }
        let rising = self.sin.atan2(self.cos) - ((level - self.mean) / amplitude).clamp(-1.0, 1.0).acos();
        Some(start_rad + (rising - start_rad).rem_euclid(TAU))
    }

    /// The first angle from `start_rad` on at which the wave is below a level.
    pub fn first_below(&self, level: f64, start_rad: f64) -> Option<f64> {
        Self { mean: -self.mean, cos: -self.cos, sin: -self.sin }.first_above(-level, start_rad)
    }
}

impl From<Wave> for PowerAngle {
    fn from(wave: Wave) -> Self {
        Self { mean_mw: wave.mean, amplitude_mw: wave.amplitude(), shift_rad: (-wave.cos).atan2(wave.sin) }
    }
}

/// x·e^{jδ} + i: a voltage or current driven by the exporter's source at angle δ and the importer's at angle 0.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Phasor {
    pub x: C64,
    pub i: C64,
}

impl Phasor {
    pub fn at(&self, angle_rad: f64) -> C64 {
        self.x * C64::cis(angle_rad) + self.i
    }

    /// Re(self · conj(other)): the active power of a voltage and a current.
    pub fn power(&self, other: &Self) -> Wave {
        let from_x = self.x * other.i.conj();
        let from_i = self.i * other.x.conj();
        Wave {
            mean: (self.x * other.x.conj() + self.i * other.i.conj()).re,
            cos: from_x.re + from_i.re,
            sin: from_i.im - from_x.im,
        }
    }

    /// |self|².
    pub fn square(&self) -> Wave {
        let cross = self.x * self.i.conj();
        Wave { mean: self.x.norm_sqr() + self.i.norm_sqr(), cos: 2.0 * cross.re, sin: -2.0 * cross.im }
    }

    /// |self| at an angle given as e^{jδ}.
    pub fn magnitude(&self, rotation: C64) -> f64 {
        (self.x * rotation + self.i).norm_sqr().sqrt()
    }
}
