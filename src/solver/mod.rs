//! Solves a [`crate::network::Network`]: voltages and currents of every conductor.
//!
//! [`Workspace::new`] lays the network out and eliminates all that is linear; the iteration is
//! in the module `sweep`, which is the one to read first; `residual` checks every solution with
//! code of its own.

mod accelerate;
mod branch;
mod coils;
mod control;
mod follow;
mod injection;
mod lanes;
mod ports;
mod recover;
mod residual;
mod settings;
mod solution;
mod sweep;
mod terminals;
mod windings;
mod workspace;

pub use control::{RegulatedUnit, TapState, solve_regulated};
pub use residual::{Residual, load_current, residual};
pub use settings::Settings;
pub use solution::{Path, Solution, Status};
pub use sweep::Iterations;
pub use workspace::Workspace;

use crate::network::{Network, NodeId};

/// Solves the network from a flat start.
///
/// Never fails: look at [`Solution::status`] before using a number of it.
pub fn solve(network: &Network, settings: &Settings) -> Solution {
    if !network.ties.is_empty() {
        let opened = network.opened();
        return solved(network, Workspace::meshed(network, &opened), settings);
    }
    solved(network, Workspace::new(network), settings)
}

fn solved(network: &Network, workspace: Result<Workspace, NodeId>, settings: &Settings) -> Solution {
    match workspace {
        Ok(mut workspace) => workspace.solve(settings),
        Err(node) => {
            // Beyond the nodes of the network stand those of its opened rings.
            let node = match node.index().checked_sub(network.nodes.len()) {
                None => node,
                Some(tie) => network.ties[tie].far,
            };
            Solution { status: Status::Singular(node), worst_node: node, ..Solution::unsolved(network) }
        }
    }
}
