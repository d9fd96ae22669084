//! Assessments and configurations for other programs and other people: one file a format.

pub mod check;
mod table;
