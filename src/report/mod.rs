//! Assessments and configurations for other programs and other people: one file a format.

pub mod change;
pub mod check;
pub mod journal;
pub mod jsonl;
pub mod parquet;
pub mod review;
mod table;
pub mod trial;

/// What stands under every report.
pub(crate) const CAUTION: &str = "\
tautline advises. Protection, approved operating limits, local codes and licensed engineers stand above it.
Left out: governors, exciters, load dynamics, damping, every swing after the first, swings inside a side.";
