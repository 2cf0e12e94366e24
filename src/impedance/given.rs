//! Constructions whose impedance is given rather than computed: sequence values, wires in conduit.

use super::NEUTRAL;
use super::carson::{Conditions, EarthReturn, earth_return_ohm_per_m};
use crate::math::{Complex64, PhaseMatrix, ZERO};

/// Sequence impedances of a line per metre, ohms, and charging, siemens.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sequence {
    /// Positive-sequence impedance.
    pub z1: Complex64,
    /// Zero-sequence impedance.
    pub z0: Complex64,
    /// Positive-sequence susceptance.
    pub b1: f64,
    /// Zero-sequence susceptance.
    pub b0: f64,
}

/// Distance for which the common earth-return part is taken where a construction gives none, metres.
const NOMINAL_SPACING_M: f64 = 0.02;

/// Matrices over slots from sequence values; `phases` are the phase slots carried.
///
/// Without a neutral: own `(Z0 + 2 Z1)/3`, mutual `(Z0 - Z1)/3`. With one, `Z0` is taken to return
/// in the neutral: with a common part `m`, phases own `Z1 + m`, neutral own `(Z0 - Z1)/3 + m`, all
/// mutuals `m`; every loop through phases and neutral is then right whatever `m` is, and `m`, the
/// earth return of wires 20 mm apart, matters only for current that returns through the earth.
pub fn sequence(
    values: &Sequence,
    phases: &[usize],
    neutral: bool,
    conditions: &Conditions,
) -> (PhaseMatrix, PhaseMatrix) {
    let mut y = PhaseMatrix::zeros();
    let (own_b, mutual_b) = ((values.b0 + 2.0 * values.b1) / 3.0, (values.b0 - values.b1) / 3.0);
    for &i in phases {
        for &j in phases {
            y[(i, j)] = Complex64::new(0.0, if i == j { own_b } else { mutual_b });
        }
    }
    if neutral {
        let z = four_wire(values.z1, (values.z0 - values.z1) / 3.0, phases, conditions);
        return (z, y);
    }
    let (own, mutual) = ((values.z0 + 2.0 * values.z1) / 3.0, (values.z0 - values.z1) / 3.0);
    let mut z = PhaseMatrix::zeros();
    for &i in phases {
        for &j in phases {
            z[(i, j)] = if i == j { own } else { mutual };
        }
    }
    (z, y)
}

/// Matrix over slots of wires in one conduit from the line-to-neutral impedance of a phase wire and of the
/// neutral, ohms per metre; the common earth-return part is that of wires 20 mm apart.
pub fn conduit(
    phase: Complex64,
    neutral: Option<Complex64>,
    phases: &[usize],
    conditions: &Conditions,
) -> PhaseMatrix {
    let mut z = four_wire(phase, neutral.unwrap_or(phase), phases, conditions);
    if neutral.is_none() {
        for k in 0..4 {
            z[(NEUTRAL, k)] = ZERO;
            z[(k, NEUTRAL)] = ZERO;
        }
    }
    z
}

fn four_wire(phase: Complex64, neutral: Complex64, phases: &[usize], conditions: &Conditions) -> PhaseMatrix {
    let common = earth_return_ohm_per_m(EarthReturn::Modified, NOMINAL_SPACING_M, 0.0, 0.0, conditions);
    let carried: Vec<usize> = phases.iter().copied().chain([NEUTRAL]).collect();
    let mut z = PhaseMatrix::zeros();
    for &i in &carried {
        for &j in &carried {
            let own = if i == NEUTRAL { neutral } else { phase };
            z[(i, j)] = if i == j { own + common } else { common };
        }
    }
    z
}
