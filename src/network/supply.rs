//! The supply point: a balanced or unbalanced held voltage behind an impedance.

use super::draft::{FaultLevel, SupplyRecord};
use super::model::NodeId;
use crate::math::{Complex64, PhaseMatrix, PhaseVector, ZERO, polar};

/// The supply of a network.
///
/// The star point of the three held voltages is the node's `n` where it has one and is earthed
/// through `earth_ohm`; with `J` the current drawn from the source in each conductor and
/// `Zs` the phase impedance, `V = E - Zs J - earth_ohm (Ja + Jb + Jc + Jn)` on every conductor.
#[derive(Debug, Clone)]
pub struct Supply {
    /// Node fed.
    pub node: NodeId,
    /// Nominal line-to-line voltage, volts.
    pub nominal_volts: f64,
    /// Held voltages behind the impedance, volts to the star point; the `n` slot is zero.
    pub held_volts: PhaseVector,
    /// Phase impedance from the fault levels, ohms; zero for a stiff source. The `n` row and column are zero.
    pub impedance: PhaseMatrix,
    /// Earthing of the star point, ohms.
    pub earth_ohm: f64,
}

/// Held voltages of a supply record, volts to the star point.
pub(super) fn held_volts(record: &SupplyRecord) -> PhaseVector {
    let phase = record.nominal_volts / crate::units::SQRT_3;
    let mut held = PhaseVector::zeros();
    for (k, pu) in record.held_pu.into_iter().enumerate() {
        let lag = 2.0 * std::f64::consts::PI / 3.0 * k as f64;
        held[k] = polar(phase * pu, record.angle_rad - lag);
    }
    held
}

/// Positive- and zero-sequence impedance in ohms from the fault levels; `None` for a stiff source.
///
/// `Z1 = U^2 / S3`; a single-phase fault gives `2 Z1 + Z0 = 3 U^2 / S1` with `S1 = sqrt(3) U I1`
/// (IEC 60909-0, 4.2 and 7.5 with c = 1), each at the angle of its X/R.
pub(super) fn sequence_impedance(record: &SupplyRecord) -> Option<(Complex64, Complex64)> {
    let at = |level: FaultLevel, times: f64| {
        let magnitude = times * record.nominal_volts * record.nominal_volts / level.volt_amperes;
        polar(magnitude, level.x_over_r.atan())
    };
    let three = record.three_phase?;
    let z1 = at(three, 1.0);
    let z0 = record.single_phase.map_or(z1, |level| at(level, 3.0) - 2.0 * z1);
    Some((z1, z0))
}

/// Phase impedance matrix of a circulant three-phase element from its sequence impedances.
pub(super) fn circulant(z1: Complex64, z0: Complex64) -> PhaseMatrix {
    let (own, mutual) = ((z0 + 2.0 * z1) / 3.0, (z0 - z1) / 3.0);
    PhaseMatrix::from_fn(|i, j| match (i, j) {
        (3, _) | (_, 3) => ZERO,
        _ if i == j => own,
        _ => mutual,
    })
}
