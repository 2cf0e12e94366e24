//! Shunt admittance: potential coefficients of bare wires, and cables with a screen of their own.

use nalgebra::DMatrix;

use super::carson::Conditions;
use super::layout::{Target, Wire};
use super::reduce::join;
use crate::math::{Complex64, PhaseMatrix};

/// Permittivity of free space, farads per metre (CODATA 2018).
pub const EPSILON_0: f64 = 8.854_187_812_8e-12;

/// Admittance over slots of bare wires above earth, siemens per metre; `None` where a diameter is not known.
///
/// `P_ij = ln(S_ij / D_ij) / (2 pi eps)`, own with the wire's radius, `S` the distance to the
/// image; `C = P^-1`; `Y = j w C` (Kersting, ch. 5). Wires held at earth are left out of the
/// result but shield the others; those of one slot are added up.
pub(super) fn overhead(wires: &[Wire], targets: &[Target], conditions: &Conditions) -> Option<PhaseMatrix> {
    let factor = 1.0 / (2.0 * std::f64::consts::PI * conditions.permittivity_f_per_m);
    let radii: Vec<f64> = wires.iter().map(|w| Some(w.diameter_m? / 2.0)).collect::<Option<_>>()?;
    let potential = DMatrix::from_fn(wires.len(), wires.len(), |i, j| {
        let (a, b) = (&wires[i], &wires[j]);
        let image = (a.x_m - b.x_m).hypot(a.y_m + b.y_m);
        let distance = if i == j { radii[i] } else { (a.x_m - b.x_m).hypot(a.y_m - b.y_m) };
        Complex64::from(factor * (image / distance).ln())
    });
    let capacitance = potential.lu().try_inverse()?;
    let joined = join(&capacitance, targets);
    let symmetric = (joined + joined.transpose()) * Complex64::from(0.5);
    Some(symmetric * Complex64::new(0.0, conditions.omega()))
}

/// Admittance of a concentric-neutral cable from its phase conductor to the earthed strands, siemens per metre.
///
/// `y = j w 2 pi eps / (ln(Rb / rc) - ln(k rs / Rb) / k)` with `Rb` the radius of the circle of
/// strand centres, `rc` and `rs` the radii of phase conductor and strand, `k` strands (Kersting, ch. 5).
pub fn concentric_siemens_per_m(
    circle_radius_m: f64,
    conductor_radius_m: f64,
    strand_radius_m: f64,
    strands: usize,
    relative_permittivity: f64,
    conditions: &Conditions,
) -> Complex64 {
    let k = strands as f64;
    let log = (circle_radius_m / conductor_radius_m).ln() - (k * strand_radius_m / circle_radius_m).ln() / k;
    let eps = relative_permittivity * conditions.permittivity_f_per_m;
    Complex64::new(0.0, conditions.omega() * 2.0 * std::f64::consts::PI * eps / log)
}

/// Admittance of a tape-shielded cable from its phase conductor to the earthed shield, siemens per metre:
/// `y = j w 2 pi eps / ln(Rb / rc)` with `Rb` the mean radius of the shield (Kersting, ch. 5).
pub fn tape_siemens_per_m(
    shield_radius_m: f64,
    conductor_radius_m: f64,
    relative_permittivity: f64,
    conditions: &Conditions,
) -> Complex64 {
    let eps = relative_permittivity * conditions.permittivity_f_per_m;
    let log = (shield_radius_m / conductor_radius_m).ln();
    Complex64::new(0.0, conditions.omega() * 2.0 * std::f64::consts::PI * eps / log)
}
