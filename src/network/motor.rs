//! Induction motors on the network.

use super::draft::Name;
use super::model::NodeId;
use crate::machine::{FitItem, Motor as Machine, Starter};

/// Whether a motor runs in the state that is solved.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum MotorState {
    /// It runs with its load.
    #[default]
    Running,
    /// It stands still, without current.
    Off,
}

/// Equal three-phase induction motors at one node, each with its load.
///
/// Its three terminals are the phases of the node; the star point, or the delta, is joined to
/// nothing else. At slip `s` it is the phase admittance of its positive-sequence circuit at `s` and
/// its negative-sequence circuit at `2 - s` ([`crate::machine::Circuit::phase_matrix`]), times the
/// number of motors.
#[derive(Debug, Clone)]
pub struct Motor {
    /// Name.
    pub name: Name,
    /// Node.
    pub node: NodeId,
    /// Equal motors side by side.
    pub count: u32,
    /// The machine and its load.
    pub machine: Machine,
    /// How it is started.
    pub starter: Starter,
    /// Whether it runs.
    pub state: MotorState,
    /// Present slip; where it runs, that at which torque meets the load.
    pub slip: f64,
    /// Starts an hour that are planned.
    pub starts_per_hour: Option<f64>,
    /// Longest time at standstill under full voltage, hot, seconds.
    pub locked_rotor_limit_s: Option<f64>,
    /// What the plate did not tell and a table did: quantity, value, source.
    pub filled: Vec<(&'static str, f64, String)>,
    /// How well the circuit meets the ratings; empty where the circuit was given.
    pub fit: Vec<FitItem>,
}
