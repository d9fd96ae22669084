//! `[metering]`.

use super::{Limits, Metering, Section};
use crate::{
    config::limits::{NOT_NEGATIVE, POSITIVE},
    drill::PerKind,
};

const LARGEST_SKEW_S: f64 = 60.0;

pub(super) fn read(mut section: Section<'_>) -> Metering {
    let default = Metering::default();
    Metering {
        noise: per_kind(section.section("noise"), default.noise, NOT_NEGATIVE),
        deadband: per_kind(section.section("deadband"), default.deadband, NOT_NEGATIVE),
        resolution: resolution(section.section("resolution"), default.resolution),
        skew_s: section.number("skew_s", NOT_NEGATIVE.up_to(LARGEST_SKEW_S)).unwrap_or(default.skew_s),
    }
}

fn per_kind(mut section: Section<'_>, default: PerKind, limits: Limits) -> PerKind {
    let mut of = |key, default| section.number(key, limits).unwrap_or(default);
    PerKind {
        kv: of("kv", default.kv),
        deg: of("deg", default.deg),
        mw: of("mw", default.mw),
        mvar: of("mvar", default.mvar),
    }
}

fn resolution(mut section: Section<'_>, default: PerKind) -> PerKind {
    let mut of = |key, default| {
        let resolution = section.number(key, POSITIVE.up_to(1000.0)).unwrap_or(default);
        let steps: f64 = if resolution < 1.0 { 1.0 / resolution } else { resolution };
        if (steps - steps.round()).abs() > 1e-6 * steps {
            section.wrong(key, "must be a whole number or go into 1 without a rest, such as 0.1 or 0.05");
        }
        resolution
    };
    PerKind {
        kv: of("kv", default.kv),
        deg: of("deg", default.deg),
        mw: of("mw", default.mw),
        mvar: of("mvar", default.mvar),
    }
}
