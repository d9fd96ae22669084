//! The normal equations: the gain matrix HᵀWH, its right-hand side and its Cholesky factor (Abur & Expósito 2004, §2.6).

/// Unknowns are per unit of nominal and radians; one that no measurement fixes to within this spread is not known.
const WIDEST_SPREAD: f64 = 0.1;
/// Share of a diagonal element below which its pivot is rounding noise.
const ROUNDING: f64 = 1e-13;

/// Symmetric positive definite, lower triangle, with one more row and column that takes what concerns fixed quantities.
#[derive(Debug, Default)]
pub(super) struct Gain {
    unknowns: usize,
    g: Vec<f64>,
    pub b: Vec<f64>,
}

/// The measurements leave an unknown open.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Singular;

impl Gain {
    pub fn clear(&mut self, unknowns: usize) {
        self.unknowns = unknowns;
        self.g.clear();
        self.g.resize((unknowns + 1) * (unknowns + 1), 0.0);
        self.b.clear();
        self.b.resize(unknowns + 1, 0.0);
    }

    pub fn add(&mut self, i: usize, j: usize, value: f64) {
        let (row, column) = if i < j { (j, i) } else { (i, j) };
        self.g[row * (self.unknowns + 1) + column] += value;
    }

    /// Adds a weighted row over all unknowns and its weighted residual.
    pub fn add_row(&mut self, row: &[f64], residual: f64) {
        for (i, &a) in row.iter().enumerate().filter(|(_, a)| **a != 0.0) {
            self.b[i] += a * residual;
            for (j, &c) in row[..=i].iter().enumerate() {
                self.g[i * (self.unknowns + 1) + j] += a * c;
            }
        }
    }

    /// Replaces the matrix by its Cholesky factor.
    pub fn factor(&mut self) -> Result<(), Singular> {
        let stride = self.unknowns + 1;
        for i in 0..self.unknowns {
            let (above, row) = self.g.split_at_mut(i * stride);
            for j in 0..i {
                let other = &above[j * stride..=j * stride + j];
                let sum: f64 = (0..j).map(|k| row[k] * other[k]).sum();
                row[j] = (row[j] - sum) / other[j];
            }
            let pivot = row[i] - row[..i].iter().map(|l| l * l).sum::<f64>();
            // Written so that a NaN is singular too.
            if !(pivot > row[i] * ROUNDING && pivot * WIDEST_SPREAD * WIDEST_SPREAD >= 1.0) {
                return Err(Singular);
            }
            row[i] = pivot.sqrt();
        }
        Ok(())
    }

    /// Solves L·y = x in place.
    pub fn forward(&self, x: &mut [f64]) {
        let stride = self.unknowns + 1;
        for i in 0..self.unknowns {
            let row = &self.g[i * stride..=i * stride + i];
            let sum: f64 = (0..i).map(|k| row[k] * x[k]).sum();
            x[i] = (x[i] - sum) / row[i];
        }
    }

    /// Solves Lᵀ·x = y in place.
    fn backward(&self, y: &mut [f64]) {
        let stride = self.unknowns + 1;
        for i in (0..self.unknowns).rev() {
            let sum: f64 = (i + 1..self.unknowns).map(|k| self.g[k * stride + i] * y[k]).sum();
            y[i] = (y[i] - sum) / self.g[i * stride + i];
        }
    }

    /// The solution for the right-hand side; nothing for the fixed quantities.
    pub fn solve(&self, step: &mut Vec<f64>) {
        step.clone_from(&self.b);
        step[self.unknowns] = 0.0;
        self.forward(step);
        self.backward(step);
    }
}
