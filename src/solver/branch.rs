//! Two-ports of the branches, and their elimination from the leaves to the source.
//!
//! A node `i` with all that hangs below it draws `J = Y V + K`, `Y` gathering what is linear.
//! Eliminating it across its branch gives `V_i = M V_p - N K_i` and, seen from the parent `p`,
//! `Y_p += P`, `K_p += M^T K_i` (every element here is reciprocal, so the transpose of `M`
//! carries currents upwards).

use super::terminals::Terminals;
use crate::math::{Complex64, ONE, PhaseMatrix, PhaseVector, ZERO};
use crate::network::{Branch, BranchKind, Conductor, Conductors, Connection, End, Network};

const N: usize = 3;

/// Impedance of a closed switch.
pub(super) static NO_IMPEDANCE: PhaseMatrix =
    PhaseMatrix::from_array_storage(nalgebra::ArrayStorage([[ZERO; 4]; 4]));

/// Admittance seen looking into a node, away from the source.
#[derive(Debug, Clone)]
pub(super) enum Seen {
    /// Only the neutral is shunted: a scalar, siemens, which keeps the elimination scalar.
    Neutral(Complex64),
    /// A full matrix, siemens.
    Full(Box<PhaseMatrix>),
}

impl Seen {
    /// Nothing shunts the node.
    pub fn nothing() -> Seen {
        Seen::Neutral(ZERO)
    }

    /// Adds a full matrix.
    pub fn add_matrix(&mut self, y: &PhaseMatrix) {
        match self {
            Seen::Full(sum) => **sum += y,
            Seen::Neutral(alpha) => {
                let mut sum = *y;
                sum[(N, N)] += *alpha;
                *self = Seen::Full(Box::new(sum));
            }
        }
    }

    /// Adds what another node's elimination passes up.
    pub fn add(&mut self, other: &Seen) {
        match (&mut *self, other) {
            (Seen::Neutral(alpha), Seen::Neutral(beta)) => *alpha += beta,
            (Seen::Full(sum), Seen::Neutral(beta)) => sum[(N, N)] += beta,
            (_, Seen::Full(y)) => self.add_matrix(y),
        }
    }

    /// As a full matrix.
    pub fn matrix(&self) -> PhaseMatrix {
        match self {
            Seen::Full(y) => **y,
            Seen::Neutral(alpha) => {
                let mut y = PhaseMatrix::zeros();
                y[(N, N)] = *alpha;
                y
            }
        }
    }
}

/// A branch seen from its end towards the source.
#[allow(clippy::large_enum_variant)] // one at a time, on the stack
pub(super) enum TwoPort<'a> {
    /// Series impedance: ohms per metre, times a length in metres (0 for a switch, 1 where the matrix is the whole).
    Series { per_m: &'a PhaseMatrix, length_m: f64 },
    /// Ideal ratio: `V_i = A V_p`, `I_p = A^T J_i`.
    Ratio(PhaseMatrix),
    /// Terminal admittances, siemens; `far` is the set of conductors at the node's end.
    Terminals { near: PhaseMatrix, across: PhaseMatrix, own: PhaseMatrix, far: Conductors },
}

/// What eliminating a node leaves for the iteration.
pub(super) enum Eliminated {
    /// `M = 1 - beta z_n e_n^T`, `N = Z - beta z_n z_n^T`: nothing but the neutral is shunted below.
    Series { beta: Complex64 },
    /// General `M` and `N`.
    Dense(Box<[PhaseMatrix; 2]>),
    /// Behind a winding that hardly anything holds to earth: `M`, `N` and a rank-one part of its own.
    Floating(Box<Floating>),
}

/// `N = n + q q^T scale`: what moves all conductors of a side together is kept apart. Its `scale`
/// may be a million times the rest, and multiplied out it would drown the voltages between conductors.
pub(super) struct Floating {
    pub m: PhaseMatrix,
    pub n: PhaseMatrix,
    pub q: PhaseVector,
    pub scale: Complex64,
}

impl Eliminated {
    fn dense(m: PhaseMatrix, n: PhaseMatrix) -> Eliminated {
        Eliminated::Dense(Box::new([m, n]))
    }
}

/// The linear part has no solution at the node.
#[derive(Debug)]
pub(super) struct SingularNode;

/// Eliminates a node that sees `below` across its branch; gives the iteration's matrices and what the parent sees.
pub(super) fn eliminate(port: &TwoPort<'_>, below: &Seen) -> Result<(Eliminated, Seen), SingularNode> {
    match port {
        TwoPort::Series { per_m, length_m } => series(per_m, *length_m, below),
        TwoPort::Ratio(a) => {
            let seen = match below {
                // Row n of A is that of the identity, so the scalar stays one.
                Seen::Neutral(alpha) => Seen::Neutral(*alpha),
                Seen::Full(y) => Seen::Full(Box::new(a.transpose() * **y * a)),
            };
            Ok((Eliminated::dense(*a, PhaseMatrix::zeros()), seen))
        }
        TwoPort::Terminals { near, across, own, far } => terminals(near, across, own, *far, below),
    }
}

/// `W = (1 + Z Y)^-1`, `M = W`, `N = W Z`, `P = Y W`; a scalar where only the neutral is shunted.
fn series(per_m: &PhaseMatrix, length_m: f64, below: &Seen) -> Result<(Eliminated, Seen), SingularNode> {
    match below {
        Seen::Neutral(alpha) => {
            let beta = alpha / (ONE + alpha * per_m[(N, N)] * length_m);
            if !beta.is_finite() {
                return Err(SingularNode);
            }
            Ok((Eliminated::Series { beta }, Seen::Neutral(beta)))
        }
        Seen::Full(y) => {
            let z = per_m * Complex64::from(length_m);
            let w = invert(&(PhaseMatrix::identity() + z * **y))?;
            Ok((Eliminated::dense(w, w * z), Seen::Full(Box::new(**y * w))))
        }
    }
}

/// `W = (Y_own + Y)^-1` over the far conductors, `M = -W Y_across^T`, `N = W`, `P = Y_near - Y_across W Y_across^T`.
fn terminals(
    near: &PhaseMatrix,
    across: &PhaseMatrix,
    own: &PhaseMatrix,
    far: Conductors,
    below: &Seen,
) -> Result<(Eliminated, Seen), SingularNode> {
    let (eliminated, m) = if let Some(together) = moves_freely(own, far) {
        let parts = isolated_winding(across, own, far, together, below)?;
        if parts.scale.norm() * parts.q.norm_squared() > 1e3 * parts.n.norm() {
            let m = parts.m;
            (Eliminated::Floating(Box::new(parts)), m)
        } else {
            (Eliminated::dense(parts.m, parts.n + parts.q * parts.q.transpose() * parts.scale), parts.m)
        }
    } else {
        let w = invert_over(&(own + below.matrix()), far)?;
        let m = -(w * across.transpose());
        (Eliminated::dense(m, w), m)
    };
    let mut p = near + across * m;
    if let Some(together) = moves_freely(near, carried(near)) {
        sum_to_zero(&mut p, together);
    }
    // Without shunts below or inside, P is zero but for rounding; dropping that keeps the feeder above scalar.
    let size = |y: &PhaseMatrix| y.iter().map(|x| x.norm()).fold(0.0, f64::max);
    let seen = if size(&p) <= 1e-12 * size(near) { Seen::nothing() } else { Seen::Full(Box::new(p)) };
    Ok((eliminated, seen))
}

/// Inverse over the conductors of a set, zero elsewhere.
fn invert_over(y: &PhaseMatrix, set: Conductors) -> Result<PhaseMatrix, SingularNode> {
    let mut y = *y;
    let absent = || (0..=N).filter(|&slot| !set.has_slot(slot));
    for k in absent() {
        y[(k, k)] = ONE;
    }
    let mut w = invert(&y)?;
    for k in absent() {
        w[(k, k)] = ZERO;
    }
    Ok(w)
}

/// Conductors that a winding leaves free to move together (`Y_own u = 0`, `u` one on each of them):
/// the phases where that is so, else all with the neutral; `None` where the winding itself is earthed.
fn moves_freely(own: &PhaseMatrix, far: Conductors) -> Option<Conductors> {
    let free = |set: &Conductors| (own * together(*set)).norm() <= 1e-12 * own.norm();
    [far.phases(), far].into_iter().find(free)
}

/// Conductors that an admittance matrix has an entry for.
fn carried(y: &PhaseMatrix) -> Conductors {
    let has = |c: &Conductor| y[(c.slot(), c.slot())] != ZERO;
    Conductor::ALL.into_iter().filter(has).fold(Conductors::NONE, Conductors::with)
}

/// Makes every row sum to zero over a set that its winding leaves free. Rounding is a share of the
/// winding's own admittance, and would tie a side to earth that hardly anything else holds.
fn sum_to_zero(p: &mut PhaseMatrix, set: Conductors) {
    for i in set.iter().map(Conductor::slot) {
        let others: Complex64 = set.iter().map(Conductor::slot).filter(|&j| j != i).map(|j| p[(i, j)]).sum();
        p[(i, i)] = -others;
    }
}

/// One on each conductor of a set.
fn together(set: Conductors) -> PhaseVector {
    PhaseVector::from_fn(|i, _| if set.has_slot(i) { ONE } else { ZERO })
}

/// The far side of a winding that leaves the conductors `moving` free (`Y_own u = 0`, `u` one on each).
///
/// In the basis `D` of their differences against one of them and of the other conductors, and `u`:
/// `A = D^T S D`, `S = Y_own + Y`, `r = Y u`, `q = u - D A^-1 D^T r`,
/// `1/scale = u^T r - r^T D A^-1 D^T r`; then `S^-1 = D A^-1 D^T + q q^T scale`, and
/// `M = -(D A^-1 D^T - q r^T D A^-1 D^T scale) Y_across^T`.
fn isolated_winding(
    across: &PhaseMatrix,
    own: &PhaseMatrix,
    far: Conductors,
    moving: Conductors,
    below: &Seen,
) -> Result<Floating, SingularNode> {
    let below = below.matrix();
    let last = moving.iter().last().ok_or(SingularNode)?;
    let others = far.without(last);
    let mut d = PhaseMatrix::zeros();
    for c in others.iter() {
        d[(c.slot(), c.slot())] = ONE;
        if moving.has(c) {
            d[(last.slot(), c.slot())] = -ONE;
        }
    }
    let together = together(moving);
    let a = invert_over(&(d.transpose() * (own + below) * d), others)?;
    let n = d * a * d.transpose();
    let r = below * together;
    let q = together - n * r;
    let scale = (together.transpose() * r - r.transpose() * n * r)[(0, 0)].inv();
    if !scale.is_finite() {
        return Err(SingularNode);
    }
    let m = -((n - q * (r.transpose() * n) * scale) * across.transpose());
    Ok(Floating { m, n, q, scale })
}

fn invert(a: &PhaseMatrix) -> Result<PhaseMatrix, SingularNode> {
    let inverse = a.lu().try_inverse().ok_or(SingularNode)?;
    if inverse.iter().all(|x| x.is_finite()) { Ok(inverse) } else { Err(SingularNode) }
}

/// The two-port of a branch, seen from its upstream end.
pub(super) fn two_port<'a>(
    network: &'a Network,
    branch: &Branch,
    upstream: End,
) -> Result<TwoPort<'a>, SingularNode> {
    Ok(match &branch.kind {
        BranchKind::Line(line) => TwoPort::Series {
            per_m: &network.construction(line).z_per_m,
            length_m: line.length_m / f64::from(line.sets),
        },
        BranchKind::Switch => TwoPort::Series { per_m: &NO_IMPEDANCE, length_m: 0.0 },
        BranchKind::Regulator(bank) => {
            let ratio = bank.ratio_matrix(branch.from_conductors.has_neutral());
            TwoPort::Ratio(match upstream {
                End::From => ratio,
                End::To => invert(&ratio)?,
            })
        }
        BranchKind::Transformer(t) => {
            let y = Terminals::of(t);
            match upstream {
                End::From => TwoPort::Terminals {
                    near: y.from,
                    across: y.across,
                    own: y.to,
                    far: branch.to_conductors,
                },
                End::To => TwoPort::Terminals {
                    near: y.to,
                    across: y.across.transpose(),
                    own: y.from,
                    far: branch.from_conductors,
                },
            }
        }
    })
}

/// Series impedance of the supply as a branch from its held voltages, ohms (see [`crate::network::Supply`]).
pub(super) fn supply_impedance(network: &Network) -> PhaseMatrix {
    let supply = &network.supply;
    let conductors = network.node(supply.node).conductors;
    let mut z = supply.impedance;
    for i in conductors.iter() {
        for j in conductors.iter() {
            z[(i.slot(), j.slot())] += Complex64::from(supply.earth_ohm);
        }
    }
    z
}

/// Linear admittance between pairs of conductors, siemens each, as a matrix to earth; `n` is earth where it is not carried.
pub(super) fn shunt_matrix(
    connection: Connection,
    siemens: Complex64,
    conductors: Conductors,
) -> PhaseMatrix {
    let mut y = PhaseMatrix::zeros();
    for (p, q) in connection.pairs() {
        let (i, j) = (p.slot(), q.slot());
        y[(i, i)] += siemens;
        if conductors.has(q) {
            y[(j, j)] += siemens;
            y[(i, j)] -= siemens;
            y[(j, i)] -= siemens;
        }
    }
    y
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Splitting off the common movement of a side gives the plain inverse where that one is sound.
    #[test]
    fn isolated_winding_is_the_plain_inverse() {
        let y = Terminals::of(&crate::solver::terminals::tests::transformer("Dd0"));
        let mut below = PhaseMatrix::zeros();
        for k in 0..3 {
            below[(k, k)] = Complex64::new(0.4 + 0.1 * k as f64, -0.2);
        }
        let below_seen = Seen::Full(Box::new(below));
        let parts =
            isolated_winding(&y.across, &y.to, Conductors::ABC, Conductors::ABC, &below_seen).unwrap();
        let w = invert_over(&(y.to + below), Conductors::ABC).unwrap();
        let joined = parts.n + parts.q * parts.q.transpose() * parts.scale;
        assert!((joined - w).norm() < 1e-12 * w.norm());
        assert!((parts.m + w * y.across.transpose()).norm() < 1e-10);
    }

    #[test]
    fn scalar_elimination_is_the_general_one() {
        let z =
            PhaseMatrix::from_fn(
                |i, j| if i == j { Complex64::new(0.3, 0.8) } else { Complex64::new(0.05, 0.4) },
            );
        let alpha = Complex64::new(0.1, 0.0);
        let (Eliminated::Series { beta }, Seen::Neutral(above)) =
            series(&z, 2.0, &Seen::Neutral(alpha)).unwrap()
        else {
            panic!("a neutral alone stays scalar")
        };
        let full = Seen::Neutral(alpha).matrix();
        let (Eliminated::Dense(matrices), Seen::Full(p)) =
            series(&z, 2.0, &Seen::Full(Box::new(full))).unwrap()
        else {
            panic!("a full matrix stays general")
        };
        let z_n = z.column(N) * Complex64::from(2.0);
        let mut m = PhaseMatrix::identity();
        m.set_column(N, &(m.column(N) - z_n * beta));
        assert!((matrices[0] - m).norm() < 1e-14);
        assert!((p[(N, N)] - above).norm() < 1e-15 && (*p - Seen::Neutral(above).matrix()).norm() < 1e-14);
    }
}
