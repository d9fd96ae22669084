/// A value over time: straight between its points, level before the first and after the last.
#[derive(Debug, Clone, PartialEq)]
pub struct Shape {
    points: Vec<(f64, f64)>,
}

impl Shape {
    /// The same value at all times.
    pub fn level(value: f64) -> Self {
        Self { points: vec![(0.0, value)] }
    }

    /// Through points of time (s from the start, ascending) and value; `None` without any, or when time does not ascend.
    pub fn through(points: Vec<(f64, f64)>) -> Option<Self> {
        (!points.is_empty() && points.is_sorted_by(|a, b| a.0 < b.0)).then_some(Self { points })
    }

    /// The value at a time.
    pub fn at(&self, time_s: f64) -> f64 {
        let after = self.points.partition_point(|point| point.0 <= time_s);
        let first = self.points[after.saturating_sub(1)];
        let Some(next) = self.points.get(after).filter(|_| after > 0) else { return first.1 };
        first.1 + (next.1 - first.1) * (time_s - first.0) / (next.0 - first.0)
    }

    /// The same shape in another unit.
    pub(super) fn map(self, unit: impl Fn(f64) -> f64) -> Self {
        Self { points: self.points.into_iter().map(|(time_s, value)| (time_s, unit(value))).collect() }
    }

    /// Its points.
    pub fn points(&self) -> &[(f64, f64)] {
        &self.points
    }
}
