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
        let Self { low, high, with_low, with_high } = self;
        let is_low_enough = if with_high { number <= high } else { number < high };
        is_low_enough && if with_low { number >= low } else { number > low }
    }
}

impl fmt::Display for Limits {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { low, high, with_low, with_high } = *self;
        let low = (low > -LARGEST).then_some((if with_low { "at least" } else { "more than" }, low));
        let high = (high < LARGEST).then_some((if with_high { "at most" } else { "less than" }, high));
        let bounds = low.into_iter().chain(high).map(|(words, bound)| format!(" {words} {}", shown_number(bound)));
        write!(f, "a number{}", bounds.collect::<Vec<_>>().join(" and"))
    }
}
