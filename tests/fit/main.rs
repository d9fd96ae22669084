//! From a snapshot to a state: exact frames, noisy ones, wrong meters, wrong statuses, missing channels, nonsense.

mod blind;
mod cases;
mod exact;
mod nonsense;
mod reference;
mod statuses;
mod suspects;
mod world;
