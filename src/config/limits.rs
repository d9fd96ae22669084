use std::fmt;

use super::wording::shown_number;

/// Beyond any quantity of a grid in the units of the configuration; further out, products would overflow.
const LARGEST: f64 = 1e12;

/// What a number may be.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Limits {
    low: f64,
    high: f64,
    with_low: bool,
    with_high: bool,
}

/// Any ordinary number.
pub(crate) const ANY: Limits = Limits::at_least(-LARGEST);
/// More than nothing.
pub(crate) const POSITIVE: Limits = Limits::above(0.0);
/// Nothing or more.
pub(crate) const NOT_NEGATIVE: Limits = Limits::at_least(0.0);
/// A place along a circuit.
pub(crate) const FRACTION: Limits = Limits::at_least(0.0).up_to(1.0);

impl Limits {
    pub const fn above(low: f64) -> Self {
        Self { low, high: LARGEST, with_low: false, with_high: true }
    }

    pub const fn at_least(low: f64) -> Self {
        Self { low, high: LARGEST, with_low: true, with_high: true }
    }

    pub const fn up_to(self, high: f64) -> Self {
        Self { high, ..self }
    }

    pub const fn below(self, high: f64) -> Self {
        Self { high, with_high: false, ..self }
    }

    pub fn hold(self, number: f64) -> bool {
        (number > self.low || self.with_low && number == self.low)
            && (number < self.high || self.with_high && number == self.high)
    }
}

impl fmt::Display for Limits {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let low = if self.with_low { "at least" } else { "more than" };
        let high = if self.with_high { "at most" } else { "less than" };
        write!(f, "{low} {} and {high} {}", shown_number(self.low), shown_number(self.high))
    }
}
