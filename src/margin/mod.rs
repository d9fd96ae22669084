//! From a state to a headroom: curves, swings, outages, limits, actions.

mod case;
mod engine;
mod equal_area;
mod face;
mod footing;
mod machine;
mod outage;
mod picture;
mod power_angle;
mod reclose;
mod record;
mod root;
mod scene;
mod sensitivity;
mod stress;
mod swing;
mod trend;
mod view;

pub use engine::{Behind, CircuitFlow, Engine, Judgement, Present, Seated};
pub use footing::Footing;
pub use machine::Machine;
pub use picture::{OutagePicture, Picture};
pub use power_angle::PowerAngle;
pub use record::{Action, Binding, Criterion, Intact, IntactLimits, OutageLimits, OutageRecord, Reclose};
pub use swing::{Moment, Swing};
pub use trend::Trend;
