//! Phasors, vectors and matrices over up to four conductors, symmetrical components.
//!
//! A [`PhaseVector`] has four slots in the fixed order a, b, c, n; a conductor that is not
//! carried holds zero. A [`PhaseMatrix`] has rows and columns in the same order.

mod sequence;

pub use num_complex::Complex64;
pub use sequence::{SequenceVoltages, sequence_components, unbalance_factor};

/// Number of conductor slots: a, b, c, n.
pub const SLOTS: usize = 4;

/// One complex value a conductor, in the order a, b, c, n.
pub type PhaseVector = nalgebra::SVector<Complex64, SLOTS>;

/// Conductor-by-conductor matrix, rows and columns in the order a, b, c, n.
pub type PhaseMatrix = nalgebra::SMatrix<Complex64, SLOTS, SLOTS>;

/// Zero as a complex number.
pub const ZERO: Complex64 = Complex64::new(0.0, 0.0);
/// One as a complex number.
pub const ONE: Complex64 = Complex64::new(1.0, 0.0);

/// Phasor of `magnitude` at `angle_rad`.
pub fn polar(magnitude: f64, angle_rad: f64) -> Complex64 {
    Complex64::from_polar(magnitude, angle_rad)
}

/// Angle of a phasor in degrees, in (-180, 180]; zero for a zero phasor.
pub fn degrees(value: Complex64) -> f64 {
    value.arg().to_degrees()
}
