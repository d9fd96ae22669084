//! From a state to a headroom: curves, swings, outages, limits, actions.

mod picture;
mod power_angle;

pub use picture::{OutagePicture, Picture};
pub use power_angle::PowerAngle;
