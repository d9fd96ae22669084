use std::time::Instant;

use super::stream::Outlet;

/// Where the frames of a lane come out of its queue.
#[derive(Debug)]
pub(super) struct Inlet {
    pub outlet: Outlet,
    pub is_live: bool,
    pub has_ended: bool,
    /// When the frames that wait in the lane came.
    pub arrived: Instant,
}

impl Inlet {
    pub fn new(outlet: Outlet, is_live: bool) -> Self {
        Self { outlet, is_live, has_ended: false, arrived: Instant::now() }
    }
}
