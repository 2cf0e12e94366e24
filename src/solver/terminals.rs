//! Terminal admittances of a transformer from its vector group, ratings and neutral points.

use crate::math::{Complex64, PhaseMatrix, ZERO};
use crate::network::{NeutralPoint, Transformer, VectorGroup, Winding};

const N: usize = 3;

/// Terminal admittances of a transformer, siemens: `I_from = from V_from + across V_to`,
/// `I_to = across^T V_from + to V_to`, both into the transformer.
#[derive(Debug, Clone)]
pub(super) struct Terminals {
    /// From-side own admittance.
    pub from: PhaseMatrix,
    /// Admittance between the sides.
    pub across: PhaseMatrix,
    /// To-side own admittance.
    pub to: PhaseMatrix,
}

/// From-side terminals in rows 0 to 3, to-side terminals in rows 4 to 7; the neutral points are 3 and 7.
type Primitive = nalgebra::SMatrix<Complex64, 8, 8>;

impl Terminals {
    /// Joins the units' windings and takes the neutral points where they go (see [`Transformer`]).
    pub fn of(t: &Transformer) -> Terminals {
        let mut y = Primitive::zeros();
        let unit = UnitAdmittance::of(t);
        for [from, to] in units(t) {
            let ends = [(from.0, 1.0), (from.1, -1.0), (to.0 + 4, 1.0), (to.1 + 4, -1.0)];
            for (i, (row, row_sign)) in ends.into_iter().enumerate() {
                for (j, (column, column_sign)) in ends.into_iter().enumerate() {
                    let element = match (i < 2, j < 2) {
                        (true, true) => unit.from,
                        (false, false) => unit.to,
                        _ => unit.across,
                    };
                    y[(row, column)] += element * (row_sign * column_sign);
                }
            }
        }
        join_neutral(&mut y, 3, t.from_neutral);
        join_neutral(&mut y, 7, t.to_neutral);
        Terminals {
            from: y.fixed_view::<4, 4>(0, 0).into_owned(),
            across: y.fixed_view::<4, 4>(0, 4).into_owned(),
            to: y.fixed_view::<4, 4>(4, 4).into_owned(),
        }
    }
}

/// Admittances of one two-winding unit in its winding voltages.
struct UnitAdmittance {
    from: Complex64,
    across: Complex64,
    to: Complex64,
}

impl UnitAdmittance {
    fn of(t: &Transformer) -> UnitAdmittance {
        let (count, from_volts, to_volts) = match t.group {
            VectorGroup::Single { .. } => (1.0, t.from_volts, t.to_volts),
            VectorGroup::Three { from, to, .. } => {
                (3.0, winding_volts(from, t.from_volts), winding_volts(to, t.to_volts))
            }
        };
        let unit_va = t.rated_va / count;
        let leakage = Complex64::new(t.r_pu, t.x_pu) * (to_volts * to_volts / unit_va);
        let y = leakage.inv();
        let ratio = from_volts / (to_volts * (1.0 + t.tap_pu));
        let no_load =
            Complex64::new(t.no_load_watts / count, -t.magnetizing_pu * unit_va) / (from_volts * from_volts);
        UnitAdmittance { from: y / (ratio * ratio) + no_load, across: -y / ratio, to: y }
    }
}

fn winding_volts(winding: Winding, line_to_line: f64) -> f64 {
    match winding {
        Winding::Delta => line_to_line,
        Winding::Star | Winding::StarNeutral => line_to_line / crate::units::SQRT_3,
    }
}

/// Start and end terminal slots of the from and the to winding of each unit.
fn units(t: &Transformer) -> Vec<[(usize, usize); 2]> {
    let turn = |pair: (usize, usize), reversed: bool| if reversed { (pair.1, pair.0) } else { pair };
    match (t.group, t.terminals) {
        (VectorGroup::Three { from, to, clock }, _) => {
            let joint = Joint::of(from, to, clock);
            (0..3).map(|k| joint.unit(k)).collect()
        }
        (VectorGroup::Single { clock }, Some(connection)) => {
            let pairs = connection.pairs().map(|(p, q)| (p.slot(), q.slot()));
            pairs.map(|pair| [pair, turn(pair, clock == 6)]).collect()
        }
        (VectorGroup::Single { .. }, None) => Vec::new(),
    }
}

/// How the units of a bank are joined for a clock number (the rules stand at [`Transformer`]).
struct Joint {
    from: Winding,
    to: Winding,
    /// Whether a delta joins k to k-1 instead of k+1.
    backward: bool,
    /// Places each to-terminal moves back.
    shift: usize,
    reversed: bool,
}

impl Joint {
    fn of(from: Winding, to: Winding, clock: u8) -> Joint {
        let clock = usize::from(clock);
        let alike = (from == Winding::Delta) == (to == Winding::Delta);
        let (base, reversed) = match (alike, clock % 4) {
            (true, 0) => (0, false),
            (true, _) => (6, true),
            (false, 1) => (1, false),
            (false, _) => (11, false),
        };
        let to_delta = to == Winding::Delta;
        let backward = !alike && (base == 1) != to_delta;
        Joint { from, to, backward, shift: (clock + 12 - base) % 12 / 4, reversed }
    }

    fn unit(&self, k: usize) -> [(usize, usize); 2] {
        let ends = |winding: Winding, k: usize| match winding {
            Winding::Delta => (k, (k + if self.backward { 2 } else { 1 }) % 3),
            Winding::Star | Winding::StarNeutral => (k, N),
        };
        let back = |slot: usize| if slot == N { N } else { (slot + 3 - self.shift) % 3 };
        let (start, end) = ends(self.to, k);
        let to = (back(start), back(end));
        [ends(self.from, k), if self.reversed { (to.1, to.0) } else { to }]
    }
}

/// Takes the neutral point at `row` where it goes: stays a conductor, to earth, or nowhere.
fn join_neutral(y: &mut Primitive, row: usize, point: NeutralPoint) {
    match point {
        NeutralPoint::Conductor | NeutralPoint::None => return,
        NeutralPoint::Floating => {}
        NeutralPoint::Earthed(ohm) if ohm > 0.0 => y[(row, row)] += Complex64::from(ohm.recip()),
        NeutralPoint::Earthed(_) => {
            // Solid earth: its voltage is zero, so the row and column just go.
            clear(y, row);
            return;
        }
    }
    let pivot = y[(row, row)];
    let size = y.iter().map(|x| x.norm()).fold(0.0, f64::max);
    // Where both star points float only their difference counts: the second pivot vanishes with its row.
    if pivot.norm() > 1e-10 * size {
        let column = y.column(row).into_owned();
        let line = y.row(row).into_owned();
        *y -= column * line / pivot;
    }
    clear(y, row);
}

fn clear(y: &mut Primitive, row: usize) {
    y.row_mut(row).fill(ZERO);
    y.column_mut(row).fill(ZERO);
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;
    use crate::math::{PhaseVector, polar};

    pub(in crate::solver) fn transformer(group: &str) -> Transformer {
        let neutral = |side: Winding| match side {
            Winding::StarNeutral => NeutralPoint::Earthed(0.0),
            Winding::Star => NeutralPoint::Floating,
            Winding::Delta => NeutralPoint::None,
        };
        let group = VectorGroup::parse(group).unwrap();
        let VectorGroup::Three { from, to, .. } = group else { unreachable!() };
        Transformer {
            group,
            terminals: None,
            rated_va: 500e3,
            from_volts: 11e3,
            to_volts: 400.0,
            r_pu: 0.01,
            x_pu: 0.05,
            no_load_watts: 0.0,
            magnetizing_pu: 0.0,
            tap_pu: 0.0,
            from_neutral: neutral(from),
            to_neutral: neutral(to),
        }
    }

    fn balanced(volts: f64, lag_rad: f64) -> PhaseVector {
        let third = 2.0 * std::f64::consts::PI / 3.0;
        let angle = |k: usize| -lag_rad - third * k as f64;
        PhaseVector::from_fn(|k, _| if k < 3 { polar(volts / crate::units::SQRT_3, angle(k)) } else { ZERO })
    }

    #[test]
    fn every_group_turns_by_its_clock_number_and_carries_no_current_at_rated_ratio() {
        for (from, to) in [
            ("YN", "yn"),
            ("Y", "y"),
            ("D", "d"),
            ("D", "yn"),
            ("YN", "d"),
            ("Y", "d"),
            ("D", "y"),
            ("YN", "y"),
        ] {
            for clock in 0..12u8 {
                let text = format!("{from}{to}{clock}");
                if VectorGroup::parse(&text).is_none() {
                    continue;
                }
                let y = Terminals::of(&transformer(&text));
                let primary = balanced(11e3, 0.0);
                let secondary = balanced(400.0, f64::from(clock) * std::f64::consts::PI / 6.0);
                let rated = 500e3 / (crate::units::SQRT_3 * 400.0);
                let amps = y.across.transpose() * primary + y.to * secondary;
                assert!(amps.norm() < 1e-9 * rated, "{text}: {amps}");
                assert!((y.from * primary + y.across * secondary).norm() < 1e-9 * rated, "{text}");
            }
        }
    }

    #[test]
    fn short_circuit_current_is_rated_over_impedance() {
        for group in ["YNyn0", "Dyn11", "Dyn1", "YNd1", "Yd1", "Dd0", "Yy6", "Dy5"] {
            let y = Terminals::of(&transformer(group));
            let amps = y.from * balanced(11e3, 0.0);
            let rated = 500e3 / (crate::units::SQRT_3 * 11e3);
            let z = Complex64::new(0.01, 0.05);
            let expected = polar(rated, 0.0) / z;
            assert!((amps[0] - expected).norm() < 1e-9 * expected.norm(), "{group}: {} {expected}", amps[0]);
        }
    }
}
