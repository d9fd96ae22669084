use std::sync::Arc;

use chrono::{DateTime, Utc};

use super::{Aside, Slot};

/// A time and the values reported for it.
#[derive(Debug, Clone, PartialEq)]
pub struct Frame {
    /// When the values were measured.
    pub time: DateTime<Utc>,
    /// What the frame says, in its own order; a slot appears at most once.
    pub readings: Vec<(Slot, Reading)>,
    /// What a recording says besides; a frame of any other source has none.
    pub aside: Option<Arc<Aside>>,
}

/// One measured value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reading {
    /// In the channel's unit; means nothing when the quality is invalid.
    pub value: f64,
    /// How far to trust it.
    pub quality: Quality,
}

/// How far a value is to be trusted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Quality {
    /// Used as it is.
    Good,
    /// Used with three times the standard deviation.
    Questionable,
    /// Not used.
    Invalid,
}

impl Quality {
    /// The word a feed uses.
    pub fn word(self) -> &'static str {
        match self {
            Self::Good => "good",
            Self::Questionable => "questionable",
            Self::Invalid => "invalid",
        }
    }

    /// From the word a feed uses; any other word is invalid, since its source had something to object.
    pub fn from_word(word: &str) -> Self {
        match word {
            "good" => Self::Good,
            "questionable" => Self::Questionable,
            _ => Self::Invalid,
        }
    }
}
