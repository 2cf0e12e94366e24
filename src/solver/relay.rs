//! What the controls of regulators and capacitors measure in a solution.

use super::solution::Solution;
use crate::math::{Complex64, PhaseVector, ZERO};
use crate::network::{
    Across, Branch, BranchId, BranchKind, CapacitorBank, CapacitorSwitch, Conductor, Conductors, End,
    Network, NodeId, RegulatorUnit,
};

/// Power below this, watts, has no direction.
const NO_POWER_W: f64 = 1.0;

/// Which way power flows through a regulator.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PowerFlow {
    /// From its `from` to its `to` side.
    Forward,
    /// From its regulated side back.
    Backward,
}

/// Voltage of a conductor at a node; zero (earth) where it is not carried.
fn at(network: &Network, solution: &Solution, node: NodeId, c: Conductor) -> Complex64 {
    if network.node(node).conductors.has(c) { solution.volts[node.index()][c.slot()] } else { ZERO }
}

/// Voltage across a unit at one end of its bank, volts.
fn across(
    network: &Network,
    solution: &Solution,
    branch: &Branch,
    unit: &RegulatorUnit,
    end: End,
) -> Complex64 {
    let (node, conductors) = match end {
        End::From => (branch.from, branch.from_conductors),
        End::To => (branch.to, branch.to_conductors),
    };
    let base = match unit.across {
        Across::Phase(m) => at(network, solution, node, m),
        Across::Neutral if conductors.has_neutral() => at(network, solution, node, Conductor::N),
        Across::Neutral => ZERO,
    };
    at(network, solution, node, unit.phase) - base
}

/// What a unit's control sees, volts over the ratio of its potential transformer.
#[derive(Debug, Clone, Copy)]
pub(super) struct Seen {
    /// At the relay, forward: the regulated side less the compensator's drop.
    pub relay: f64,
    /// At the terminals of the regulated side.
    pub terminals: f64,
    /// At the terminals of the source side.
    pub source_side: f64,
    /// Direction of power.
    pub flow: PowerFlow,
}

/// Looks at a unit; `fed_at` is the end of its bank nearer the source.
pub(super) fn look(
    network: &Network,
    solution: &Solution,
    id: BranchId,
    unit: &RegulatorUnit,
    fed_at: End,
) -> Seen {
    let branch = network.branch(id);
    let control = &unit.control;
    let pt = control.pt_ratio.unwrap_or(1.0);
    let amps = &solution.to_amps[id.index()];
    let volts = across(network, solution, branch, unit, End::To);
    let own = amps[unit.phase.slot()];
    let compensator = match control.ct_amps {
        Some(rated) => Complex64::new(control.r_volts, control.x_volts) * own / rated,
        None => ZERO,
    };
    // A line current lags or leads the voltage across two phases by 30 degrees more: there the
    // whole bank's power tells the direction.
    let watts = match unit.across {
        Across::Neutral => (volts * own.conj()).re,
        Across::Phase(_) => {
            let to = &solution.volts[branch.to.index()];
            branch.to_conductors.iter().map(|c| (to[c.slot()] * amps[c.slot()].conj()).re).sum()
        }
    };
    let backward = watts < -NO_POWER_W || watts <= NO_POWER_W && fed_at == End::To;
    Seen {
        relay: (volts / pt - compensator).norm(),
        terminals: volts.norm() / pt,
        source_side: across(network, solution, branch, unit, End::From).norm() / pt,
        flow: if backward { PowerFlow::Backward } else { PowerFlow::Forward },
    }
}

/// Which end of a branch is nearer the source.
pub(super) fn source_end(network: &Network, branch: BranchId) -> End {
    let fed = network.feeds.iter().flatten().find(|f| f.branch == branch).map(|f| f.upstream);
    let tied = network.ties.iter().find(|t| t.branch == branch).map(|t| t.upstream);
    fed.or(tied).unwrap_or(End::From)
}

/// What the control of a capacitor measures, in the unit of its thresholds; `None` for a fixed one.
pub(super) fn reading(network: &Network, solution: &Solution, bank: &CapacitorBank, end: End) -> Option<f64> {
    match bank.switch {
        CapacitorSwitch::Fixed | CapacitorSwitch::Profile => None,
        CapacitorSwitch::Voltage { pt_ratio, across, .. } => {
            let node = bank.capacitor.node;
            let (p, q) = across.pairs().next()?;
            Some((at(network, solution, node, p) - at(network, solution, node, q)).norm() / pt_ratio)
        }
        CapacitorSwitch::Kvar { line, phases, .. } => {
            let (node, amps) = line_end(network, solution, line, end);
            let neutral = at(network, solution, node, Conductor::N);
            let vars = |c: Conductor| ((at(network, solution, node, c) - neutral) * amps[c.slot()].conj()).im;
            Some(phases.iter().map(vars).sum())
        }
        CapacitorSwitch::Current { line, phases, .. } => {
            let (_, amps) = line_end(network, solution, line, end);
            Some(greatest(phases, &amps))
        }
    }
}

fn greatest(phases: Conductors, amps: &PhaseVector) -> f64 {
    phases.iter().map(|c| amps[c.slot()].norm()).fold(0.0, f64::max)
}

/// Node and current, away from the source, at one end of a line.
fn line_end(network: &Network, solution: &Solution, line: BranchId, end: End) -> (NodeId, PhaseVector) {
    let branch = network.branch(line);
    match end {
        End::From => (branch.from, solution.from_amps[line.index()]),
        End::To => (branch.to, -solution.to_amps[line.index()]),
    }
}

/// The unit of a bank.
pub(super) fn unit_of(network: &Network, branch: BranchId, unit: usize) -> Option<&RegulatorUnit> {
    match &network.branch(branch).kind {
        BranchKind::Regulator(bank) => bank.units.get(unit),
        _ => None,
    }
}
