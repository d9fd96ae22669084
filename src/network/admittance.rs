//! The bus admittance matrix, and its Kron reduction to the two terminals (Kron 1939; Grainger & Stevenson 1994, ch. 7).

use super::{Branch, C64, M2};

/// Bus admittance matrix, S, row by row; the terminals are its first two buses.
#[derive(Debug, Clone, PartialEq)]
pub struct Admittance {
    size: usize,
    y: Vec<C64>,
}

/// What is left of a network at its terminals.
#[derive(Debug, Clone, PartialEq)]
pub struct Reduced {
    /// Terminal currents = `y` · terminal voltages, S.
    pub y: M2,
    /// Voltage of each station = row · terminal voltages.
    pub stations: Vec<[C64; 2]>,
}

const ZERO: C64 = C64::new(0.0, 0.0);

impl Admittance {
    /// Buses without anything between them.
    pub fn new(size: usize) -> Self {
        Self { size, y: vec![ZERO; size * size] }
    }

    /// Element of two buses, S.
    pub fn at(&self, row: usize, column: usize) -> C64 {
        self.y[row * self.size + column]
    }

    fn at_mut(&mut self, row: usize, column: usize) -> &mut C64 {
        &mut self.y[row * self.size + column]
    }

    /// Adds a branch between two buses.
    pub fn add(&mut self, [first, second]: [usize; 2], branch: Branch) {
        *self.at_mut(first, first) += branch.y11;
        *self.at_mut(second, second) += branch.y22;
        *self.at_mut(first, second) += branch.y12;
        *self.at_mut(second, first) += branch.y12;
    }

    /// Adds a shunt admittance at a bus, S.
    pub fn add_shunt(&mut self, bus: usize, y: C64) {
        *self.at_mut(bus, bus) += y;
    }

    /// Copies another matrix over this one, without allocating where the sizes agree.
    pub fn copy_from(&mut self, other: &Self) {
        self.size = other.size;
        self.y.clone_from(&other.y);
    }

    /// Eliminates the stations, in place. One that is not `live` (dead or shorted) is left out, at zero voltage.
    pub fn reduce_into(&mut self, live: &[bool], reduced: &mut Reduced) {
        let n = self.size;
        for k in (2..n).rev().filter(|k| live[*k]) {
            let pivot = self.at(k, k).inv();
            for i in (0..k).filter(|i| live[*i]) {
                let factor = self.at(i, k) * pivot;
                for j in (0..k).filter(|j| live[*j]) {
                    let correction = factor * self.at(k, j);
                    *self.at_mut(i, j) -= correction;
                }
            }
        }
        reduced.y = M2::new(self.at(0, 0), self.at(0, 1), self.at(1, 0), self.at(1, 1));
        reduced.stations.clear();
        for k in 2..n {
            let mut row = [ZERO; 2];
            if live[k] {
                let pivot = -self.at(k, k).inv();
                for (column, cell) in row.iter_mut().enumerate() {
                    let mut sum = self.at(k, column);
                    for s in (2..k).filter(|s| live[*s]) {
                        sum += self.at(k, s) * reduced.stations[s - 2][column];
                    }
                    *cell = pivot * sum;
                }
            }
            reduced.stations.push(row);
        }
    }
}

impl Default for Reduced {
    fn default() -> Self {
        Self { y: M2::zeros(), stations: Vec::new() }
    }
}

impl Reduced {
    /// Voltage of a bus as a row over the terminal voltages.
    pub fn row(&self, bus: usize) -> [C64; 2] {
        const ONE: C64 = C64::new(1.0, 0.0);
        match bus {
            0 => [ONE, ZERO],
            1 => [ZERO, ONE],
            station => self.stations[station - 2],
        }
    }
}
