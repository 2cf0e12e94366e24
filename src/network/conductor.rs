//! Conductors of a four-wire feeder, sets of them, and how a load is joined between them.

use std::fmt;

/// One conductor. The order a, b, c, n is that of every vector and matrix.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Conductor {
    /// Phase a (L1).
    A,
    /// Phase b (L2), 120 degrees behind a.
    B,
    /// Phase c (L3), 120 degrees behind b.
    C,
    /// The neutral; at a centre-tapped winding its middle.
    N,
    /// First outer conductor of a centre-tapped winding.
    S1,
    /// Second outer conductor of a centre-tapped winding.
    S2,
}

impl Conductor {
    /// The four of a three-phase feeder in slot order.
    pub const ALL: [Conductor; 4] = [Conductor::A, Conductor::B, Conductor::C, Conductor::N];
    /// Those behind a centre tap, in the order of slots.
    pub const SPLIT: [Conductor; 3] = [Conductor::S1, Conductor::S2, Conductor::N];
    /// The three phases in slot order.
    pub const PHASES: [Conductor; 3] = [Conductor::A, Conductor::B, Conductor::C];

    /// Slot in vectors and matrices: a 0, b 1, c 2, n 3; s1 0, s2 1.
    pub fn slot(self) -> usize {
        match self {
            Conductor::A | Conductor::S1 => 0,
            Conductor::B | Conductor::S2 => 1,
            Conductor::C => 2,
            Conductor::N => 3,
        }
    }

    /// Letter as printed.
    pub fn letter(self) -> &'static str {
        ["a", "b", "c", "n", "s1", "s2"][self as usize]
    }

    /// The phase that follows in rotation (a, b, c, a); s1 and s2 follow each other, `n` stays `n`.
    pub fn next(self) -> Conductor {
        match self {
            Conductor::A => Conductor::B,
            Conductor::B => Conductor::C,
            Conductor::C => Conductor::A,
            Conductor::N => Conductor::N,
            Conductor::S1 => Conductor::S2,
            Conductor::S2 => Conductor::S1,
        }
    }
}

impl fmt::Display for Conductor {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.letter())
    }
}

/// A set of conductors, printed as `abcn` or `s1ns2`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default, PartialOrd, Ord)]
pub struct Conductors(u8);

impl Conductors {
    /// No conductor.
    pub const NONE: Conductors = Conductors(0);
    /// The three phases without a neutral.
    pub const ABC: Conductors = Conductors(0b0111);
    /// The three phases and the neutral.
    pub const ABCN: Conductors = Conductors(0b1111);
    /// The neutral alone.
    pub const N: Conductors = Conductors(0b1000);
    /// Both outer conductors of a centre-tapped winding.
    pub const S1S2: Conductors = Conductors(0b11_0000);

    /// True where the set holds `c`.
    pub fn has(self, c: Conductor) -> bool {
        self.0 & (1 << c as u8) != 0
    }

    /// True where some conductor of the set stands in that slot of vectors and matrices.
    pub fn has_slot(self, slot: usize) -> bool {
        self.iter().any(|c| c.slot() == slot)
    }

    /// The set written with a, b, c and n for the conductors in the same slots.
    #[must_use]
    pub fn in_slots(self) -> Conductors {
        self.iter().map(|c| Conductor::ALL[c.slot()]).collect()
    }

    /// True behind a centre tap.
    pub fn is_split(self) -> bool {
        !self.intersection(Conductors::S1S2).is_empty()
    }

    /// True where the neutral is carried.
    pub fn has_neutral(self) -> bool {
        self.has(Conductor::N)
    }

    /// The set with `c` added.
    #[must_use]
    pub fn with(self, c: Conductor) -> Conductors {
        Conductors(self.0 | (1 << c as u8))
    }

    /// The set with `c` removed.
    #[must_use]
    pub fn without(self, c: Conductor) -> Conductors {
        Conductors(self.0 & !(1 << c as u8))
    }

    /// Conductors in either set.
    #[must_use]
    pub fn union(self, other: Conductors) -> Conductors {
        Conductors(self.0 | other.0)
    }

    /// Conductors in both sets.
    #[must_use]
    pub fn intersection(self, other: Conductors) -> Conductors {
        Conductors(self.0 & other.0)
    }

    /// Conductors of this set that the other lacks.
    #[must_use]
    pub fn minus(self, other: Conductors) -> Conductors {
        Conductors(self.0 & !other.0)
    }

    /// True where every conductor of this set is in `other`.
    pub fn is_subset_of(self, other: Conductors) -> bool {
        self.minus(other).is_empty()
    }

    /// True for the empty set.
    pub fn is_empty(self) -> bool {
        self.0 == 0
    }

    /// Number of conductors.
    pub fn count(self) -> usize {
        self.0.count_ones() as usize
    }

    /// The phases of the set, without the neutral.
    #[must_use]
    pub fn phases(self) -> Conductors {
        self.without(Conductor::N)
    }

    /// The conductors in slot order.
    pub fn iter(self) -> impl Iterator<Item = Conductor> + Clone {
        use Conductor::{A, B, C, N, S1, S2};
        [A, S1, B, S2, C, N].into_iter().filter(move |&c| self.has(c))
    }
}

impl FromIterator<Conductor> for Conductors {
    fn from_iter<I: IntoIterator<Item = Conductor>>(iter: I) -> Self {
        iter.into_iter().fold(Conductors::NONE, Conductors::with)
    }
}

impl fmt::Display for Conductors {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if Conductors::S1S2.is_subset_of(*self) {
            // As the wires lie: the neutral between the outer ones.
            let ordered = [Conductor::S1, Conductor::N, Conductor::S2].into_iter();
            return ordered.filter(|&c| self.has(c)).try_for_each(|c| f.write_str(c.letter()));
        }
        self.iter().try_for_each(|c| f.write_str(c.letter()))
    }
}

/// Between which conductors a load or capacitor is joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Connection {
    /// Each phase of the set to the neutral (to earth where the node has none). The set holds phases only.
    Star(Conductors),
    /// Each phase of the set to the next in rotation: `A` stands for a-b, `B` for b-c, `C` for c-a,
    /// `S1` for s1-s2.
    Delta(Conductors),
}

impl Connection {
    /// Number of single-phase elements the total is shared over.
    pub fn elements(self) -> usize {
        match self {
            Connection::Star(p) | Connection::Delta(p) => p.phases().count(),
        }
    }

    /// Start and end conductor of each element; for a star the end is the neutral.
    pub fn pairs(self) -> impl Iterator<Item = (Conductor, Conductor)> {
        let (set, star) = match self {
            Connection::Star(p) => (p, true),
            Connection::Delta(p) => (p, false),
        };
        set.phases().iter().map(move |c| (c, if star { Conductor::N } else { c.next() }))
    }

    /// Every phase it touches, without the neutral.
    pub fn phases(self) -> Conductors {
        match self {
            Connection::Star(p) => p.phases(),
            Connection::Delta(p) => p.phases().iter().flat_map(|c| [c, c.next()]).collect(),
        }
    }
}

impl fmt::Display for Connection {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Connection::Star(p) => write!(f, "{}", p.with(Conductor::N)),
            Connection::Delta(p) if p.count() == 3 => f.write_str("abc"),
            Connection::Delta(p) => {
                p.iter().try_for_each(|c| write!(f, "{}{}", c.letter(), c.next().letter()))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sets_print_in_slot_order() {
        let set: Conductors = [Conductor::N, Conductor::C, Conductor::A].into_iter().collect();
        assert_eq!(set.to_string(), "acn");
        assert_eq!(set.count(), 3);
        assert!(set.phases().is_subset_of(Conductors::ABC));
    }

    #[test]
    fn connections_name_their_pairs() {
        let delta = Connection::Delta(Conductors::ABC);
        assert_eq!(delta.to_string(), "abc");
        assert_eq!(delta.pairs().last(), Some((Conductor::C, Conductor::A)));
        let ca = Connection::Delta(Conductors::NONE.with(Conductor::C));
        assert_eq!(ca.to_string(), "ca");
        assert_eq!(ca.phases().to_string(), "ac");
        assert_eq!(Connection::Star(Conductors::ABC).to_string(), "abcn");
        assert_eq!(Connection::Star(Conductors::S1S2).to_string(), "s1ns2");
        assert_eq!(Connection::Delta(Conductors::NONE.with(Conductor::S1)).to_string(), "s1s2");
    }
}
