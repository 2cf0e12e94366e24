//! A construction as a user describes it, and what it comes to for the conductors a line carries.

use std::fmt;

use super::LineConstants;
use super::given::Sequence;
use super::layout::GeometryFault;
use crate::catalog::{ConduitKind, LookupFault};
use crate::math::PhaseMatrix;

/// How the wires of a construction lie.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Bare wires in the air.
    Overhead,
    /// Concentric-neutral cables.
    Concentric,
    /// Tape-shielded cables.
    Tape,
    /// Building wire in conduit.
    Conduit,
    /// Sequence impedances given.
    Sequence,
    /// Insulated cores in one cable, from their spacing.
    Bundle,
}

/// Places of the conductors, metres; slot 0 to 3 for a, b, c, n.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Spacing {
    /// Name.
    pub name: String,
    /// Slot and place (across, height above earth).
    pub places: Vec<(usize, [f64; 2])>,
}

/// A construction as described.
#[derive(Debug, Clone, PartialEq)]
pub struct Recipe {
    /// Kind.
    pub kind: Kind,
    /// Wire or cable of the phases, as written.
    pub phase: String,
    /// Wire of the neutral, as written.
    pub neutral: Option<String>,
    /// Where the wires lie.
    pub spacing: Option<Spacing>,
    /// Conduit around building wire.
    pub conduit: ConduitKind,
    /// Sequence values.
    pub sequence: Option<Sequence>,
    /// Conductor temperature, degrees Celsius.
    pub temperature_c: f64,
}

/// What cannot be about a recipe.
#[derive(Debug, Clone, PartialEq)]
pub enum RecipeFault {
    /// A wire that is not found.
    Wire(LookupFault),
    /// A geometry that cannot be.
    Geometry(GeometryFault),
    /// A datum the computation needs and no table gives.
    MissingDatum {
        /// The wire.
        wire: String,
        /// The datum.
        datum: &'static str,
    },
    /// No spacing, or none for some conductor.
    NoPlace {
        /// Conductors without a place.
        conductors: String,
    },
    /// The line carries n, but the construction has no neutral wire.
    NoNeutral,
    /// Sequence values are missing.
    NoSequence,
    /// A wire that the table of wires in conduit does not have.
    NotInConduit {
        /// The wire.
        wire: String,
    },
    /// The line carries n, but the sequence values leave its neutral less than no resistance.
    NegativeReturn,
}

impl RecipeFault {
    /// How to mend it.
    pub fn cure(&self) -> String {
        match self {
            RecipeFault::Wire(fault) => fault.cure(),
            RecipeFault::Geometry(fault) => fault.cure().to_string(),
            RecipeFault::MissingDatum { .. } => {
                "give it in conductors.csv, or choose a wire that has it".to_string()
            }
            RecipeFault::NoPlace { conductors } => {
                format!("add rows for {conductors} to the spacing, or name another spacing")
            }
            RecipeFault::NoNeutral => {
                "give neutral_conductor and a position n, or leave n out of the line".to_string()
            }
            RecipeFault::NoSequence => {
                "fill in r1, x1, r0 and x0, each with its unit in the column name".to_string()
            }
            RecipeFault::NotInConduit { .. } => {
                "name building wire such as \"4/0 copper\" or \"250 kcmil aluminium\"; for other cores use kind bundle with a spacing"
                    .to_string()
            }
            RecipeFault::NegativeReturn => {
                "check r0, which holds the phase once and the neutral three times; or leave n out of the line"
                    .to_string()
            }
        }
    }
}

impl fmt::Display for RecipeFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            RecipeFault::Wire(fault) => fault.fmt(f),
            RecipeFault::Geometry(fault) => fault.fmt(f),
            RecipeFault::MissingDatum { wire, datum } => write!(f, "{datum} of {wire} is not known"),
            RecipeFault::NoPlace { conductors } => write!(f, "no spacing gives a place for {conductors}"),
            RecipeFault::NoNeutral => {
                f.write_str("the line carries n, but the construction has no neutral wire")
            }
            RecipeFault::NoSequence => f.write_str("the sequence impedances are not all given"),
            RecipeFault::NotInConduit { wire } => {
                write!(f, "{wire} is not in the table of building wire in conduit")
            }
            RecipeFault::NegativeReturn => f.write_str(
                "r0 is below r1: the neutral that returns the zero-sequence current would have less than no resistance",
            ),
        }
    }
}

/// What a recipe comes to.
#[derive(Debug, Clone, PartialEq)]
pub struct Computed {
    /// Series impedance over slots, ohms per metre.
    pub z_per_m: PhaseMatrix,
    /// Shunt admittance over slots, siemens per metre.
    pub y_per_m: PhaseMatrix,
    /// Primitive matrices, for computed kinds.
    pub constants: Option<LineConstants>,
    /// Rating of the phase conductors, amperes.
    pub rating_amps: Option<f64>,
    /// What was assumed.
    pub assumptions: Vec<String>,
    /// Where the data came from.
    pub sources: Vec<String>,
}
