//! From primitive conductors to those a line carries: Kron reduction, bundles and parallel neutrals in one.

use nalgebra::DMatrix;

use super::layout::Target;
use crate::math::{Complex64, PhaseMatrix};

/// Impedance over slots a, b, c, n from a primitive one.
///
/// Conductors with the same slot are joined at both ends and share its voltage; those to earth are
/// held at zero (Kron reduction). With `V = A V_slots`, `Y_slots = A^T Z^-1 A`, and its inverse
/// over the slots present is the result; other rows and columns are zero. `None` where a matrix is
/// singular.
pub fn to_slots(primitive: &DMatrix<Complex64>, targets: &[Target]) -> Option<PhaseMatrix> {
    let admittance = primitive.clone().lu().try_inverse()?;
    let joined = join(&admittance, targets);
    let slots: Vec<usize> = (0..4).filter(|&s| targets.contains(&Target::Slot(s))).collect();
    let inner = DMatrix::from_fn(slots.len(), slots.len(), |i, j| joined[(slots[i], slots[j])]);
    let inverse = inner.lu().try_inverse()?;
    let mut result = PhaseMatrix::zeros();
    for (i, &row) in slots.iter().enumerate() {
        for (j, &column) in slots.iter().enumerate() {
            // Both orders of an element differ in the last bit only; the mean keeps the matrix symmetric.
            result[(row, column)] = 0.5 * (inverse[(i, j)] + inverse[(j, i)]);
        }
    }
    result.iter().all(|z| z.is_finite()).then_some(result)
}

/// `A^T Y A`: rows and columns of the same slot added up, those to earth left out.
pub(super) fn join(admittance: &DMatrix<Complex64>, targets: &[Target]) -> PhaseMatrix {
    let mut joined = PhaseMatrix::zeros();
    for (i, row) in targets.iter().enumerate() {
        for (j, column) in targets.iter().enumerate() {
            if let (Target::Slot(r), Target::Slot(c)) = (row, column) {
                joined[(*r, *c)] += admittance[(i, j)];
            }
        }
    }
    joined
}
