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

/// The candidates nearest to `text`, nearest first, if near enough to be slips of the keyboard: at
/// most a third of the letters differ, case apart (Damerau-Levenshtein distance).
pub fn nearest_text<'a>(text: &str, candidates: impl IntoIterator<Item = &'a str>) -> Vec<&'a str> {
    let wanted = text.trim().to_lowercase();
    let limit = (wanted.chars().count() / 3).max(1);
    let first_word = |c: &str| c.split_whitespace().next().unwrap_or("").to_lowercase();
    let distance = |c: &str| {
        let whole = strsim::damerau_levenshtein(&wanted, &c.to_lowercase());
        whole.min(strsim::damerau_levenshtein(&wanted, &first_word(c)))
    };
    let mut near: Vec<(usize, &str)> =
        candidates.into_iter().map(|c| (distance(c), c)).filter(|(d, _)| *d <= limit).collect();
    near.sort_by_key(|(d, _)| *d);
    near.into_iter().map(|(_, c)| c).take(5).collect()
}
