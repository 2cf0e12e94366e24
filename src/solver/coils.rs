//! A transformer checked from its coils: every coil's voltage is what its core induces in it and
//! what its leakage drops, the ampere-turns of every core add up to nothing, and no current is lost
//! at a star point. Nothing here is shared with the sweep's admittances.

use nalgebra::{DMatrix, DVector};

use crate::math::{Complex64, ONE, PhaseVector, ZERO};
use crate::network::{BOND_OHM, Conductor, NeutralPoint, Transformer, VectorGroup, Winding};
use crate::units::SQRT_3;

/// Where the end of a coil leads: a conductor of a side (0 from, 1 to), the star point of a side, a point inside.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Point {
    At(usize, Conductor),
    Star(usize),
    Inside(usize),
}

struct Coil {
    core: usize,
    /// Rated voltage with its tap, volts: turns in a unit of our own.
    turns: f64,
    leakage_ohm: Complex64,
    start: Point,
    end: Point,
}

/// Coils, and admittances between two points.
#[derive(Default)]
struct Windings {
    coils: Vec<Coil>,
    shunts: Vec<(Complex64, Point, Point)>,
    cores: usize,
}

/// Largest difference between the currents at the terminals and those that the coils take at these voltages, amperes.
pub(super) fn mismatch_amps(t: &Transformer, volts: [&PhaseVector; 2], amps: [&PhaseVector; 2]) -> f64 {
    let mut windings = Windings::default();
    t.units().for_each(|unit| windings.add(unit));
    let auto = matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto);
    let points = [t.from_neutral, t.to_neutral];
    if auto && points == [NeutralPoint::Conductor; 2] {
        windings.shunts.push((Complex64::from(BOND_OHM.recip()), Point::Star(0), Point::Star(1)));
    }
    let free = windings.undetermined(t.group.windings(), points);
    let Some(taken) = windings.currents(points, free, volts) else { return f64::INFINITY };
    let mut worst = 0.0f64;
    for side in 0..2 {
        // Currents are counted from the from to the to side: at the to side out of the coils.
        let sign = if side == 0 { 1.0 } else { -1.0 };
        for slot in 0..4 {
            if slot == 3 && points[side] != NeutralPoint::Conductor {
                continue;
            }
            let off = (amps[side][slot] - taken[side][slot] * sign).norm();
            worst = if off.is_nan() { f64::NAN } else { worst.max(off) };
        }
    }
    worst
}

impl Windings {
    fn core(&mut self) -> usize {
        self.cores += 1;
        self.cores - 1
    }

    fn coil(&mut self, core: usize, turns: f64, leakage_ohm: Complex64, start: Point, end: Point) {
        self.coils.push(Coil { core, turns, leakage_ohm, start, end });
    }

    fn add(&mut self, t: &Transformer) {
        let taps = [1.0 + t.from_tap_pu, 1.0 + t.tap_pu];
        let z = Complex64::new(t.r_pu, t.x_pu);
        match (t.group, t.terminals) {
            (VectorGroup::Three { from, to, clock }, _) => self.bank(t, from, to, clock, taps),
            (VectorGroup::Auto, _) => self.bank(t, Winding::StarNeutral, Winding::StarNeutral, 0, taps),
            (group, Some(terminals)) => {
                let ends = |side: usize| terminals[side].pairs().next().map(|pair| point_pair(side, pair));
                let (Some(from), Some(mut to)) = (ends(0), ends(1)) else { return };
                let reversed =
                    matches!(group, VectorGroup::Single { clock: 6 } | VectorGroup::CentreTap { clock: 6 });
                let core = self.core();
                let base = |volts: f64| volts * volts / t.rated_va;
                if let VectorGroup::CentreTap { .. } = group {
                    let own = Complex64::new(0.5 * z.re, 0.8 * z.im) * base(t.from_volts);
                    self.coil(core, t.from_volts * taps[0], own, from.0, from.1);
                    let half = t.to_volts / 2.0;
                    let leakage = Complex64::new(z.re, 0.4 * z.im) * base(half);
                    let middle = Point::Star(1);
                    let outer = |c| Point::At(1, c);
                    for (start, end) in [(outer(Conductor::S1), middle), (middle, outer(Conductor::S2))] {
                        let (start, end) = if reversed { (end, start) } else { (start, end) };
                        self.coil(core, half * taps[1], leakage, start, end);
                    }
                } else {
                    if reversed {
                        to = (to.1, to.0);
                    }
                    self.coil(core, t.from_volts * taps[0], ZERO, from.0, from.1);
                    self.coil(core, t.to_volts * taps[1], z * base(t.to_volts), to.0, to.1);
                }
                self.excite(t, 1.0, t.from_volts, from);
            }
            (_, None) => {}
        }
    }

    fn excite(&mut self, t: &Transformer, units: f64, volts: f64, (start, end): (Point, Point)) {
        let va = Complex64::new(t.no_load_watts, -t.magnetizing_pu * t.rated_va) / units;
        self.shunts.push((va / (volts * volts), start, end));
    }

    /// Three units. The to side is joined as for the base clock number, each of its letters then
    /// moved back once for every four hours.
    fn bank(&mut self, t: &Transformer, from: Winding, to: Winding, clock: u8, taps: [f64; 2]) {
        let base = match (from.is_star() == to.is_star(), clock % 4) {
            (true, 0) => 0,
            (true, _) => 6,
            (false, 1) => 1,
            (false, _) => 11,
        };
        let moves = (clock + 12 - base) % 12 / 4;
        let moved = |c: Conductor| (0..moves).fold(c, |c, _| c.next().next());
        let volts = [t.from_volts, t.to_volts];
        let zigzag_side = [from, to].iter().position(|w| w.is_zigzag());
        for (k, phase) in Conductor::PHASES.into_iter().enumerate() {
            let core = self.core();
            let mut excited = None;
            for (side, winding) in [from, to].into_iter().enumerate() {
                let at = |c: Conductor| Point::At(side, if side == 1 { moved(c) } else { c });
                let flip = |a: Point, b: Point| if side == 1 && base == 6 { (b, a) } else { (a, b) };
                if winding.is_zigzag() {
                    let leakage = Complex64::new(t.r_pu, t.x_pu) * volts[side].powi(2) / (2.0 * t.rated_va);
                    let turns = volts[side] / 3.0 * taps[side];
                    let (start, end) = flip(at(phase), Point::Inside(k));
                    self.coil(core, turns, leakage, start, end);
                    // The terminal of another unit ends on this one.
                    let other = if ends_after(base, side) { (k + 2) % 3 } else { (k + 1) % 3 };
                    let (start, end) = flip(Point::Star(side), Point::Inside(other));
                    self.coil(core, turns, leakage, start, end);
                    continue;
                }
                let rated = if winding == Winding::Delta { volts[side] } else { volts[side] / SQRT_3 };
                let end = match winding {
                    Winding::Delta if delta_leads(base, side, zigzag_side) => at(phase.next()),
                    Winding::Delta => at(phase.next().next()),
                    _ => Point::Star(side),
                };
                let (start, end) = flip(at(phase), end);
                let leaks = side == 1 && zigzag_side.is_none();
                let ohm = Complex64::new(t.r_pu, t.x_pu) * rated * rated * 3.0 / t.rated_va;
                self.coil(core, rated * taps[side], if leaks { ohm } else { ZERO }, start, end);
                excited = excited.or(Some((rated, (start, end))));
            }
            if let Some((rated, ends)) = excited {
                self.excite(t, 3.0, rated, ends);
            }
        }
    }

    /// A side whose floating star point may stand anywhere without a current changing, as the cores
    /// are not excited: against another floating star, of which only the difference counts, and
    /// against a zigzag, which no common flux enters.
    fn undetermined(&self, windings: Option<[Winding; 2]>, points: [NeutralPoint; 2]) -> Option<usize> {
        let windings = windings?;
        if self.shunts.iter().any(|(y, ..)| *y != ZERO) {
            return None;
        }
        let floats = |side: usize| windings[side].is_star() && points[side] == NeutralPoint::Floating;
        let beside = |side: usize| floats(1 - side) || windings[1 - side].is_zigzag();
        [1, 0].into_iter().find(|&side| floats(side) && beside(side))
    }

    /// Currents into the coils at the conductors of both sides; `None` where they are not determined.
    /// The star point of the side `free` is put to earth.
    fn currents(
        &self,
        points: [NeutralPoint; 2],
        free: Option<usize>,
        volts: [&PhaseVector; 2],
    ) -> Option<[PhaseVector; 2]> {
        let (coils, cores) = (self.coils.len(), self.cores);
        let star = coils + cores;
        let inside = star + 2;
        let size = inside + 3;
        // An end is an unknown, a known voltage, or both.
        let place = |point: Point| match point {
            Point::At(side, c) => Err((side, c.slot())),
            Point::Inside(k) => Ok(inside + k),
            Point::Star(side) => match points[side] {
                NeutralPoint::Conductor => Err((side, 3)),
                NeutralPoint::Shared if points[1 - side] == NeutralPoint::Conductor => Err((1 - side, 3)),
                NeutralPoint::Shared => Ok(star + 1 - side),
                _ => Ok(star + side),
            },
        };
        let mut a = DMatrix::<Complex64>::zeros(size, size);
        let mut b = DVector::<Complex64>::zeros(size);
        let mut touched = vec![false; size];
        for (j, coil) in self.coils.iter().enumerate() {
            for (end, sign) in [(coil.start, 1.0), (coil.end, -1.0)] {
                match place(end) {
                    Ok(k) => {
                        a[(j, k)] += sign;
                        a[(k, j)] += sign;
                        touched[k] = true;
                    }
                    Err((side, slot)) => b[j] -= volts[side][slot] * sign,
                }
            }
            a[(j, coils + coil.core)] -= coil.turns;
            a[(j, j)] -= coil.leakage_ohm;
            a[(coils + coil.core, j)] += coil.turns;
        }
        for &(y, start, end) in &self.shunts {
            for (row, other) in [(start, end), (end, start)] {
                let Ok(row) = place(row) else { continue };
                a[(row, row)] += y;
                match place(other) {
                    Ok(column) => a[(row, column)] -= y,
                    Err((side, slot)) => b[row] += volts[side][slot] * y,
                }
            }
        }
        for (side, point) in points.into_iter().enumerate() {
            let k = star + side;
            match point {
                NeutralPoint::Earthed(ohm) if ohm != ZERO => a[(k, k)] += ohm.inv(),
                NeutralPoint::Earthed(_) => touched[k] = false,
                _ if free == Some(side) => touched[k] = false,
                _ => {}
            }
        }
        for k in (star..size).filter(|&k| !touched[k]) {
            a.row_mut(k).fill(ZERO);
            a[(k, k)] = ONE;
            b[k] = ZERO;
        }
        let x = a.lu().solve(&b)?;
        let mut taken = [PhaseVector::zeros(); 2];
        let mut take = |point: Point, current: Complex64| {
            if let Err((side, slot)) = place(point) {
                taken[side][slot] += current;
            }
        };
        for (j, coil) in self.coils.iter().enumerate() {
            take(coil.start, x[j]);
            take(coil.end, -x[j]);
        }
        let at = |point: Point| place(point).map_or_else(|(side, slot)| volts[side][slot], |k| x[k]);
        for &(y, start, end) in &self.shunts {
            let current = (at(start) - at(end)) * y;
            take(start, current);
            take(end, -current);
        }
        Some(taken)
    }
}

fn point_pair(side: usize, (start, end): (Conductor, Conductor)) -> (Point, Point) {
    let at = |c| if c == Conductor::N { Point::Star(side) } else { Point::At(side, c) };
    (at(start), at(end))
}

/// Whether terminal k of a zigzag ends on unit k+1: Yz11, Zy1, Zd0; on unit k-1: Yz1, Dz0, Zy11.
fn ends_after(base: u8, zigzag_side: usize) -> bool {
    match (base, zigzag_side) {
        (1, 1) | (11, 0) => false,
        (1, _) | (11, _) => true,
        (_, side) => side == 0,
    }
}

/// Whether a delta is joined (k, k+1): Dd, Dy11, Yd1, Dz0; otherwise (k, k-1): Dy1, Yd11, Zd0.
fn delta_leads(base: u8, delta_side: usize, zigzag_side: Option<usize>) -> bool {
    match (base, delta_side) {
        (1, 0) | (11, 1) => false,
        (0 | 6, _) => zigzag_side != Some(0),
        _ => true,
    }
}
