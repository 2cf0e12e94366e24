//! Meters and the loads that share what they read.

use super::conductor::Conductor;
use super::draft::Name;
use super::model::{BranchId, End};
use crate::diagnostic::Origin;

/// Where a meter was written to be.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub enum MeterSite {
    /// At the supply: the head of the feeder.
    Head,
    /// Where a node is fed: all that the node and everything behind it takes.
    Node(Name),
    /// At the from end of a line.
    Line(Name),
}

/// What a meter shows of the active side.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Reading {
    /// Active power, watts, positive away from the source.
    Watts(f64),
    /// Current, amperes: of its phase, or the mean of the phases where the meter reads the total.
    Amps(f64),
}

/// What a meter shows of the reactive side.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum ReactiveReading {
    /// Nothing.
    #[default]
    None,
    /// Reactive power, vars, positive inductive.
    Vars(f64),
    /// `Q / P`, from a power factor.
    Ratio(f64),
}

/// One row of `meters.csv`.
#[derive(Debug, Clone)]
pub struct MeterRecord {
    /// Name; rows of one meter share it, one a phase.
    pub meter: Name,
    /// Where.
    pub site: MeterSite,
    /// Phase read; `None`: the total.
    pub phase: Option<Conductor>,
    /// Active power or current.
    pub reading: Reading,
    /// Reactive power.
    pub reactive: ReactiveReading,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// By what loads share a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum ShareBasis {
    /// Transformer rating.
    Kva,
    /// Energy billed.
    Kwh,
    /// Weights as given.
    Weight,
}

impl ShareBasis {
    /// Column of `loads.csv`.
    pub fn column(self) -> &'static str {
        match self {
            ShareBasis::Kva => "share_kva",
            ShareBasis::Kwh => "share_kwh",
            ShareBasis::Weight => "share_weight",
        }
    }
}

/// The share of one load of `loads.csv`; its power there is nothing until it is allocated.
#[derive(Debug, Clone)]
pub struct ShareRecord {
    /// Load.
    pub load: Name,
    /// By what it shares.
    pub basis: ShareBasis,
    /// How much of it: kVA, kWh or weight, zero or greater.
    pub amount: f64,
    /// `Q / P` of the load; `None`: what the meter's reactive reading leaves.
    pub ratio: Option<f64>,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// Where the current of a meter is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum MeterPlace {
    /// At the supply.
    Head,
    /// At an end of a branch; positive is away from the source.
    Branch {
        /// The branch.
        branch: BranchId,
        /// Which end of it.
        end: End,
        /// Which end is towards the source.
        upstream: End,
    },
}

/// A meter of a network, with the loads that share its readings.
#[derive(Debug, Clone)]
pub struct Meter {
    /// Name.
    pub name: Name,
    /// Where it reads.
    pub place: MeterPlace,
    /// Nearest meter between it and the source, an index of [`super::Network::meters`].
    pub outer: Option<usize>,
    /// Its readings: one for the total, or one a phase.
    pub channels: Vec<Channel>,
}

/// One reading of a meter.
#[derive(Debug, Clone)]
pub struct Channel {
    /// Phase read; `None`: the total.
    pub phase: Option<Conductor>,
    /// Active power or current.
    pub reading: Reading,
    /// Reactive power.
    pub reactive: ReactiveReading,
    /// Loads that share it, with the part each takes; the parts sum to 1.
    pub shares: Vec<Share>,
}

/// Part of a reading that one load takes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Share {
    /// Index of the load in [`super::Network::loads`].
    pub load: usize,
    /// Its part, 0 to 1.
    pub part: f64,
    /// `Q / P` of the load; `None`: its part of the reactive power left to be shared.
    pub ratio: Option<f64>,
}
