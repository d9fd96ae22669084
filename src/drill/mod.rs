//! Drill.
