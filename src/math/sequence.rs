//! Symmetrical components of three phasors (Fortescue 1918).

use crate::math::Complex64;

/// Zero-, positive- and negative-sequence voltages (or currents) of three phasors.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SequenceVoltages {
    /// Zero sequence, the mean of the three phasors.
    pub zero: Complex64,
    /// Positive sequence (rotation a, b, c).
    pub positive: Complex64,
    /// Negative sequence (rotation a, c, b).
    pub negative: Complex64,
}

/// Symmetrical components of `a`, `b`, `c`:
/// `V0 = (a + b + c)/3`, `V1 = (a + h b + h^2 c)/3`, `V2 = (a + h^2 b + h c)/3`, `h = 1 at 120 degrees`.
pub fn sequence_components(a: Complex64, b: Complex64, c: Complex64) -> SequenceVoltages {
    let h = Complex64::new(-0.5, crate::units::SQRT_3 / 2.0);
    let h2 = h.conj();
    SequenceVoltages {
        zero: (a + b + c) / 3.0,
        positive: (a + h * b + h2 * c) / 3.0,
        negative: (a + h2 * b + h * c) / 3.0,
    }
}

/// Voltage unbalance factor `|V2| / |V1|` in percent (IEC 61000-4-30, 5.7).
///
/// Returns `None` where there is no positive sequence to compare with.
pub fn unbalance_factor(a: Complex64, b: Complex64, c: Complex64) -> Option<f64> {
    let s = sequence_components(a, b, c);
    (s.positive.norm() > 0.0).then(|| 100.0 * s.negative.norm() / s.positive.norm())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::polar;

    #[test]
    fn a_balanced_set_is_all_positive_sequence() {
        let r = 2.0 * std::f64::consts::PI / 3.0;
        let (a, b, c) = (polar(230.0, 0.3), polar(230.0, 0.3 - r), polar(230.0, 0.3 + r));
        let s = sequence_components(a, b, c);
        assert!((s.positive - a).norm() < 1e-12);
        assert!(s.zero.norm() < 1e-12 && s.negative.norm() < 1e-12);
        assert!(unbalance_factor(a, c, b).unwrap() > 1e12);
        assert!(unbalance_factor(a, a, a).is_none_or(|p| p.is_finite()));
    }

    #[test]
    fn components_add_up_to_the_phasors() {
        let (a, b, c) = (polar(1.0, 0.1), polar(0.9, -2.0), polar(1.2, 2.2));
        let s = sequence_components(a, b, c);
        assert!((s.zero + s.positive + s.negative - a).norm() < 1e-15);
    }
}
