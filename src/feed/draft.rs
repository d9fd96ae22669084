use chrono::{DateTime, Utc};

use super::{Channels, Frame, Quality, Reading, Slot, Tally, places::Places};

/// A frame in the making, whatever its format: judges values and catches what is given twice.
#[derive(Debug)]
pub(super) struct Draft {
    readings: Vec<(Slot, Reading)>,
    places: Places,
}

pub(super) const INVALID: Reading = Reading { value: f64::NAN, quality: Quality::Invalid };

impl Draft {
    pub fn new(channels: &Channels) -> Self {
        Self { readings: Vec::new(), places: Places::new(channels) }
    }

    /// Takes a value in; `None` is one that is no number.
    pub fn value(&mut self, channels: &Channels, slot: Slot, value: Option<f64>, tally: &mut Tally) {
        let mut reading = match value.filter(|&value| channels.is_plausible(slot, value)) {
            Some(value) => Reading { value, quality: Quality::Good },
            None => INVALID,
        };
        match self.places.find(&mut self.readings, slot) {
            // Given twice: which one is meant cannot be told.
            Some(before) => (*before, reading) = (INVALID, INVALID),
            None => self.places.push(&mut self.readings, slot, reading),
        }
        if reading.quality == Quality::Invalid {
            tally.invalid.count(channels.name(slot));
        }
    }

    /// Applies a quality, after all values. One of invalid for a channel without a value ends what is held of it.
    pub fn quality(&mut self, slot: Slot, quality: Quality) {
        match self.places.find(&mut self.readings, slot) {
            Some(reading) => reading.quality = reading.quality.max(quality),
            None if quality == Quality::Invalid => self.places.push(&mut self.readings, slot, INVALID),
            None => {}
        }
    }

    /// The finished frame; leaves an empty draft.
    pub fn finish(&mut self, time: DateTime<Utc>) -> Frame {
        let readings = self.readings.clone();
        self.readings.clear();
        Frame { time, readings, aside: None }
    }
}
