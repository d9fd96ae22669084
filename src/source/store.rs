//! Keeps what was learned over a restart.
