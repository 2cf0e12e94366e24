//! The windings of a transformer as single admittances between terminals.

use crate::math::Complex64;
use crate::network::{BOND_OHM, NeutralPoint, Transformer, VectorGroup, Winding};
use crate::units::SQRT_3;

const N: usize = 3;
/// First of the four terminals of the to side.
pub(super) const TO: usize = 4;
/// First of the points inside.
pub(super) const INNER: usize = 8;

/// An admittance that takes the current `siemens * u` with `u = sum of weight * voltage` and gives
/// `weight` times it back at each terminal.
pub(super) struct Element {
    pub siemens: Complex64,
    /// Terminal (from side 0 to 3, to side 4 to 7, inside from 8) and weight.
    pub weights: Vec<(usize, f64)>,
}

/// A winding from a start to an end terminal.
type Ends = (usize, usize);

impl Element {
    /// The leakage of two coupled windings: `other / ratio - own` across it.
    fn leakage(ohm: Complex64, other: Ends, ratio: f64, own: Ends) -> Element {
        let turn = ratio.recip();
        Element {
            siemens: ohm.inv(),
            weights: vec![(other.0, turn), (other.1, -turn), (own.0, -1.0), (own.1, 1.0)],
        }
    }

    fn shunt(siemens: Complex64, across: Ends) -> Element {
        Element { siemens, weights: vec![(across.0, 1.0), (across.1, -1.0)] }
    }
}

/// The elements of one unit or bank, without its mates (see [`Transformer`]).
pub(super) fn elements(t: &Transformer) -> Vec<Element> {
    let mut elements = match (t.group, t.terminals) {
        (VectorGroup::Three { from, to, clock }, _) => {
            let joint = Joint::of(from, to, clock);
            if from.is_zigzag() || to.is_zigzag() { zigzag(t, &joint) } else { bank(t, &joint) }
        }
        (VectorGroup::Auto, _) => bank(t, &Joint::of(Winding::StarNeutral, Winding::StarNeutral, 0)),
        (VectorGroup::Single { clock }, Some(terminals)) => {
            let [from, to] = terminals.map(|c| c.pairs().next().map(|(p, q)| (p.slot(), q.slot())));
            from.zip(to).map_or_else(Vec::new, |(from, to)| unit(t, from, turned(shift(to), clock)))
        }
        (VectorGroup::SingleAuto, Some(terminals)) => {
            let [from, to] = terminals.map(|c| c.pairs().next().map(|(p, q)| (p.slot(), q.slot())));
            from.zip(to).map_or_else(Vec::new, |(from, to)| unit(t, from, shift(to)))
        }
        (VectorGroup::CentreTap { clock }, Some([from, _])) => {
            let from = from.pairs().next().map(|(p, q)| (p.slot(), q.slot()));
            from.map_or_else(Vec::new, |from| centre_tap(t, from, clock))
        }
        (_, None) => Vec::new(),
    };
    if matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto) {
        share_neutral(t, &mut elements);
    }
    elements
}

/// The bond between the neutral conductors of an autotransformer's sides, where both carry one.
pub(super) fn bond(t: &Transformer) -> Option<Element> {
    let auto = matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto);
    let both = [t.from_neutral, t.to_neutral] == [NeutralPoint::Conductor; 2];
    (auto && both).then(|| Element::shunt(Complex64::from(BOND_OHM.recip()), (N, N + TO)))
}

/// One neutral point for both sides of an autotransformer.
fn share_neutral(t: &Transformer, elements: &mut [Element]) {
    let (lost, kept) = match (t.from_neutral, t.to_neutral) {
        (NeutralPoint::Shared, _) => (N, N + TO),
        (_, NeutralPoint::Shared) => (N + TO, N),
        // Two conductors with a bond between.
        _ => return,
    };
    let terminals = elements.iter_mut().flat_map(|element| &mut element.weights);
    terminals.filter(|(terminal, _)| *terminal == lost).for_each(|(terminal, _)| *terminal = kept);
}

/// Terminals of the to side.
fn shift(ends: Ends) -> Ends {
    (ends.0 + TO, ends.1 + TO)
}

fn turned(ends: Ends, clock: u8) -> Ends {
    if clock == 6 { (ends.1, ends.0) } else { ends }
}

/// A single-phase unit of two windings.
fn unit(t: &Transformer, from: Ends, to: Ends) -> Vec<Element> {
    two_windings(t, 1.0, [t.from_volts, t.to_volts], from, to)
}

fn two_windings(t: &Transformer, units: f64, volts: [f64; 2], from: Ends, to: Ends) -> Vec<Element> {
    let unit_va = t.rated_va / units;
    let leakage = Complex64::new(t.r_pu, t.x_pu) * (volts[1] * volts[1] / unit_va);
    let mut elements = vec![Element::leakage(leakage, from, ratio(t, volts), to)];
    elements.extend(no_load(t, units, volts[0], from));
    elements
}

/// Turns ratio of windings of those rated voltages, with both taps.
fn ratio(t: &Transformer, volts: [f64; 2]) -> f64 {
    volts[0] * (1.0 + t.from_tap_pu) / (volts[1] * (1.0 + t.tap_pu))
}

/// The no-load shunt of one of so many units, across a winding of that rated voltage.
fn no_load(t: &Transformer, units: f64, volts: f64, across: Ends) -> Option<Element> {
    let va = Complex64::new(t.no_load_watts, -t.magnetizing_pu * t.rated_va) / units;
    (va != Complex64::default()).then(|| Element::shunt(va / (volts * volts), across))
}

fn winding_volts(winding: Winding, line_to_line: f64) -> f64 {
    if winding == Winding::Delta { line_to_line } else { line_to_line / SQRT_3 }
}

/// Three units of star or delta windings.
fn bank(t: &Transformer, joint: &Joint) -> Vec<Element> {
    let volts = [winding_volts(joint.from, t.from_volts), winding_volts(joint.to, t.to_volts)];
    (0..3).flat_map(|k| two_windings(t, 3.0, volts, joint.near_ends(k), joint.far_ends(k))).collect()
}

/// Three units, two half windings each on one side.
fn zigzag(t: &Transformer, joint: &Joint) -> Vec<Element> {
    let from_side = joint.from.is_zigzag();
    let (plain, other_volts, zigzag_volts) = match from_side {
        true => (joint.to, t.to_volts, t.from_volts),
        false => (joint.from, t.from_volts, t.to_volts),
    };
    let (own_volts, half_volts) = (winding_volts(plain, other_volts), zigzag_volts / 3.0);
    let ratio = match from_side {
        true => ratio(t, [half_volts, own_volts]).recip(),
        false => ratio(t, [own_volts, half_volts]),
    };
    let ohm = Complex64::new(t.r_pu, t.x_pu) * (zigzag_volts * zigzag_volts / t.rated_va / 2.0);
    let neutral = if from_side { N } else { N + TO };
    let mut elements = Vec::new();
    for k in 0..3 {
        // Unit k has the first half of terminal k and the second half of the terminal that ends on it.
        let own = if from_side { joint.far_ends(k) } else { joint.near_ends(k) };
        let first = joint.zigzag_ends((joint.zigzag_terminal(k), INNER + k));
        let second = joint.zigzag_ends((neutral, INNER + joint.ends_on(k)));
        elements.push(Element::leakage(ohm, own, ratio, first));
        elements.push(Element::leakage(ohm, own, ratio, second));
        elements.extend(no_load(t, 3.0, own_volts, own));
    }
    elements
}

/// One winding against two halves with a point between them; the voltage behind the from leakage is a point inside.
fn centre_tap(t: &Transformer, from: Ends, clock: u8) -> Vec<Element> {
    let half_volts = t.to_volts / 2.0;
    let base = |volts: f64| volts * volts / t.rated_va;
    let from_leakage = Complex64::new(0.5 * t.r_pu, 0.8 * t.x_pu) * base(t.from_volts);
    let half_leakage = Complex64::new(t.r_pu, 0.4 * t.x_pu) * base(half_volts);
    let turn = ratio(t, [t.from_volts, half_volts]).recip();
    let behind = INNER;
    let mut elements = vec![Element {
        siemens: from_leakage.inv(),
        weights: vec![(from.0, 1.0), (from.1, -1.0), (behind, -1.0)],
    }];
    for half in [(TO, N + TO), (N + TO, TO + 1)] {
        let (start, end) = turned(half, clock);
        elements.push(Element {
            siemens: half_leakage.inv(),
            weights: vec![(behind, turn), (start, -1.0), (end, 1.0)],
        });
    }
    elements.extend(no_load(t, 1.0, t.from_volts, from));
    elements
}

/// How the units of a bank are joined for a clock number (the rules stand at [`Transformer`]).
struct Joint {
    from: Winding,
    to: Winding,
    /// Whether a delta joins k to k-1 instead of k+1.
    backward: bool,
    /// Whether terminal k of a zigzag ends on unit k-1 instead of k+1.
    ends_before: bool,
    /// Places each to-terminal moves back.
    shift: usize,
    reversed: bool,
}

impl Joint {
    fn of(from: Winding, to: Winding, clock: u8) -> Joint {
        let clock = usize::from(clock);
        let alike = from.is_star() == to.is_star();
        let (base, reversed) = match (alike, clock % 4) {
            (true, 0) => (0, false),
            (true, _) => (6, true),
            (false, 1) => (1, false),
            (false, _) => (11, false),
        };
        let delta = |w: Winding| w == Winding::Delta;
        let backward = match (delta(from), delta(to)) {
            (true, false) => !alike && base == 1,
            (false, true) => {
                if alike {
                    from.is_zigzag()
                } else {
                    base != 1
                }
            }
            _ => false,
        };
        let ends_before = if alike { to.is_zigzag() } else { (base == 1) == to.is_zigzag() };
        Joint { from, to, backward, ends_before, shift: (clock + 12 - base) % 12 / 4, reversed }
    }

    fn ends(&self, winding: Winding, k: usize) -> Ends {
        match winding {
            Winding::Delta => (k, (k + if self.backward { 2 } else { 1 }) % 3),
            _ => (k, N),
        }
    }

    fn near_ends(&self, k: usize) -> Ends {
        self.ends(self.from, k)
    }

    fn far_ends(&self, k: usize) -> Ends {
        let (start, end) = self.ends(self.to, k);
        let ends = (self.moved(start) + TO, self.moved(end) + TO);
        if self.reversed { (ends.1, ends.0) } else { ends }
    }

    fn moved(&self, slot: usize) -> usize {
        if slot == N { N } else { (slot + 3 - self.shift) % 3 }
    }

    fn zigzag_terminal(&self, k: usize) -> usize {
        if self.from.is_zigzag() { k } else { self.moved(k) + TO }
    }

    /// A half winding on the to side turns with the clock number; one on the from side does not, the other winding does.
    fn zigzag_ends(&self, ends: Ends) -> Ends {
        if self.reversed && self.to.is_zigzag() { (ends.1, ends.0) } else { ends }
    }

    /// The terminal whose second half is on unit k.
    fn ends_on(&self, k: usize) -> usize {
        (k + if self.ends_before { 1 } else { 2 }) % 3
    }
}
