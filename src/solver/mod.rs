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
mod generators;
mod injection;
mod lanes;
mod machines;
mod motors;
mod ports;
mod recover;
mod relay;
mod residual;
mod settings;
mod solution;
mod sweep;
mod switching;
mod terminals;
mod windings;
mod workspace;

pub use control::{Controls, RegulatedUnit, TapState, solve_controlled, solve_regulated};
pub use generators::{generator_pu, solve_operating};
pub use machines::Machines;
pub use motors::solve_running;
pub use relay::PowerFlow;
pub use residual::{Residual, load_current, residual};
pub use settings::Settings;
pub use solution::{Path, Solution, Status};
pub use sweep::Iterations;
pub use switching::{CapacitorState, SwitchedCapacitor};
pub use workspace::Workspace;

use crate::math::Complex64;
use crate::network::{Motor, MotorState, Network, NodeId};

/// Solves the network from a flat start.
///
/// Never fails: look at [`Solution::status`] before using a number of it.
pub fn solve(network: &Network, settings: &Settings) -> Solution {
    // A motor's admittance differs for the two rotations, so that currents do not go up it as they
    // come down: it is no part of the elimination.
    let running = || network.motors.iter().filter(|m| m.state == MotorState::Running);
    let motors: Vec<NodeId> = running().map(|m| m.node).collect();
    if network.ties.is_empty() && motors.is_empty() {
        return solved(network, Workspace::new(network), settings);
    }
    let opened = network.opened();
    let workspace = Workspace::with_machines(network, &opened, &motors).map(|mut workspace| {
        let admittance =
            |m: &Motor| m.machine.circuit.phase_matrix(m.slip) * Complex64::from(f64::from(m.count));
        workspace.set_machines(running().map(admittance));
        workspace
    });
    solved(network, workspace, settings)
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
