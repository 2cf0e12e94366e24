//! A network under machines whose admittance changes from moment to moment: starts and run-ups.

use nalgebra::Matrix3;

use super::follow::Followed;
use super::ports::phases;
use super::residual::residual_with;
use super::settings::Settings;
use super::solution::{Solution, Status};
use super::workspace::Workspace;
use crate::machine::Phases;
use crate::math::Complex64;
use crate::network::{Network, NodeId};

/// Rounds in which admittances that depend on voltage must come to rest.
const ROUNDS: usize = 60;
/// Change of an admittance that counts as none, share of it.
const SAME: f64 = 1e-11;

/// A network laid out once for many solves; each begins where the last one ended.
pub struct Machines<'a> {
    workspace: Workspace<'a>,
    network: &'a Network,
    nodes: Vec<NodeId>,
    /// Position of each machine's node.
    positions: Vec<usize>,
    settings: Settings,
    begun: bool,
}

impl<'a> Machines<'a> {
    /// Lays out a network, in which all motors must be off, for machines at these three-phase nodes;
    /// `opened` is [`Network::opened`] of it.
    ///
    /// # Errors
    /// The node where the linear part has no solution.
    pub fn new(network: &'a Network, opened: &'a Network, nodes: Vec<NodeId>) -> Result<Self, NodeId> {
        let workspace = Workspace::with_machines(network, opened, &nodes)?;
        let position = |node: &NodeId| workspace.nodes.iter().position(|id| id == node).map_or(0, |i| i + 1);
        let positions = nodes.iter().map(position).collect();
        Ok(Machines { workspace, network, nodes, positions, settings: Settings::default(), begun: false })
    }

    /// Solves with each machine's admittance, siemens, as it is at the voltages it gets; false where there is no solution.
    pub fn solve(&mut self, seen: &dyn Fn(usize, &Phases) -> Matrix3<Complex64>) -> bool {
        if !self.begun {
            self.workspace.start_flat();
            self.begun = true;
        }
        let mut before: Vec<Matrix3<Complex64>> = Vec::new();
        for _ in 0..ROUNDS {
            let now: Vec<_> = (0..self.nodes.len()).map(|k| seen(k, &self.volts(k))).collect();
            let same = |(a, b): (&Matrix3<Complex64>, &Matrix3<Complex64>)| (a - b).norm() <= SAME * b.norm();
            if before.len() == now.len() && now.iter().zip(&before).all(same) {
                return true;
            }
            self.workspace.set_machines(now.iter().copied());
            let done = self.workspace.iterate(1e-10, 150);
            if done.change_pu > 1e-10 || done.change_pu.is_nan() {
                // The sweep alone does not get there.
                if !matches!(self.workspace.follow(), Followed::Reached { .. }) {
                    self.begun = false;
                    return false;
                }
            }
            before = now;
        }
        false
    }

    /// Phase voltages of a machine to earth, volts.
    pub fn volts(&self, machine: usize) -> Phases {
        phases(&self.workspace.state.volts[self.positions[machine]])
    }

    /// The whole solution of the last solve, checked: with what the machines draw at their voltages.
    pub fn solution(&mut self, drawn: &dyn Fn(usize, &Phases) -> Phases) -> Solution {
        let mut solution = self.workspace.settled_solution();
        let extra: Vec<(NodeId, Phases)> = (0..self.nodes.len())
            .map(|k| {
                let v = &solution.volts[self.nodes[k].index()];
                (self.nodes[k], drawn(k, &[v[0], v[1], v[2]]))
            })
            .collect();
        let check = residual_with(self.network, &solution, &extra);
        (solution.mismatch_amps, solution.mismatch_volts) = (check.amps, check.volts);
        let good = self.settings.allow(&check, &solution, self.network);
        solution.status = if good { Status::Converged } else { Status::IterationLimit };
        solution.worst_node = check.node;
        solution
    }
}
