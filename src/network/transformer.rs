//! Transformers: winding connection by IEC 60076-1 vector group, ratings and impedance.

use std::fmt;

use super::conductor::Connection;
use crate::math::Complex64;

/// How the three windings of one side are joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Winding {
    /// Star, neutral not brought out: it floats.
    Star,
    /// Star with the neutral on the node's `n`, or earthed where the node has none.
    StarNeutral,
    /// Delta.
    Delta,
    /// Zigzag, neutral not brought out: it floats.
    Zigzag,
    /// Zigzag with the neutral on the node's `n`, or earthed where the node has none.
    ZigzagNeutral,
}

impl Winding {
    /// True where the neutral is brought out.
    pub fn has_neutral(self) -> bool {
        matches!(self, Winding::StarNeutral | Winding::ZigzagNeutral)
    }

    /// True where there is a neutral point joined to nothing.
    pub fn floats(self) -> bool {
        matches!(self, Winding::Star | Winding::Zigzag)
    }

    /// True for a star.
    pub fn is_star(self) -> bool {
        matches!(self, Winding::Star | Winding::StarNeutral)
    }

    /// True for a zigzag.
    pub fn is_zigzag(self) -> bool {
        matches!(self, Winding::Zigzag | Winding::ZigzagNeutral)
    }

    /// Symbol of the standard, lower case.
    fn symbol(self) -> &'static str {
        ["y", "yn", "d", "z", "zn"][self as usize]
    }
}

/// Winding connection and phase displacement.
///
/// The to side lags the from side by `clock` times 30 degrees (IEC 60076-1, clause 7).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum VectorGroup {
    /// Three-phase bank.
    Three {
        /// From side.
        from: Winding,
        /// To side.
        to: Winding,
        /// Clock number 0 to 11; even or odd as the windings allow.
        clock: u8,
    },
    /// Single-phase unit; `clock` is 0 or 6 (polarity reversed).
    Single {
        /// 0 or 6.
        clock: u8,
    },
    /// Single-phase unit whose to winding has a middle tap: `Iin0`, or `Iin6` (polarity reversed).
    CentreTap {
        /// 0 or 6.
        clock: u8,
    },
    /// Three-phase autotransformer in star, `YNa0`: both sides share windings and neutral.
    Auto,
    /// Single-phase autotransformer, `Ia0`.
    SingleAuto,
}

impl VectorGroup {
    /// Reads a group such as `Dyn11`, `YNyn0`, `Dzn0`, `Ii0`, `Iin0`, `YNa0`; `None` where it is
    /// none, or the clock number cannot be had with that connection. Case tells the higher-voltage
    /// side in the standard; here the first symbol is the from side whatever its case.
    pub fn parse(text: &str) -> Option<VectorGroup> {
        let text = text.trim().to_ascii_lowercase();
        let split = text.find(|c: char| c.is_ascii_digit()).unwrap_or(text.len());
        let (letters, digits) = text.split_at(split);
        let clock: Option<u8> = digits.parse().ok();
        let one_phase = || match digits {
            "" | "0" => Some(0),
            "6" => Some(6),
            _ => None,
        };
        match letters {
            "ii" => return Some(VectorGroup::Single { clock: one_phase()? }),
            "iin" => return Some(VectorGroup::CentreTap { clock: one_phase()? }),
            "yna" => return (one_phase()? == 0).then_some(VectorGroup::Auto),
            "ia" => return (one_phase()? == 0).then_some(VectorGroup::SingleAuto),
            _ => {}
        }
        let (from, rest) = Self::winding(letters)?;
        let (to, rest) = Self::winding(rest)?;
        let clock = clock?;
        let fits = rest.is_empty() && clock < 12 && even_clock(from, to)? == clock.is_multiple_of(2);
        fits.then_some(VectorGroup::Three { from, to, clock })
    }

    fn winding(text: &str) -> Option<(Winding, &str)> {
        use Winding::{Delta, Star, StarNeutral, Zigzag, ZigzagNeutral};
        [StarNeutral, Star, Delta, ZigzagNeutral, Zigzag]
            .into_iter()
            .find_map(|winding| Some((winding, text.strip_prefix(winding.symbol())?)))
    }

    /// True for a single unit, whose terminals are given; false for a three-phase bank.
    pub fn is_single(self) -> bool {
        !matches!(self, VectorGroup::Three { .. } | VectorGroup::Auto)
    }

    /// Windings of the from and the to side of a three-phase bank; both stars with neutral for an autotransformer.
    pub fn windings(self) -> Option<[Winding; 2]> {
        match self {
            VectorGroup::Three { from, to, .. } => Some([from, to]),
            VectorGroup::Auto => Some([Winding::StarNeutral; 2]),
            _ => None,
        }
    }
}

/// Whether the clock numbers of a pair of windings are even; `None` where the pair cannot be had
/// (zigzag on both sides). A star against a delta or a zigzag turns by an odd number of hours, a
/// delta against a zigzag by an even one.
fn even_clock(from: Winding, to: Winding) -> Option<bool> {
    match (from.is_zigzag(), to.is_zigzag()) {
        (true, true) => None,
        _ => Some(from.is_star() == to.is_star()),
    }
}

impl fmt::Display for VectorGroup {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match *self {
            VectorGroup::Single { clock } => write!(f, "Ii{clock}"),
            VectorGroup::CentreTap { clock } => write!(f, "Iin{clock}"),
            VectorGroup::Auto => f.write_str("YNa0"),
            VectorGroup::SingleAuto => f.write_str("Ia0"),
            VectorGroup::Three { from, to, clock } => {
                write!(f, "{}{}{clock}", from.symbol().to_ascii_uppercase(), to.symbol())
            }
        }
    }
}

/// Where the neutral point of one side of a transformer goes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum NeutralPoint {
    /// There is none (delta, or a single-phase unit between two phases).
    None,
    /// A star or zigzag point joined to nothing.
    Floating,
    /// Joined to the node's `n`.
    Conductor,
    /// Earthed through this impedance, ohms; 0 is solid.
    Earthed(Complex64),
    /// An autotransformer's: the neutral point of the from side, which this side has no conductor for.
    Shared,
}

/// Resistance of the bond between the neutral conductors of an autotransformer's two sides, ohms,
/// where both carry one: a short copper bar (common practice, no source).
pub const BOND_OHM: f64 = 1e-3;

/// A transformer, or a bank of single-phase units.
///
/// Each unit of a star or delta bank has one winding a side. With `Uf`, `Ut` the rated voltages of
/// the two windings (line-to-line over sqrt 3 in a star, line-to-line in a delta, the winding's own
/// in a single-phase unit), `S` the unit's rating (a third of the bank's, all of a single-phase
/// unit's), `t = Uf (1 + from_tap) / (Ut (1 + tap))` and winding voltages `vf`, `vt` (start minus
/// end terminal):
///
/// - leakage, on the to side: `it = (vf / t - vt) / z`, `z = (r + j x) Ut^2 / S`, `it` flowing out of the to winding's start;
/// - no-load shunt across the from winding: `y0 = (P0 / 3 - j m S) / Uf^2` (for a single-phase unit `P0` whole);
/// - current into the from winding's start: `if = it / t + y0 vf`.
///
/// Windings are joined so, `k` for phases a, b, c and `k+1`, `k-1` the next and the one before in
/// rotation; the to-side phase of each unit is then shifted for the clock number:
/// star-star and delta-delta at clock 0: unit k is (k, neutral) and (k, neutral), or (k, k+1) and (k, k+1);
/// Dy at 1: (k, k-1) and (k, neutral), at 11: (k, k+1) and (k, neutral);
/// Yd at 1: (k, neutral) and (k, k+1), at 11: (k, neutral) and (k, k-1).
/// Adding 4 to the clock moves every to-terminal k to k-1; adding 6 reverses the to winding.
///
/// **Zigzag** (on one side only; `U` its rated line-to-line voltage, `S3` the bank's rating): unit k
/// has two half windings of rated voltage `Uh = U / 3` beside its other winding, star or delta. Each
/// half winding has the leakage `(r + j x) U^2 / (2 S3)`, `i = (v / t - vh) / z` with `v` the voltage
/// of the other winding and `t` the ratio of its rated voltage to `Uh` (taps as above), so that two in series
/// have the rated impedance in positive, negative and zero sequence. Terminal k leads to the first half of unit k;
/// its end to the end of the second half of another unit, whose start is the neutral point. That
/// unit is: Yz at 1: k-1, at 11: k+1; Dz at 0: k-1 (delta as (k, k+1)); Zy at 1: k+1, at 11: k-1;
/// Zd at 0: k+1 (delta as (k, k-1)). Other clock numbers as above. The no-load shunt stands across
/// the from winding, or across the to winding where the from side is the zigzag.
///
/// **Single-phase units** have terminals of their own on each side; several between the same two
/// nodes form one bank (open star, open delta, or three unequal units), the first with the others
/// in `mates`.
///
/// **Centre tap** (`Iin0`): the to side is two halves, s1 to n and n to s2, each of rated voltage `Ut / 2`. With
/// `r + j x` that of the whole unit, the from winding has `0.5 r + j 0.8 x` and each half
/// `r + j 0.4 x` on its own rated voltage (interlaced halves; from memory, common practice): with `e` the voltage behind
/// the from leakage, `if = (vf - e) / zf + y0 vf`, each half `i = (e / th - vh) / zh`, and
/// `(vf - e) / zf` is the sum of `i / th`.
///
/// **Autotransformer** (`YNa0`, `Ia0`): as star-star at clock 0 with `r + j x` on the throughput,
/// and one neutral point for both sides; where both nodes carry `n`, a bond of [`BOND_OHM`] joins them.
#[derive(Debug, Clone)]
pub struct Transformer {
    /// Winding connection.
    pub group: VectorGroup,
    /// From and to terminals of a single-phase unit (one element; both halves of a centre tap); `None` for a bank.
    pub terminals: Option<[Connection; 2]>,
    /// Rating of the bank, volt-amperes.
    pub rated_va: f64,
    /// Rated voltage of the from side, volts (line-to-line; single-phase: the winding's own).
    pub from_volts: f64,
    /// Rated voltage of the to side, volts, likewise (centre tap: across both halves).
    pub to_volts: f64,
    /// Short-circuit resistance, per unit.
    pub r_pu: f64,
    /// Short-circuit reactance, per unit.
    pub x_pu: f64,
    /// No-load losses of the bank, watts.
    pub no_load_watts: f64,
    /// Reactive part of the no-load current, per unit of rated.
    pub magnetizing_pu: f64,
    /// Raise of the to voltage by a tap on the to winding, per unit.
    pub tap_pu: f64,
    /// Turns added by a tap on the from winding, per unit; they lower the to voltage.
    pub from_tap_pu: f64,
    /// Neutral point of the from side.
    pub from_neutral: NeutralPoint,
    /// Neutral point of the to side.
    pub to_neutral: NeutralPoint,
    /// The other single-phase units of the bank; empty for all else.
    pub mates: Vec<Transformer>,
}

impl Transformer {
    /// All units of the bank that are described apart: this one, then its mates.
    pub fn units(&self) -> impl Iterator<Item = &Transformer> {
        std::iter::once(self).chain(&self.mates)
    }

    /// Rating of the whole bank, volt-amperes.
    pub fn bank_va(&self) -> f64 {
        self.units().map(|unit| unit.rated_va).sum()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_read_and_print() {
        for text in [
            "YNyn0", "Dyn1", "Dyn11", "Yd1", "YNd1", "Dd0", "Ii0", "Ii6", "Yy6", "Dyn5", "Dd10", "Dzn0",
            "Yzn5", "ZNd6", "Zy11", "Iin0", "YNa0", "Ia0",
        ] {
            assert_eq!(VectorGroup::parse(text).unwrap().to_string(), text);
        }
        for text in ["Dyn0", "YNyn1", "Dyn12", "Dzn1", "Yzn0", "Zz0", "YNa6", "", "yn", "Ii3", "Dyn", "D11"] {
            assert_eq!(VectorGroup::parse(text), None, "{text}");
        }
    }
}
