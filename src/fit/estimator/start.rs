//! Where the iteration starts: no memory of earlier frames, so that the same frame always gives the same state.

use super::{Estimator, Meters, Wiring};
use crate::{
    feed::End,
    grid::{BusIndex, FROM, TO},
};

impl Estimator {
    /// A start near the state even if some measurements are far off: measured voltages where they are possible, and angles
    /// from bus to bus as the middle one of what the MW readings say.
    pub fn start(&mut self, wiring: &Wiring) {
        let buses = wiring.side.len();
        self.v.clear();
        self.v.extend((0..buses).map(|bus| {
            let kv = Meters::kv(bus);
            if self.w[kv] > 0.0 && (0.5..1.5).contains(&self.z[kv]) { self.z[kv] } else { 1.0 }
        }));
        self.angle.clear();
        self.angle.resize(buses, f64::NAN);
        self.angle[TO] = 0.0;
        if !wiring.joined() {
            self.angle[FROM] = 0.0;
        }
        for _ in 0..buses {
            for bus in 0..buses {
                if wiring.live(bus) && self.angle[bus].is_nan() {
                    self.angle[bus] = self.guess_angle(wiring, bus).unwrap_or(f64::NAN);
                }
            }
        }
        let reference = (0..buses).find(|bus| self.w[Meters::deg(*bus)] > 0.0);
        self.offset = reference.map_or(0.0, |bus| self.z[Meters::deg(bus)] - self.angle[bus]);
    }

    /// The middle of what the circuits to buses of known angle say; `None` without such a circuit.
    fn guess_angle(&mut self, wiring: &Wiring, bus: BusIndex) -> Option<f64> {
        self.guesses.clear();
        let mut neighbour = None;
        for wire in &wiring.wires {
            let [first, second] = wire.buses;
            let (known, sign) = if first == bus { (self.angle[second], 1.0) } else { (self.angle[first], -1.0) };
            if (first != bus && second != bus) || known.is_nan() {
                continue;
            }
            neighbour = Some(known);
            let v = wire.buses.map(|bus| self.v[bus]);
            for (end, mw) in [(End::From, wire.meters[0]), (End::To, wire.meters[2])] {
                if self.w[mw] > 0.0 {
                    self.guesses.push(known + sign * wire.angle_by_mw(end, self.z[mw], v));
                }
            }
        }
        self.guesses.sort_unstable_by(f64::total_cmp);
        let count = self.guesses.len();
        if count == 0 {
            return neighbour;
        }
        let [low, high] = [self.guesses[(count - 1) / 2], self.guesses[count / 2]];
        Some(if high.abs() < low.abs() { high } else { low })
    }
}
