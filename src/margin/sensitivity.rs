//! How the headroom depends on the sources, and so its spread.

use nalgebra::{Matrix4, Vector4};

use super::{
    Criterion,
    outage::Outage,
    scene::{Scene, Tightest},
    stress::Stress,
};
use crate::network::C64;

/// Step of an impedance, relative to its magnitude.
const STEP: f64 = 1e-3;
/// The gradient is taken anew when the limit has moved by this part of the peak, or an impedance by this part of itself.
const MOVED: f64 = 0.005;

/// The gradient of the tightest limit by R and X `from`, R and X `to`, MW per ohm: the transfer is measured and does not
/// depend on them.
#[derive(Debug, Clone, Copy)]
pub(super) struct Sensitivity {
    set: usize,
    tightest: Tightest,
    z: [C64; 2],
    gradient: Vector4<f64>,
}

/// A point where an excess falls through zero.
#[derive(Debug, Clone, Copy)]
struct Crossing {
    angle_rad: f64,
    excess: f64,
    slope: f64,
}

impl Sensitivity {
    /// By differences.
    pub fn of(scene: &Scene, set: usize, tightest: &Tightest, base: &Stress, now_rad: f64) -> Self {
        let crossing = match (tightest.outage, tightest.criterion) {
            (Some(index), Criterion::Area) => crossing(scene, base, index, now_rad),
            _ => None,
        };
        let slope = |parameter: usize| {
            let side = usize::from(parameter / 2 != scene.set.exporter);
            let mut z = base.sources.z;
            let step = STEP * z[side].norm();
            z[side] += if parameter.is_multiple_of(2) { C64::new(step, 0.0) } else { C64::new(0.0, step) };
            let (stress, _) = scene.stress(z);
            let limit_mw = limit(scene, &stress, tightest, crossing.as_ref()).filter(|_| step > 0.0);
            limit_mw.map_or(0.0, |limit_mw| (limit_mw - tightest.limit_mw) / step)
        };
        let gradient = Vector4::from_fn(|parameter, _| slope(parameter));
        Self { set, tightest: *tightest, z: base.sources.z, gradient }
    }

    /// Whether it is still good enough.
    pub fn holds_for(&self, set: usize, tightest: &Tightest, stress: &Stress) -> bool {
        let same =
            (self.set, self.tightest.outage, self.tightest.criterion) == (set, tightest.outage, tightest.criterion);
        let moved = |(before, now): (&C64, &C64)| (before - now).norm() > MOVED * before.norm();
        same && (self.tightest.limit_mw - tightest.limit_mw).abs() <= MOVED * stress.settled.peak_mw().abs()
            && !self.z.iter().zip(&stress.sources.z).any(moved)
    }

    /// √(gᵀ C g), MW, with the covariance C of the four.
    pub fn sd_mw(&self, covariance: &Matrix4<f64>) -> f64 {
        (self.gradient.transpose() * covariance * self.gradient)[0].max(0.0).sqrt()
    }
}

/// Where an outage's area margin crosses the required one, and how steeply.
fn crossing(scene: &Scene, stress: &Stress, outage: usize, now_rad: f64) -> Option<Crossing> {
    const STEP_RAD: f64 = 1e-4;
    let outage = Outage::new(scene.corridor, scene.set.exporter, &scene.set.outages[outage], stress)?;
    let angle_rad = outage.area_limit_rad(now_rad)?;
    let excess = outage.area_excess(angle_rad);
    let slope = (excess - outage.area_excess(angle_rad - STEP_RAD)) / STEP_RAD;
    (slope < 0.0).then_some(Crossing { angle_rad, excess, slope })
}

/// The limit that was the tightest one, with slightly other sources.
fn limit(scene: &Scene, stress: &Stress, tightest: &Tightest, crossing: Option<&Crossing>) -> Option<f64> {
    let Some(index) = tightest.outage else {
        let limits = scene.intact_limits(stress);
        return match tightest.criterion {
            Criterion::Loading => limits.loading,
            Criterion::Voltage => limits.voltage,
            _ => limits.angle,
        };
    };
    let outage = Outage::new(scene.corridor, scene.set.exporter, &scene.set.outages[index], stress)?;
    match tightest.criterion {
        Criterion::Angle => outage.angle_limit(),
        Criterion::Area => crossing.map(|crossing| {
            // The implicit function theorem: the crossing moves by the change of the excess over its slope.
            let moved = (outage.area_excess(crossing.angle_rad) - crossing.excess) / crossing.slope;
            stress.transfer_at(crossing.angle_rad - moved)
        }),
        Criterion::Loading => outage.loading_limit(),
        Criterion::Voltage => outage.voltage_limit(),
        Criterion::Separation => None,
    }
}
