//! From the last iterate to a solution: currents at every branch end, the independent check, the status.

use super::branch::Seen;
use super::follow::Followed;
use super::residual::residual;
use super::settings::Settings;
use super::solution::{Path, Solution, Status};
use super::sweep::Iterations;
use super::terminals::Terminals;
use super::workspace::Workspace;
use crate::math::{Complex64, PhaseVector};
use crate::network::{BranchKind, Conductors, End, Feed, Network, NodeId};

const N: usize = 3;

/// Below this voltage at a load, share of nominal, there may be another solution above.
const DOUBTFUL_PU: f64 = 0.8;
/// With so few sweeps from a flat start there is none.
const FEW_SWEEPS: usize = 25;
/// Sweeps after which following the loads is the surer way.
const MOST_SWEEPS: usize = 150;
/// Solutions whose voltages differ by less are one, share of nominal.
const SAME_PU: f64 = 1e-6;

/// Whether two solutions are one.
fn same(network: &Network, one: &Solution, other: &Solution) -> bool {
    network
        .nodes
        .iter()
        .zip(one.volts.iter().zip(&other.volts))
        .all(|(node, (a, b))| (a - b).iter().all(|d| d.norm() < SAME_PU * node.nominal_phase_volts()))
}

impl Workspace<'_> {
    /// Solves from a flat start and checks the result.
    ///
    /// Where the sweep does not settle, or settles at voltages so low that there may be another
    /// solution above, the loads are followed from nothing (see the module `follow`).
    pub fn solve(&mut self, settings: &Settings) -> Solution {
        let swept = self.sweep(settings);
        let converged = swept.status == Status::Converged;
        let low = || self.lowest_at_loads() < DOUBTFUL_PU;
        let given_up = !converged && swept.iterations >= settings.iteration_limit;
        if given_up || converged && swept.iterations <= FEW_SWEEPS && !low() {
            return swept;
        }
        match self.follow() {
            Followed::Reached { passes, change_pu } => {
                let count = swept.iterations + passes;
                let done = Iterations { count, change_pu };
                let followed = self.checked(settings, done, done, true);
                let good = followed.status == Status::Converged;
                if !good || converged && same(self.whole, &swept, &followed) {
                    return swept;
                }
                Solution { path: Path::Followed, ..followed }
            }
            Followed::Folds { share } => {
                let status = if converged { Status::Converged } else { Status::BeyondLoadability };
                Solution { status, path: Path::Folds { share }, ..swept }
            }
        }
    }

    /// Sweeps from a flat start.
    ///
    /// Where the voltages have settled but the independent check still finds too large a current
    /// mismatch, the iteration goes on with a tighter test.
    fn sweep(&mut self, settings: &Settings) -> Solution {
        let limit = settings.iteration_limit.min(MOST_SWEEPS);
        self.start_flat();
        let mut tolerance = settings.voltage_tolerance_pu;
        let mut total = Iterations { count: 0, change_pu: f64::INFINITY };
        loop {
            let done = self.iterate(tolerance, limit.saturating_sub(total.count));
            total = Iterations { count: total.count + done.count, change_pu: done.change_pu.min(f64::MAX) };
            let settled = done.change_pu <= tolerance;
            let solution = self.checked(settings, total, done, settled);
            let spent = total.count >= limit;
            if solution.status == Status::Converged || !settled || spent || tolerance < 1e-14 {
                return solution;
            }
            tolerance /= 10.0;
        }
    }

    /// Voltages and currents of the present state, which stays as it is; not checked.
    pub(super) fn settled_solution(&mut self) -> Solution {
        let (volts, amps) = (self.state.volts.clone(), self.state.amps.clone());
        self.settle();
        let mut solution = self.solution();
        solution.volts.truncate(self.whole.nodes.len());
        (self.state.volts, self.state.amps) = (volts, amps);
        solution
    }

    /// The solution of the present state with its status.
    fn checked(
        &mut self,
        settings: &Settings,
        total: Iterations,
        last: Iterations,
        settled: bool,
    ) -> Solution {
        let before = if settled { Vec::new() } else { self.state.volts.clone() };
        self.settle();
        let mut solution = self.solution();
        solution.iterations = total.count;
        solution.change_pu = last.change_pu;
        // Nodes of the openings are no part of the network.
        solution.volts.truncate(self.whole.nodes.len());
        let check = residual(self.whole, &solution);
        solution.mismatch_amps = check.amps;
        solution.mismatch_volts = check.volts;
        solution.worst_node = check.node;
        solution.status = if !last.change_pu.is_finite() {
            Status::Diverged
        } else if settled && settings.allow(&check, &solution, self.network) {
            Status::Converged
        } else {
            Status::IterationLimit
        };
        if !settled {
            solution.worst_node = self.in_network(self.largest_change(&before));
        }
        solution
    }

    /// The node of the network that a node of the opened one stands for.
    fn in_network(&self, id: NodeId) -> NodeId {
        match id.index().checked_sub(self.whole.nodes.len()) {
            None => id,
            Some(tie) => self.whole.ties[tie].far,
        }
    }

    /// Node whose voltage still moves most, per unit.
    fn largest_change(&self, before: &[super::lanes::Slots]) -> NodeId {
        let change = |position: usize| {
            let (now, then) =
                (PhaseVector::from(&self.state.volts[position]), PhaseVector::from(&before[position]));
            let squares = (now - then).map(|d| d.norm_sqr());
            squares.max() * self.layout.per_nominal2[position]
        };
        let worst = (1..self.state.volts.len()).max_by(|&a, &b| change(a).total_cmp(&change(b)));
        worst.map_or(self.network.supply.node, |position| self.nodes[position - 1])
    }

    /// Voltages and branch currents of the present state.
    fn solution(&self) -> Solution {
        let network = self.network;
        let mut solution = Solution::unsolved(network);
        for (i, id) in self.nodes.iter().enumerate() {
            let conductors = network.node(*id).conductors;
            solution.volts[id.index()] = carried(&PhaseVector::from(&self.state.volts[i + 1]), conductors);
        }
        for (i, id) in self.nodes.iter().enumerate() {
            let volts = &solution.volts[id.index()];
            // J = Y V + K: all that the node and what hangs below it draw.
            let mut drawn = PhaseVector::from(&self.state.amps[i + 1]);
            match &self.seen[id.index()] {
                Seen::Neutral(alpha) => drawn[N] += alpha * volts[N],
                Seen::Full(y) => drawn += **y * volts,
            }
            match network.feeds[id.index()] {
                Some(feed) => self.branch_currents(&feed, *id, &drawn, &mut solution),
                None => solution.source_amps = carried(&drawn, network.node(*id).conductors),
            }
        }
        solution
    }

    /// End currents of the branch that feeds a node drawing `drawn`.
    fn branch_currents(&self, feed: &Feed, id: NodeId, drawn: &PhaseVector, solution: &mut Solution) {
        let network = self.network;
        let branch = network.branch(feed.branch);
        let (parent, node) = (&solution.volts[feed.parent.index()], &solution.volts[id.index()]);
        let conductors = match feed.upstream {
            End::From => (branch.from_conductors, branch.to_conductors),
            End::To => (branch.to_conductors, branch.from_conductors),
        };
        let (near, far) = match &branch.kind {
            BranchKind::Line(line) => {
                let half = network.line_shunt(line) * Complex64::from(0.5);
                // What the node draws includes the charging of this end.
                (drawn + half * carried(parent, conductors.0), drawn - half * node)
            }
            BranchKind::Switch => (*drawn, *drawn),
            BranchKind::Regulator(bank) => {
                let ratio = bank.ratio_matrix(branch.from_conductors.has_neutral());
                let up = match feed.upstream {
                    End::From => ratio.transpose() * drawn,
                    End::To => ratio.transpose().lu().solve(drawn).unwrap_or(*drawn),
                };
                (up, *drawn)
            }
            BranchKind::Transformer(t) => {
                let y = Terminals::of(t);
                let into = match feed.upstream {
                    End::From => y.from * parent + y.across * node,
                    End::To => y.to * parent + y.across.transpose() * node,
                };
                (into, *drawn)
            }
        };
        let (near, far) = (carried(&near, conductors.0), carried(&far, conductors.1));
        let b = feed.branch.index();
        (solution.from_amps[b], solution.to_amps[b]) = match feed.upstream {
            End::From => (near, far),
            End::To => (-far, -near),
        };
    }
}

/// The vector with the slots that are not carried set to zero.
fn carried(v: &PhaseVector, conductors: Conductors) -> PhaseVector {
    let mut kept = PhaseVector::zeros();
    for c in conductors.iter() {
        kept[c.slot()] = v[c.slot()];
    }
    kept
}
