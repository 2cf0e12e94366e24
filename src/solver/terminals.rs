//! Terminal admittances of a transformer from its windings and neutral points.

use super::windings::{INNER, TO, bond, elements};
use crate::math::{Complex64, PhaseMatrix, ZERO};
use crate::network::{NeutralPoint, Transformer};

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

/// From-side terminals in rows 0 to 3, to-side terminals in rows 4 to 7 (the neutral points are 3
/// and 7), then the points inside.
type Primitive = nalgebra::SMatrix<Complex64, INNER_END, INNER_END>;

/// Three points inside at most.
const INNER_END: usize = INNER + 3;

impl Terminals {
    /// Joins the windings of all units and takes the neutral points where they go (see [`Transformer`]).
    pub fn of(t: &Transformer) -> Terminals {
        let mut y = Primitive::zeros();
        for element in t.units().flat_map(elements).chain(bond(t)) {
            for &(row, by) in &element.weights {
                for &(column, times) in &element.weights {
                    y[(row, column)] += element.siemens * (by * times);
                }
            }
        }
        for row in INNER..INNER_END {
            eliminate(&mut y, row);
        }
        join_neutral(&mut y, 3, t.from_neutral);
        join_neutral(&mut y, 3 + TO, t.to_neutral);
        Terminals {
            from: y.fixed_view::<4, 4>(0, 0).into_owned(),
            across: y.fixed_view::<4, 4>(0, TO).into_owned(),
            to: y.fixed_view::<4, 4>(TO, TO).into_owned(),
        }
    }
}

/// Takes the neutral point at `row` where it goes: stays a conductor, to earth, or nowhere.
fn join_neutral(y: &mut Primitive, row: usize, point: NeutralPoint) {
    match point {
        NeutralPoint::Conductor | NeutralPoint::None | NeutralPoint::Shared => {}
        NeutralPoint::Floating => eliminate(y, row),
        // Solid earth: its voltage is zero, so the row and column just go.
        NeutralPoint::Earthed(ohm) if ohm == ZERO => clear(y, row),
        NeutralPoint::Earthed(ohm) => {
            y[(row, row)] += ohm.inv();
            eliminate(y, row);
        }
    }
}

/// Takes out a point into which no current flows from outside.
fn eliminate(y: &mut Primitive, row: usize) {
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
    use crate::network::{VectorGroup, Winding};

    pub(in crate::solver) fn transformer(group: &str) -> Transformer {
        let neutral = |side: Winding| match side {
            _ if side.has_neutral() => NeutralPoint::Earthed(ZERO),
            _ if side.floats() => NeutralPoint::Floating,
            _ => NeutralPoint::None,
        };
        let group = VectorGroup::parse(group).unwrap();
        let [from, to] = group.windings().unwrap();
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
            from_tap_pu: 0.0,
            mates: Vec::new(),
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
            ("D", "zn"),
            ("D", "z"),
            ("Y", "zn"),
            ("YN", "z"),
            ("ZN", "y"),
            ("Z", "yn"),
            ("ZN", "d"),
            ("Z", "d"),
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
        for group in [
            "YNyn0", "Dyn11", "Dyn1", "YNd1", "Yd1", "Dd0", "Yy6", "Dy5", "Dzn0", "Yzn11", "Yz5", "ZNy1",
            "Zd6",
        ] {
            let y = Terminals::of(&transformer(group));
            let amps = y.from * balanced(11e3, 0.0);
            let rated = 500e3 / (crate::units::SQRT_3 * 11e3);
            let z = Complex64::new(0.01, 0.05);
            let expected = polar(rated, 0.0) / z;
            assert!((amps[0] - expected).norm() < 1e-9 * expected.norm(), "{group}: {} {expected}", amps[0]);
        }
    }
}
