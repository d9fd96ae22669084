//! From the truth to what is reported of it.

use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::{CorridorTruth, Metering, PerKind, Says, Span};
use crate::feed::{Point, Quantity, Slot};

/// How many different ages the values of a frame have where there is skew.
pub(super) const AGES: usize = 4;

/// One channel's way into the frames.
#[derive(Debug, Clone)]
pub(super) struct Meter {
    pub slot: Slot,
    pub point: Point,
    /// Which of the ages its values have.
    pub age: usize,
    kind: Option<Kind>,
    falsehoods: Vec<(Span, f64, f64)>,
    gaps: Vec<Span>,
    reported: Option<f64>,
    said: Says,
}

/// What a measurement (not a status) is subject to.
#[derive(Debug, Clone, Copy)]
struct Kind {
    noise: f64,
    deadband: f64,
    resolution: f64,
}

impl Meter {
    pub fn new(slot: Slot, point: Point, age: usize, metering: &Metering, truth: &CorridorTruth) -> Self {
        let pick: Option<fn(&PerKind) -> f64> = match point {
            Point::Kv(_) => Some(|per| per.kv),
            Point::Deg(_) => Some(|per| per.deg),
            Point::Load(_, Quantity::Active) | Point::Flow(_, _, Quantity::Active) => Some(|per| per.mw),
            Point::Load(_, Quantity::Reactive) | Point::Flow(_, _, Quantity::Reactive) => Some(|per| per.mvar),
            Point::StoredEnergy(_) | Point::Closed(_) | Point::Inserted(_) => None,
        };
        let Metering { noise, deadband, resolution, .. } = metering;
        let hides = |points: &Option<Vec<Point>>| points.as_ref().is_none_or(|points| points.contains(&point));
        Self {
            slot,
            point,
            age,
            kind: pick.map(|of| Kind { noise: of(noise), deadband: of(deadband), resolution: of(resolution) }),
            falsehoods: truth
                .false_meters
                .iter()
                .filter(|meter| meter.point == point)
                .map(|meter| (meter.span, meter.scale, meter.offset))
                .collect(),
            gaps: truth.gaps.iter().filter(|gap| hides(&gap.points)).map(|gap| gap.span).collect(),
            reported: None,
            said: Says::Truth,
        }
    }

    /// What it says from now on, when that is not what it said before.
    pub fn turn(&mut self, time_s: f64) -> Option<Says> {
        let says = if self.gaps.iter().any(|gap| gap.holds(time_s)) {
            Says::Nothing
        } else if self.falsehoods.iter().any(|(span, ..)| span.holds(time_s)) {
            Says::Falsehood
        } else {
            Says::Truth
        };
        (std::mem::replace(&mut self.said, says) != says).then_some(says)
    }

    /// What a frame says of a true value; `None` in a gap.
    pub fn read(&mut self, value: f64, time_s: f64, random: &mut ChaCha8Rng) -> Option<f64> {
        let mut value = value;
        if let Some(Kind { noise, .. }) = self.kind {
            let drawn: f64 = random.sample(StandardNormal);
            // A dead circuit or bus reads zero: what is left of noise is suppressed there.
            value += if value == 0.0 { 0.0 } else { noise * drawn };
        }
        for (_, scale, offset) in self.falsehoods.iter().filter(|(span, ..)| span.holds(time_s)) {
            value = offset + scale * value;
        }
        if let Some(Kind { deadband, resolution, .. }) = self.kind {
            value = self.reported.filter(|last| (value - last).abs() < deadband).unwrap_or(value);
            value = quantised(value, resolution);
        }
        self.reported = Some(value);
        (self.said != Says::Nothing).then_some(value)
    }
}

/// The nearest multiple of a resolution that is a whole number or divides one, as its decimals would be read.
fn quantised(value: f64, resolution: f64) -> f64 {
    // Adding zero takes the sign off a negative zero.
    let scaled = |per_unit: f64| (value * per_unit).round() / per_unit + 0.0;
    if resolution < 1.0 { scaled((1.0 / resolution).round()) } else { (value / resolution).round() * resolution + 0.0 }
}
