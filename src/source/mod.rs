//! What stands behind each terminal: the Thevenin impedances of both sides, learned from sudden steps.
//!
//! A tap, a shunt, a lost unit moves one side of a corridor only, and by far more than its background. Judged at both
//! ends together, such a step tells which side moved, and so how stiff the other one is:
//!
//! 1. [`Learner::observe`] takes terminal quantities frame by frame into short means, and compares them with a robust
//!    background;
//! 2. where the means before and after an instant differ by far more than that, both are fitted to terminal voltages, four
//!    cases of what may have happened are weighed, and the impedances updated;
//! 3. [`Estimate`] says what is known, [`Step`] what was seen, and [`store`] keeps it over a restart.
//!
//! Everything is a deterministic function of configuration and observations, in constant memory.
//!
//! Sources: Bar-Shalom, Li and Kirubarajan, *Estimation with Applications to Tracking and Navigation*, 2001 (ch. 10:
//! iterated extended Kalman filter; ch. 11: static multiple models, Gaussian sums) · Schweppe, *Power system static-state
//! estimation*, IEEE Trans. PAS 1970 (weighted least squares) · Vu, Begovic, Novosel and Saha, IEEE Trans. Power Systems
//! 1999 (Thevenin equivalents from local phasors) · Rousseeuw and Croux, JASA 1993 (median absolute deviation).

mod background;
mod beyond;
mod detector;
mod estimate;
mod hypothesis;
mod kept;
mod learner;
mod log;
pub mod store;
mod terminal;
mod watch;
mod window;

pub use estimate::Estimate;
pub use learner::Learner;
pub use log::{Moved, SpreadPoint, Step};
pub use terminal::Observation;
