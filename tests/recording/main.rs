//! Recorded days: every one of them replayed alone gives what was seen live, and nothing that was flushed is ever lost.
#![cfg(unix)]

mod bed;
mod days;
mod killing;
mod lines;
mod starts;
