//! Two-ports, the bus admittance matrix and its reduction to the two terminals.
//!
//! Volts are kV line-to-line and currents kV/ohm (kA·√3), so that S\[MVA\] = V·conj(I) without a per-unit base.

mod admittance;
mod branch;
mod topology;
mod two_port;

pub use admittance::{Admittance, Reduced};
pub use branch::{Branch, FaultedBranch, fault_admittance};
pub use topology::Topology;
pub use two_port::TwoPort;

/// Complex number: impedances in ohm, admittances in siemens, voltages in kV.
pub type C64 = nalgebra::Complex<f64>;
/// 2×2 complex matrix over the two terminals.
pub type M2 = nalgebra::Matrix2<C64>;

/// Amperes in one unit of current, kV/ohm line-to-line.
pub const AMPERES: f64 = 577.350_269_189_625_8;
