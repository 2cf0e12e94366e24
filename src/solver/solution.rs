//! What a solve gives: phasors of every conductor, and how far they can be trusted.

use crate::math::PhaseVector;
use crate::network::{Network, NodeId};

/// How a solve ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Status {
    /// Both stop tests are met; the numbers are good.
    Converged,
    /// The iteration limit was reached; the numbers are those of the last iterate.
    IterationLimit,
    /// Numbers grew beyond all bounds.
    Diverged,
    /// Loads raised from nothing have no solution beyond the share told by [`Path::Folds`].
    BeyondLoadability,
    /// Generators that follow the voltage do not come to rest.
    CurvesMove,
    /// The motor of this index cannot carry its load at the voltage it gets.
    Stalls(usize),
    /// The linear part has no solution at this node: a side without reference, or opposite impedances.
    Singular(NodeId),
}

/// How the solution was reached.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Path {
    /// By sweeping from a flat start, at voltages near enough to no load that there is no doubt
    /// which solution it is; or also when followed, with the same result.
    Swept,
    /// By raising the loads step by step from nothing: the sweep alone did not get there.
    Followed,
    /// Loads raised from nothing have no near solution beyond this share of them. A converged
    /// solution is then one of collapsed voltages, with loads that draw less than they should.
    Folds {
        /// Share of all loads, 0 to 1.
        share: f64,
    },
}

/// Voltages and currents of a network, conductor order a, b, c, n; slots not carried are zero.
#[derive(Debug, Clone)]
pub struct Solution {
    /// How the solve ended. Only with [`Status::Converged`] are the other fields results.
    pub status: Status,
    /// How it was reached.
    pub path: Path,
    /// Iterations made: passes up and down.
    pub iterations: usize,
    /// Largest change of a node voltage in the last iteration, per unit of nominal.
    pub change_pu: f64,
    /// Node where that change was.
    pub worst_node: NodeId,
    /// Largest current mismatch at any node, amperes, from an independent check of the branch and load equations.
    pub mismatch_amps: f64,
    /// Largest voltage mismatch of any branch equation, volts, from the same check.
    pub mismatch_volts: f64,
    /// Voltage of each node's conductors to remote earth, volts; one entry a node.
    pub volts: Vec<PhaseVector>,
    /// Current at the from end of each branch, amperes, positive from `from` to `to`; one entry a branch.
    pub from_amps: Vec<PhaseVector>,
    /// Current at the to end of each branch, amperes, positive from `from` to `to`.
    pub to_amps: Vec<PhaseVector>,
    /// Current drawn from the supply in each conductor, amperes, positive into the network.
    pub source_amps: PhaseVector,
}

impl Solution {
    /// A solution record of the right size without results.
    pub(super) fn unsolved(network: &Network) -> Solution {
        Solution {
            status: Status::IterationLimit,
            path: Path::Swept,
            iterations: 0,
            change_pu: f64::INFINITY,
            worst_node: network.supply.node,
            mismatch_amps: f64::INFINITY,
            mismatch_volts: f64::INFINITY,
            volts: vec![PhaseVector::zeros(); network.nodes.len()],
            from_amps: vec![PhaseVector::zeros(); network.branches.len()],
            to_amps: vec![PhaseVector::zeros(); network.branches.len()],
            source_amps: PhaseVector::zeros(),
        }
    }
}
