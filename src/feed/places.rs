use super::{Channels, Reading, Slot};

/// Where each slot stands among some readings. What it holds are guesses that are checked, so it never needs clearing
/// (Briggs and Torczon, An efficient representation for sparse sets, 1993).
#[derive(Debug)]
pub(super) struct Places(Vec<usize>);

impl Places {
    pub fn new(channels: &Channels) -> Self {
        Self(vec![0; channels.len()])
    }

    pub fn find<'a>(&self, readings: &'a mut [(Slot, Reading)], slot: Slot) -> Option<&'a mut Reading> {
        readings.get_mut(self.0[slot]).filter(|(found, _)| *found == slot).map(|(_, reading)| reading)
    }

    pub fn push(&mut self, readings: &mut Vec<(Slot, Reading)>, slot: Slot, reading: Reading) {
        self.0[slot] = readings.len();
        readings.push((slot, reading));
    }
}
