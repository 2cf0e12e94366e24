//! Loads and how they change with voltage; capacitors.

use super::conductor::{Conductors, Connection};
use super::draft::{Name, SwitchState};
use super::model::{BranchId, NodeId};

/// How the power of a load changes with the voltage across it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum LoadModel {
    /// Constant power above the floor voltage; below it see [`Load`].
    #[default]
    Power,
    /// Constant current magnitude and power factor.
    Current,
    /// Constant impedance.
    Impedance,
}

impl LoadModel {
    /// Word as in `loads.csv`.
    pub fn word(self) -> &'static str {
        match self {
            LoadModel::Power => "power",
            LoadModel::Current => "current",
            LoadModel::Impedance => "impedance",
        }
    }
}

/// Where a load draws its current.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LoadPlace {
    /// All of it at one node.
    Node(NodeId),
    /// Half at each end of a line.
    Line(BranchId),
}

/// A load: equal single-phase elements between pairs of conductors.
///
/// With `S` the power of one element at nominal voltage, `U0` the nominal voltage across it
/// (phase-to-neutral for a star, line-to-line for a delta) and `U` the voltage across it, the
/// current it draws is
///
/// - power: `I = conj(S / U)` for `|U| >= f U0`, where `f` is the floor
///   ([`super::Study::constant_power_floor_percent`]). Below the floor the load turns smoothly
///   into an impedance: `I = conj(S) U (2 - m) / (f U0)^2` with `m = |U|^2 / (f U0)^2`; current
///   and slope are continuous at the floor, and as `U` goes to zero it is a constant impedance;
/// - current: `I = conj(S) / U0 * U / |U|`;
/// - impedance: `I = conj(S) U / U0^2`.
#[derive(Debug, Clone)]
pub struct Load {
    /// Name.
    pub name: Name,
    /// Where it draws.
    pub place: LoadPlace,
    /// Between which conductors.
    pub connection: Connection,
    /// Total active power at nominal voltage, watts.
    pub watts: f64,
    /// Total reactive power at nominal voltage, vars, positive inductive.
    pub vars: f64,
    /// How it changes with voltage.
    pub model: LoadModel,
}

/// A shunt capacitor bank in service: equal units between pairs of conductors.
///
/// Each unit is the admittance `j Q / U^2` with `Q` its share of `vars` and `U` its rated voltage.
#[derive(Debug, Clone)]
pub struct Capacitor {
    /// Name.
    pub name: Name,
    /// Node.
    pub node: NodeId,
    /// Between which conductors.
    pub connection: Connection,
    /// Total reactive power at rated voltage, vars, positive.
    pub vars: f64,
    /// Rated voltage across each unit, volts.
    pub rated_volts: f64,
}

/// What switches a capacitor of the network.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum CapacitorSwitch {
    /// Nothing.
    Fixed,
    /// Voltage at its node, see [`super::CapacitorControl::Voltage`].
    Voltage {
        /// Switches on below this, volts at the relay.
        on_volts: f64,
        /// Switches off above this, volts at the relay.
        off_volts: f64,
        /// Ratio of the potential transformer.
        pt_ratio: f64,
        /// Between which conductors it measures: one pair.
        across: Connection,
    },
    /// Reactive power into a line at its source end.
    Kvar {
        /// Switches on above this, vars.
        on_vars: f64,
        /// Switches off below this, vars.
        off_vars: f64,
        /// Line.
        line: BranchId,
        /// Phases added up.
        phases: Conductors,
    },
    /// Current in a line at its source end.
    Current {
        /// Switches on above this, amperes.
        on_amps: f64,
        /// Switches off below this, amperes.
        off_amps: f64,
        /// Line.
        line: BranchId,
        /// Phases of which the greatest current counts.
        phases: Conductors,
    },
    /// A profile: its state is that of the time, and does not change in the flow.
    Profile,
}

/// A capacitor of the network, in service or not.
#[derive(Debug, Clone)]
pub struct CapacitorBank {
    /// What it is.
    pub capacitor: Capacitor,
    /// Closed: in service.
    pub state: SwitchState,
    /// What switches it.
    pub switch: CapacitorSwitch,
    /// Delay of its control, seconds.
    pub delay_s: f64,
}

impl CapacitorBank {
    /// The capacitors of the closed banks.
    pub(super) fn in_service(banks: &[CapacitorBank]) -> Vec<Capacitor> {
        banks.iter().filter(|b| b.state == SwitchState::Closed).map(|b| b.capacitor.clone()).collect()
    }
}
