//! What recorded days came to, on paper: one file a format.

pub mod csv;
pub mod html;
pub mod json;
pub mod text;

mod clock;
mod compare;
mod corridor_block;
mod definitions;
mod figures;
mod markup;
mod plot;
mod scale;
mod sketch;
mod strip;

use chrono_tz::Tz;

use crate::{
    grid::{Corridor, Grid},
    review::{CorridorReview, Review},
};

/// A review with what is needed to write it down.
#[derive(Debug, Clone, Copy)]
pub struct Paper<'a> {
    /// What the days came to.
    pub review: &'a Review,
    /// The corridors as configured.
    pub grid: &'a Grid,
    /// Zone of the times that people read; other programs get UTC.
    pub zone: Tz,
    /// The changes of a what-if, as they were given; none: no what-if.
    pub changes: &'a [String],
}

impl<'a> Paper<'a> {
    /// A corridor as configured, where it is.
    fn configured(&self, corridor: &CorridorReview) -> Option<&'a Corridor> {
        self.grid.corridors.iter().find(|known| known.name == corridor.corridor)
    }

    /// Names of the terminal buses; empty where they are not known.
    fn terminals(&self, corridor: &CorridorReview) -> [&'a str; 2] {
        self.configured(corridor).map_or([""; 2], |known| [0, 1].map(|bus| &*known.buses[bus].name))
    }
}
