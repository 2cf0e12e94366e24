//! Transformers of the nodal method, coil by coil: an unknown current for every coil and an unknown
//! flux for every core, the connection of a vector group found by trying them until the phasors show its clock number.

use std::f64::consts::PI;

use fourwire::math::Complex64;
use fourwire::network::{
    BOND_OHM, Branch, Conductor, NeutralPoint, NodeId, Transformer, VectorGroup, Winding,
};

use super::{Numbering, System, Terminal};

/// The terminals of both sides of a transformer: three phases and the star point each.
struct Sides([[Terminal; 4]; 2]);

struct Coil {
    core: usize,
    /// Rated voltage with tap over the from side's rated voltage.
    turns: f64,
    leakage_ohm: Complex64,
    ends: [Terminal; 2],
}

pub(super) fn add_transformer(t: &Transformer, branch: &Branch, numbering: &Numbering, system: &mut System) {
    let excited = t.units().any(|u| u.no_load_watts != 0.0 || u.magnetizing_pu != 0.0);
    // Where the cores carry no exciting current, one floating star point of a pair has no voltage of its own.
    let windings = t.group.windings().unwrap_or([Winding::Delta; 2]);
    let points = [t.from_neutral, t.to_neutral];
    let floats = |side: usize| windings[side].is_star() && points[side] == NeutralPoint::Floating;
    let idle = |side: usize| !excited && floats(side) && (windings[1 - side].is_zigzag() || floats(1 - side));
    let idle = [1, 0].into_iter().find(|&side| idle(side));
    let mut stars = [None, None];
    for (side, node) in [branch.from, branch.to].into_iter().enumerate() {
        if idle != Some(side) {
            stars[side] = star_point(points[side], node, numbering, system);
        }
    }
    match (t.from_neutral, t.to_neutral) {
        (NeutralPoint::Shared, _) => stars[0] = stars[1],
        (_, NeutralPoint::Shared) => stars[1] = stars[0],
        (NeutralPoint::Conductor, NeutralPoint::Conductor)
            if matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto) =>
        {
            system.admittance(stars[0], stars[1], Complex64::from(1.0 / BOND_OHM));
        }
        _ => {}
    }
    let at = |node: NodeId, star: Terminal| {
        let slots = numbering.0[node.index()];
        [slots[0], slots[1], slots[2], star]
    };
    let sides = Sides([at(branch.from, stars[0]), at(branch.to, stars[1])]);
    for unit in t.units() {
        add_unit(unit, &sides, system);
    }
}

/// A star point as a terminal: its own unknown, a conductor, or earth.
fn star_point(point: NeutralPoint, node: NodeId, numbering: &Numbering, system: &mut System) -> Terminal {
    match point {
        NeutralPoint::None | NeutralPoint::Shared => None,
        NeutralPoint::Conductor => numbering.at(node, Conductor::N),
        NeutralPoint::Floating => Some(system.unknown()),
        NeutralPoint::Earthed(ohm) if ohm.norm() > 0.0 => {
            let star = Some(system.unknown());
            system.admittance(star, None, 1.0 / ohm);
            star
        }
        NeutralPoint::Earthed(_) => None,
    }
}

fn add_unit(t: &Transformer, sides: &Sides, system: &mut System) {
    let base_volts = t.from_volts;
    let (coils, exciting, cores) = match t.group {
        VectorGroup::Three { from, to, clock } => bank(t, [from, to], clock, sides, system),
        VectorGroup::Auto => bank(t, [Winding::StarNeutral; 2], 0, sides, system),
        _ => single(t, sides),
    };
    let flux: Vec<usize> = (0..cores).map(|_| system.unknown()).collect();
    for coil in &coils {
        let current = system.unknown();
        let [start, end] = coil.ends;
        // Voltage across = turns x flux + leakage x current into the start.
        system.difference(Some(current), [start, end], Complex64::from(1.0));
        system.add(Some(current), Some(flux[coil.core]), Complex64::from(-coil.turns));
        system.add(Some(current), Some(current), -coil.leakage_ohm);
        system.add(start, Some(current), Complex64::from(1.0));
        system.add(end, Some(current), Complex64::from(-1.0));
        // The ampere-turns of a core add up to nothing.
        system.add(Some(flux[coil.core]), Some(current), Complex64::from(coil.turns));
    }
    let va = Complex64::new(t.no_load_watts, -t.magnetizing_pu * t.rated_va) / cores as f64;
    for (volts, [start, end]) in exciting {
        system.admittance(start, end, va / (volts * base_volts).powi(2));
    }
}

/// Coils, where the cores are excited (rated voltage over the from side's, ends), number of cores.
type Parts = (Vec<Coil>, Vec<(f64, [Terminal; 2])>, usize);

fn single(t: &Transformer, sides: &Sides) -> Parts {
    let terminals = t.terminals.expect("a single-phase unit has terminals");
    let ends = |side: usize| {
        let (p, q) = terminals[side].pairs().next().expect("one element");
        [sides.0[side][p.slot()], sides.0[side][q.slot()]]
    };
    let z = Complex64::new(t.r_pu, t.x_pu);
    let (ratio, taps) = (t.to_volts / t.from_volts, [1.0 + t.from_tap_pu, 1.0 + t.tap_pu]);
    let ohm = |volts: f64| volts * volts / t.rated_va;
    let from = ends(0);
    let mut coils = Vec::new();
    match t.group {
        VectorGroup::CentreTap { clock } => {
            let leakage = Complex64::new(z.re / 2.0, 0.8 * z.im) * ohm(t.from_volts);
            coils.push(Coil { core: 0, turns: taps[0], leakage_ohm: leakage, ends: from });
            let [s1, s2, _, n] = sides.0[1];
            for mut half in [[s1, n], [n, s2]] {
                if clock == 6 {
                    half.reverse();
                }
                let leakage_ohm = Complex64::new(z.re, 0.4 * z.im) * ohm(t.to_volts / 2.0);
                coils.push(Coil { core: 0, turns: ratio / 2.0 * taps[1], leakage_ohm, ends: half });
            }
        }
        group => {
            let mut to = ends(1);
            if group == (VectorGroup::Single { clock: 6 }) {
                to.reverse();
            }
            coils.push(Coil { core: 0, turns: taps[0], leakage_ohm: Complex64::default(), ends: from });
            coils.push(Coil { core: 0, turns: ratio * taps[1], leakage_ohm: z * ohm(t.to_volts), ends: to });
        }
    }
    (coils, vec![(1.0, from)], 1)
}

/// One way of joining a bank.
#[derive(Clone, Copy)]
struct Way {
    /// Whether the delta joins k to k+1.
    delta_next: bool,
    /// Whether terminal k of the zigzag ends on unit k+1.
    zigzag_next: bool,
    /// To-terminals moved back so many places.
    moves: usize,
    reversed: bool,
}

impl Way {
    /// The way that gives a clock number.
    fn of(windings: [Winding; 2], clock: u8) -> Way {
        let both = [false, true];
        for delta_next in both {
            for zigzag_next in both {
                for reversed in both {
                    for moves in 0..3 {
                        let way = Way { delta_next, zigzag_next, moves, reversed };
                        let hours = way.lag(windings) * 6.0 / PI;
                        if (hours - f64::from(clock))
                            .rem_euclid(12.0)
                            .min((f64::from(clock) - hours).rem_euclid(12.0))
                            < 1e-9
                        {
                            return way;
                        }
                    }
                }
            }
        }
        panic!("no way to join {windings:?} for clock {clock}")
    }

    /// Angle by which the to terminals lag at no load, radians.
    fn lag(&self, windings: [Winding; 2]) -> f64 {
        let turn = |places: usize| Complex64::from_polar(1.0, -2.0 * PI / 3.0 * places as f64);
        let step = |next: bool| Complex64::from(1.0) - turn(if next { 1 } else { 2 });
        // Terminal voltage a over the voltage of unit a, on each side.
        let gain = windings.map(|winding| match winding {
            Winding::Delta => 1.0 / step(self.delta_next),
            w if w.is_zigzag() => step(self.zigzag_next),
            _ => Complex64::from(1.0),
        });
        let sign = if self.reversed { -1.0 } else { 1.0 };
        -(turn(self.moves) * gain[1] / gain[0] * sign).arg()
    }
}

fn bank(t: &Transformer, windings: [Winding; 2], clock: u8, sides: &Sides, system: &mut System) -> Parts {
    let way = Way::of(windings, clock);
    let rated = [t.from_volts, t.to_volts];
    let taps = [1.0 + t.from_tap_pu, 1.0 + t.tap_pu];
    let z = Complex64::new(t.r_pu, t.x_pu);
    let (mut coils, mut exciting) = (Vec::new(), Vec::new());
    let zigzag = windings.iter().any(|w| w.is_zigzag());
    for (side, winding) in windings.into_iter().enumerate() {
        let terminal = |k: usize| {
            let k = if side == 1 { k % 3 + 3 - way.moves } else { k };
            sides.0[side][k % 3]
        };
        let star = sides.0[side][3];
        let mut push = |core: usize, volts: f64, leakage_ohm: Complex64, mut ends: [Terminal; 2]| {
            if side == 1 && way.reversed {
                ends.reverse();
            }
            coils.push(Coil { core, turns: volts / t.from_volts * taps[side], leakage_ohm, ends });
            ends
        };
        let next = |k: usize, next: bool| (k + if next { 1 } else { 2 }) % 3;
        let mut ends = Vec::new();
        for k in 0..3 {
            match winding {
                w if w.is_zigzag() => {
                    let middle = Some(system.unknown());
                    let leakage = z * rated[side].powi(2) / t.rated_va / 2.0;
                    push(k, rated[side] / 3.0, leakage, [terminal(k), middle]);
                    push(next(k, way.zigzag_next), rated[side] / 3.0, leakage, [star, middle]);
                }
                _ => {
                    let delta = winding == Winding::Delta;
                    let volts = if delta { rated[side] } else { rated[side] / 3f64.sqrt() };
                    let end = if delta { terminal(next(k, way.delta_next)) } else { star };
                    let leaks = side == 1 && !zigzag;
                    let leakage =
                        if leaks { z * volts * volts * 3.0 / t.rated_va } else { Complex64::default() };
                    ends.push((volts / t.from_volts, push(k, volts, leakage, [terminal(k), end])));
                }
            }
        }
        if exciting.is_empty() {
            exciting = ends;
        }
    }
    (coils, exciting, 3)
}
