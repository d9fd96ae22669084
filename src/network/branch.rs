//! A circuit as a branch between its two buses: whole, compensated, or with a fault on it.

use super::{C64, TwoPort};
use crate::grid::{Circuit, End, FaultKind, Line, LineTotals};

/// Admittance matrix of a reciprocal branch, S.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Branch {
    /// Driving point at the first bus.
    pub y11: C64,
    /// Transfer.
    pub y12: C64,
    /// Driving point at the second bus.
    pub y22: C64,
}

/// A branch with a shunt fault on it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FaultedBranch {
    /// What the buses see of it.
    pub branch: Branch,
    /// The bus held at zero voltage, where a bolted fault sits right at an end.
    pub shorted: Option<End>,
}

impl From<TwoPort> for Branch {
    fn from(port: TwoPort) -> Self {
        Self { y11: port.d / port.b, y12: -port.b.inv(), y22: port.a / port.b }
    }
}

/// Series impedance (ohm) and shunt admittance (S) of the whole circuit.
fn totals(line: Line) -> (C64, C64) {
    let LineTotals { r_ohm, x_ohm, b_us } = line.totals();
    (C64::new(r_ohm, x_ohm), C64::new(0.0, b_us * 1e-6))
}

/// The piece of a circuit between two fractions of it, with those inserted banks that stand in it.
fn piece(circuit: &Circuit, inserted: &[bool], [start, end]: [f64; 2], holds: impl Fn(f64) -> bool) -> TwoPort {
    let (z, y) = totals(circuit.line);
    let stretch = |length: f64| if length > 0.0 { TwoPort::line(z * length, y * length) } else { TwoPort::THROUGH };
    let mut port = TwoPort::THROUGH;
    let mut reached = start;
    for (bank, _) in circuit.banks.iter().zip(inserted).filter(|(_, inserted)| **inserted) {
        if holds(bank.at) {
            port = port * stretch(bank.at - reached) * TwoPort::series(C64::new(0.0, -bank.x_ohm));
            reached = bank.at;
        }
    }
    port * stretch(end - reached)
}

impl Branch {
    /// The circuit with those of its banks that are inserted: totals stand for the nominal π while nothing cuts them.
    pub fn of(circuit: &Circuit, inserted: &[bool]) -> Self {
        if let Line::Totals { .. } = circuit.line
            && !inserted.contains(&true)
        {
            let (z, y) = totals(circuit.line);
            let driving = z.inv() + y / 2.0;
            return Self { y11: driving, y12: -z.inv(), y22: driving };
        }
        piece(circuit, inserted, [0.0, 1.0], |_| true).into()
    }

    /// Current into the branch at an end, given the voltages of its first and second bus (kV).
    pub fn current(&self, end: End, first: C64, second: C64) -> C64 {
        match end {
            End::From => self.y11 * first + self.y12 * second,
            End::To => self.y12 * first + self.y22 * second,
        }
    }
}

/// Shunt that stands for a fault in the positive-sequence network, S; `None`: a short circuit.
///
/// Source: Grainger & Stevenson 1994, ch. 12 (fault shunts 0, Z2 + Z0, Z2, Z2·Z0/(Z2 + Z0)); Kimbark 1948, ch. 6.
pub fn fault_admittance(kind: FaultKind) -> Option<C64> {
    let z = match kind {
        FaultKind::ThreePhase => return None,
        FaultKind::PhaseEarth { z2, z0 } => z2 + z0,
        FaultKind::PhasePhase { z2 } => z2,
        FaultKind::PhasePhaseEarth { z2, z0 } => z2 * z0 / (z2 + z0),
    };
    (z.norm_sqr() > 0.0).then(|| z.inv())
}

impl FaultedBranch {
    /// The circuit with a fault at a fraction of it, counted from the given end: at 0 and 1 it sits at the buses, and in
    /// between, a bank at that very place lies behind it.
    pub fn of(circuit: &Circuit, inserted: &[bool], kind: FaultKind, at: f64, counted_from: End) -> Self {
        let at = match counted_from {
            End::From => at,
            End::To => 1.0 - at,
        };
        let near_holds = |place: f64| if counted_from == End::From { place < at } else { place <= at };
        let near = || piece(circuit, inserted, [0.0, at], near_holds);
        let far = || piece(circuit, inserted, [at, 1.0], |place| !near_holds(place));
        let whole = Branch::of(circuit, inserted);
        match fault_admittance(kind) {
            Some(y) if at <= 0.0 => Self { branch: Branch { y11: whole.y11 + y, ..whole }, shorted: None },
            Some(y) if at >= 1.0 => Self { branch: Branch { y22: whole.y22 + y, ..whole }, shorted: None },
            Some(y) => Self { branch: (near() * TwoPort::shunt(y) * far()).into(), shorted: None },
            None if at <= 0.0 => Self { branch: whole, shorted: Some(End::From) },
            None if at >= 1.0 => Self { branch: whole, shorted: Some(End::To) },
            None => {
                let (near, far) = (near(), far());
                // A bank that cancels its piece of line puts the short circuit right at the bus.
                let cancelled = |piece: &TwoPort| piece.b.norm() <= 1e-12 * totals(circuit.line).0.norm();
                let shorted = match (cancelled(&near), cancelled(&far)) {
                    (true, _) => Some(End::From),
                    (_, true) => Some(End::To),
                    _ => None,
                };
                let zero = C64::new(0.0, 0.0);
                let y11 = if shorted == Some(End::From) { zero } else { near.d / near.b };
                let y22 = if shorted == Some(End::To) { zero } else { far.a / far.b };
                Self { branch: Branch { y11, y12: zero, y22 }, shorted }
            }
        }
    }
}
