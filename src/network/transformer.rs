//! Transformers: winding connection by IEC 60076-1 vector group, ratings and impedance.

use std::fmt;

use super::conductor::Connection;

/// How the three windings of one side are joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Winding {
    /// Star, neutral not brought out: it floats.
    Star,
    /// Star with the neutral on the node's `n`, or earthed where the node has none.
    StarNeutral,
    /// Delta.
    Delta,
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
        /// Clock number 0 to 11; even where both sides are alike, odd otherwise.
        clock: u8,
    },
    /// Single-phase unit; `clock` is 0 or 6 (polarity reversed).
    Single {
        /// 0 or 6.
        clock: u8,
    },
}

impl VectorGroup {
    /// Reads a group such as `Dyn11`, `YNyn0`, `Ii0`; `None` where it is none, or the clock
    /// number cannot be had with that connection. Case tells the higher-voltage side in the
    /// standard; here the first symbol is the from side whatever its case.
    pub fn parse(text: &str) -> Option<VectorGroup> {
        let text = text.trim().to_ascii_lowercase();
        let split = text.find(|c: char| c.is_ascii_digit()).unwrap_or(text.len());
        let (letters, digits) = text.split_at(split);
        if let Some(rest) = letters.strip_prefix("ii") {
            let clock = if digits.is_empty() { 0 } else { digits.parse().ok()? };
            return (rest.is_empty() && (clock == 0 || clock == 6)).then_some(VectorGroup::Single { clock });
        }
        let (from, rest) = Self::winding(letters)?;
        let (to, rest) = Self::winding(rest)?;
        let clock: u8 = digits.parse().ok()?;
        let alike = (from == Winding::Delta) == (to == Winding::Delta);
        let fits = rest.is_empty() && clock < 12 && alike == clock.is_multiple_of(2);
        fits.then_some(VectorGroup::Three { from, to, clock })
    }

    fn winding(text: &str) -> Option<(Winding, &str)> {
        [("yn", Winding::StarNeutral), ("y", Winding::Star), ("d", Winding::Delta)]
            .into_iter()
            .find_map(|(symbol, winding)| Some((winding, text.strip_prefix(symbol)?)))
    }
}

impl fmt::Display for VectorGroup {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match *self {
            VectorGroup::Single { clock } => write!(f, "Ii{clock}"),
            VectorGroup::Three { from, to, clock } => {
                let from = ["Y", "YN", "D"][from as usize];
                let to = ["y", "yn", "d"][to as usize];
                write!(f, "{from}{to}{clock}")
            }
        }
    }
}

/// Where the neutral point of one side of a transformer goes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum NeutralPoint {
    /// There is none (delta, or a single-phase unit between two phases).
    None,
    /// A star point joined to nothing.
    Floating,
    /// Joined to the node's `n`.
    Conductor,
    /// Earthed through this many ohms; 0 is solid.
    Earthed(f64),
}

/// A transformer or a bank of three equal single-phase units.
///
/// Each unit has one winding a side. With `Uf`, `Ut` the rated voltages of the two windings
/// (line-to-line over sqrt 3 in a star, line-to-line in a delta, the winding's own in a
/// single-phase unit), `S` the unit's rating (a third of the bank's, all of a single-phase
/// unit's), `t = Uf / (Ut (1 + tap))` and winding voltages `vf`, `vt` (start minus end terminal):
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
#[derive(Debug, Clone)]
pub struct Transformer {
    /// Winding connection.
    pub group: VectorGroup,
    /// The two terminals of a single-phase unit (one element), the same on both sides; `None` for a bank.
    pub terminals: Option<Connection>,
    /// Rating of the bank, volt-amperes.
    pub rated_va: f64,
    /// Rated voltage of the from side, volts (line-to-line; single-phase: the winding's own).
    pub from_volts: f64,
    /// Rated voltage of the to side, volts, likewise.
    pub to_volts: f64,
    /// Short-circuit resistance, per unit.
    pub r_pu: f64,
    /// Short-circuit reactance, per unit.
    pub x_pu: f64,
    /// No-load losses of the bank, watts.
    pub no_load_watts: f64,
    /// Reactive part of the no-load current, per unit of rated.
    pub magnetizing_pu: f64,
    /// Raise of the to voltage by the tap, per unit.
    pub tap_pu: f64,
    /// Neutral point of the from side.
    pub from_neutral: NeutralPoint,
    /// Neutral point of the to side.
    pub to_neutral: NeutralPoint,
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_read_and_print() {
        for text in ["YNyn0", "Dyn1", "Dyn11", "Yd1", "YNd1", "Dd0", "Ii0", "Ii6", "Yy6", "Dyn5", "Dd10"] {
            assert_eq!(VectorGroup::parse(text).unwrap().to_string(), text);
        }
        for text in ["Dyn0", "YNyn1", "Dyn12", "Dzn0", "", "yn", "Ii3", "Dyn", "D11"] {
            assert_eq!(VectorGroup::parse(text), None, "{text}");
        }
    }
}
