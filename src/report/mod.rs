//! Assessments and configurations for other programs and other people: one file a format.

pub mod change;
pub mod check;
pub mod journal;
pub mod jsonl;
pub mod summary;
mod table;
pub mod trial;
