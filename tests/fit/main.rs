//! From a snapshot to a state: exact frames, noisy ones, wrong meters, wrong statuses, missing channels, nonsense.

mod exact;
mod suspects;
mod world;
