//! Assessments for other programs and other people: one file a format.

pub mod jsonl;
