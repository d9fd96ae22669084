//! What the least squares can be trusted with: whether the angles are fixed at all, and which measurement is the odd one out.

use super::{super::meter::Meter, Estimator, Wiring};

impl Estimator {
    /// Whether MW and angle channels alone fix the angles: Mvar cannot tell which way power goes.
    pub fn angles_fixed(&mut self, wiring: &Wiring) -> bool {
        if wiring.wires.iter().all(|wire| self.w[wire.meters[0]] + self.w[wire.meters[2]] > 0.0) {
            return true;
        }
        self.assemble(wiring, f64::INFINITY);
        self.gain.clear(self.unknowns);
        let mut row = std::mem::take(&mut self.row);
        for meter in (0..self.w.len()).filter(|meter| self.w[*meter] > 0.0) {
            let active = if meter / 4 < wiring.side.len() { matches!(meter % 4, 1 | 2) } else { meter % 2 == 0 };
            if active {
                let residual = self.row_of(wiring, meter, &mut row);
                self.v_at.iter().for_each(|at| row[*at] = 0.0);
                self.gain.add_row(&row, residual);
            }
        }
        self.row = row;
        for &at in &self.v_at {
            self.gain.add(at, at, f64::MAX.sqrt());
        }
        self.gain.factor().is_ok()
    }

    /// The measurement with the largest normalised residual |r|/√Ω (Abur & Expósito 2004, §5.7), where the equations are made
    /// linear at a robust estimate, which a gross error does not drag along. Critical measurements (Ω = 0) say nothing.
    pub fn worst(&mut self, wiring: &Wiring) -> Option<Meter> {
        const BEND: f64 = 3.0;
        const CRITICAL: f64 = 1e-5;
        self.start(wiring);
        // Wherever it ends is nearer than where it started.
        let _ = self.iterate(wiring, BEND);
        self.assemble(wiring, f64::INFINITY);
        self.gain.factor().ok()?;
        self.gain.solve(&mut self.step);
        let mut row = std::mem::take(&mut self.row);
        let mut worst = None;
        let mut largest = 0.0;
        for meter in (0..self.w.len()).filter(|meter| self.w[*meter] > 0.0) {
            let before = self.row_of(wiring, meter, &mut row);
            let residual = before - row.iter().zip(&self.step).map(|(h, s)| h * s).sum::<f64>();
            self.gain.forward(&mut row);
            let omega = 1.0 - row[..self.unknowns].iter().map(|y| y * y).sum::<f64>();
            let normalised = residual.abs() / omega.sqrt();
            if omega > CRITICAL && normalised > largest * (1.0 + 1e-9) {
                (worst, largest) = (Some(meter), normalised);
            }
        }
        self.row = row;
        worst
    }
}
