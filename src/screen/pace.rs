//! When to draw: keys at once, data when they come, never more than twenty times a second.

use std::time::{Duration, Instant};

/// Keys held down draw this far apart.
const KEYS_APART: Duration = Duration::from_millis(50);
/// Data alone draw this far after any drawing, which leaves the rest of the twenty to keys.
const DATA_APART: Duration = Duration::from_millis(100);

/// Why to draw.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Why {
    /// Something changed.
    Data,
    /// Somebody waits for an answer.
    Key,
}

/// Remembers what is to be drawn, and what was.
#[derive(Debug, Default)]
pub struct Pace {
    wanted: Option<Why>,
    drawn: Option<Instant>,
    drawn_for_key: Option<Instant>,
}

impl Pace {
    /// Asks for a drawing.
    pub fn want(&mut self, why: Why) {
        self.wanted = self.wanted.max(Some(why));
    }

    /// When the next drawing is due; `None`: nothing is to be drawn.
    pub fn due(&self, now: Instant) -> Option<Instant> {
        let after = |last: Option<Instant>, apart| last.map_or(now, |last| last + apart);
        Some(match self.wanted? {
            Why::Key => after(self.drawn_for_key, KEYS_APART),
            Why::Data => after(self.drawn, DATA_APART),
        })
    }

    /// A drawing was made.
    pub fn done(&mut self, now: Instant) {
        self.drawn = Some(now);
        if self.wanted.take() == Some(Why::Key) {
            self.drawn_for_key = Some(now);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Drawings in the five seconds of a busy screen, and the longest that a key waited.
    fn busy(key_every_ms: u64, data_every_ms: u64) -> (usize, Duration) {
        let start = Instant::now();
        let (mut pace, mut drawings, mut longest, mut waiting) = (Pace::default(), 0, Duration::ZERO, None);
        for ms in 0..5000 {
            let now = start + Duration::from_millis(ms);
            if ms % key_every_ms == 7 % key_every_ms {
                pace.want(Why::Key);
                waiting = waiting.or(Some(now));
            }
            if ms % data_every_ms == 0 {
                pace.want(Why::Data);
            }
            if pace.due(now).is_some_and(|due| due <= now) {
                pace.done(now);
                drawings += 1;
                longest = longest.max(waiting.take().map_or(Duration::ZERO, |since| now - since));
            }
        }
        (drawings, longest)
    }

    #[test]
    fn never_more_than_twenty_a_second_and_no_key_waits_fifty_ms() {
        for key_every_ms in [1, 13, 33, 60, 101, 400] {
            for data_every_ms in [1, 17, 100] {
                let (drawings, longest) = busy(key_every_ms, data_every_ms);
                assert!(drawings <= 101, "{drawings} for keys every {key_every_ms} ms, data every {data_every_ms} ms");
                assert!(longest < Duration::from_millis(50), "{longest:?} for keys every {key_every_ms} ms");
            }
        }
    }
}
