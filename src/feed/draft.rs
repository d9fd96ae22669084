use chrono::{DateTime, Utc};

use super::{Channels, Frame, Quality, Reading, Slot, Tally};

/// A frame in the making, whatever its format: judges values and catches what is given twice.
#[derive(Debug)]
pub(super) struct Draft {
    readings: Vec<(Slot, Reading)>,
    /// Where a slot stands in `readings`, [`NOWHERE`] when it does not.
    places: Vec<usize>,
}

const NOWHERE: usize = usize::MAX;
const INVALID: Reading = Reading { value: f64::NAN, quality: Quality::Invalid };

impl Draft {
    pub fn new(channels: &Channels) -> Self {
        Self { readings: Vec::new(), places: vec![NOWHERE; channels.len()] }
    }

    /// Takes a value in; `None` is one that is no number.
    pub fn value(&mut self, channels: &Channels, slot: Slot, value: Option<f64>, tally: &mut Tally) {
        let given_before = self.places[slot] != NOWHERE;
        match value.filter(|&value| channels.is_plausible(slot, value)) {
            Some(value) if !given_before => return self.put(slot, Reading { value, quality: Quality::Good }),
            // Which one is meant cannot be told.
            _ if given_before => self.readings[self.places[slot]].1 = INVALID,
            _ => self.put(slot, INVALID),
        }
        tally.invalid.count(channels.name(slot));
    }

    /// Applies a quality, after all values. One of invalid for a channel without a value ends what is held of it.
    pub fn quality(&mut self, slot: Slot, quality: Quality) {
        match self.places[slot] {
            NOWHERE if quality == Quality::Invalid => self.put(slot, INVALID),
            NOWHERE => {}
            place => {
                let reading = &mut self.readings[place].1;
                reading.quality = reading.quality.max(quality);
            }
        }
    }

    /// The finished frame; leaves an empty draft.
    pub fn finish(&mut self, time: DateTime<Utc>) -> Frame {
        for &(slot, _) in &self.readings {
            self.places[slot] = NOWHERE;
        }
        let readings = self.readings.clone();
        self.readings.clear();
        Frame { time, readings }
    }

    fn put(&mut self, slot: Slot, reading: Reading) {
        self.places[slot] = self.readings.len();
        self.readings.push((slot, reading));
    }
}
