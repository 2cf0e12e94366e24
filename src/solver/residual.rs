//! An independent check of a solution: every branch equation and Kirchhoff's current law at every
//! node, from the network's own data. Shares no code with the sweep and its two-ports.

use super::coils;
use crate::math::{Complex64, PhaseVector, ZERO};
use crate::network::{
    Branch, BranchKind, Conductor, Connection, LoadModel, MotorState, Network, Node, NodeId,
};
use crate::solver::Solution;

/// Largest mismatches of a solution.
#[derive(Debug, Clone, Copy)]
pub struct Residual {
    /// Largest current mismatch at a node or in a transformer, amperes.
    pub amps: f64,
    /// Node where that is.
    pub node: NodeId,
    /// Largest voltage mismatch of a line, switch, regulator or the supply, volts.
    pub volts: f64,
}

/// Checks a solution against all equations of its network.
pub fn residual(network: &Network, solution: &Solution) -> Residual {
    residual_with(network, solution, &[])
}

/// The same where machines that are no part of the network draw these phase currents, amperes.
pub(super) fn residual_with(
    network: &Network,
    solution: &Solution,
    drawn: &[(NodeId, [Complex64; 3])],
) -> Residual {
    let mut balance = vec![PhaseVector::zeros(); network.nodes.len()];
    let mut worst =
        Residual { amps: 0.0, node: network.supply.node, volts: supply_mismatch(network, solution) };
    balance[network.supply.node.index()] += solution.source_amps;
    for (b, branch) in network.branches.iter().enumerate() {
        let (from, to) = (&solution.from_amps[b], &solution.to_amps[b]);
        balance[branch.from.index()] -= from;
        balance[branch.to.index()] += to;
        let ends = Ends {
            from_volts: &solution.volts[branch.from.index()],
            to_volts: &solution.volts[branch.to.index()],
            from_amps: from,
            to_amps: to,
        };
        let (volts, amps) = branch_mismatch(network, branch, &ends);
        worst.volts = larger(worst.volts, volts);
        if larger(worst.amps, amps) != worst.amps {
            (worst.amps, worst.node) = (amps, branch.to);
        }
    }
    subtract_shunts(network, solution, &mut balance);
    for (node, amps) in drawn {
        for (k, current) in amps.iter().enumerate() {
            balance[node.index()][k] -= current;
        }
    }
    for (i, mismatch) in balance.iter().enumerate() {
        let largest = network.nodes[i].conductors.iter().map(|c| mismatch[c.slot()].norm()).fold(0.0, larger);
        if larger(worst.amps, largest) != worst.amps {
            (worst.amps, worst.node) = (largest, NodeId(i as u32));
        }
    }
    worst
}

/// The larger of two mismatches; one that is not a number counts as the largest.
fn larger(a: f64, b: f64) -> f64 {
    if b.is_nan() || b > a { if b.is_nan() { f64::INFINITY } else { b } } else { a }
}

/// Voltages and currents at the two ends of a branch, currents positive from `from` to `to`.
struct Ends<'a> {
    from_volts: &'a PhaseVector,
    to_volts: &'a PhaseVector,
    from_amps: &'a PhaseVector,
    to_amps: &'a PhaseVector,
}

/// `V = E - Zs J - r sum(J)` on every conductor carried, `Zs` on the phases.
fn supply_mismatch(network: &Network, solution: &Solution) -> f64 {
    let supply = &network.supply;
    let conductors = network.node(supply.node).conductors;
    let total: Complex64 = conductors.iter().map(|c| solution.source_amps[c.slot()]).sum();
    let volts = &solution.volts[supply.node.index()];
    let mismatch = |c: Conductor| {
        let own: Complex64 = Conductor::PHASES
            .iter()
            .map(|k| supply.impedance[(c.slot(), k.slot())] * solution.source_amps[k.slot()])
            .sum();
        (volts[c.slot()] - supply.held_volts[c.slot()] + own + total * supply.earth_ohm).norm()
    };
    conductors.iter().map(mismatch).fold(0.0, larger)
}

/// Voltage and current mismatch of one branch.
fn branch_mismatch(network: &Network, branch: &Branch, ends: &Ends) -> (f64, f64) {
    let carried = branch.to_conductors;
    let worst = |of: &dyn Fn(Conductor) -> f64| carried.iter().map(of).fold(0.0, larger);
    match &branch.kind {
        BranchKind::Line(line) => {
            let (z, y) = (network.line_impedance(line), network.line_shunt(line));
            let half = Complex64::from(0.5);
            let series = ends.from_amps - y * ends.from_volts * half;
            let drop = ends.from_volts - ends.to_volts - z * series;
            let current = ends.to_amps - series + y * ends.to_volts * half;
            (worst(&|c| drop[c.slot()].norm()), worst(&|c| current[c.slot()].norm()))
        }
        BranchKind::Switch => (
            worst(&|c| (ends.from_volts[c.slot()] - ends.to_volts[c.slot()]).norm()),
            worst(&|c| (ends.from_amps[c.slot()] - ends.to_amps[c.slot()]).norm()),
        ),
        BranchKind::Regulator(bank) => {
            let mut expected_volts = *ends.from_volts;
            let mut expected_amps = *ends.to_amps;
            for unit in &bank.units {
                let against = match unit.across {
                    crate::network::Across::Phase(m) => Some(m),
                    crate::network::Across::Neutral => carried.has_neutral().then_some(Conductor::N),
                };
                let k = unit.phase.slot();
                let base = against.map_or(ZERO, |m| ends.from_volts[m.slot()]);
                let raise = unit.ratio() - 1.0;
                expected_volts[k] += (ends.from_volts[k] - base) * raise;
                // Power in equals power out: the winding returns its share at the other terminal.
                expected_amps[k] += ends.to_amps[k] * raise;
                if let Some(m) = against {
                    expected_amps[m.slot()] -= ends.to_amps[k] * raise;
                }
            }
            (
                worst(&|c| (ends.to_volts[c.slot()] - expected_volts[c.slot()]).norm()),
                worst(&|c| (ends.from_amps[c.slot()] - expected_amps[c.slot()]).norm()),
            )
        }
        BranchKind::Transformer(t) => {
            (0.0, coils::mismatch_amps(t, [ends.from_volts, ends.to_volts], [ends.from_amps, ends.to_amps]))
        }
    }
}

/// Takes loads, capacitors and electrodes from the current balance of each node.
fn subtract_shunts(network: &Network, solution: &Solution, balance: &mut [PhaseVector]) {
    for (i, node) in network.nodes.iter().enumerate() {
        for (slot, y) in node.earth_admittance().into_iter().enumerate() {
            balance[i][slot] -= y * solution.volts[i][slot];
        }
    }
    for motor in network.motors.iter().filter(|m| m.state == MotorState::Running) {
        let volts = &solution.volts[motor.node.index()];
        let drawn = motor.machine.circuit.operation(motor.slip, &[volts[0], volts[1], volts[2]]).amps;
        for (k, amps) in drawn.into_iter().enumerate() {
            balance[motor.node.index()][k] -= amps * f64::from(motor.count);
        }
    }
    let mut take = |id: NodeId, connection: Connection, current: &dyn Fn(&Node, Complex64) -> Complex64| {
        let node = network.node(id);
        let volts = &solution.volts[id.index()];
        for (p, q) in connection.pairs() {
            let carried = node.conductors.has(q);
            let base = if carried { volts[q.slot()] } else { ZERO };
            let amps = current(node, volts[p.slot()] - base);
            balance[id.index()][p.slot()] -= amps;
            if carried {
                balance[id.index()][q.slot()] += amps;
            }
        }
    };
    let floor = network.study.constant_power_floor_percent / 100.0;
    for load in &network.loads {
        let each = Complex64::new(load.watts, load.vars) / load.connection.elements() as f64;
        for (id, share) in network.load_sites(load) {
            take(id, load.connection, &|node, u| {
                load_current(load.model, each * share, node.nominal_across(load.connection), floor, u)
            });
        }
    }
    for generator in &network.generators {
        let each = -generator.delivering / generator.connection.elements() as f64;
        take(generator.node, generator.connection, &|node, u| {
            load_current(LoadModel::Power, each, node.nominal_across(generator.connection), floor, u)
        });
    }
    for capacitor in &network.capacitors {
        let each = capacitor.vars / capacitor.connection.elements() as f64;
        let y = Complex64::new(0.0, each / capacitor.rated_volts.powi(2));
        take(capacitor.node, capacitor.connection, &|_, u| y * u);
    }
}

/// Current of one load element of power `s` at voltage `u` across it (formulas at [`crate::network::Load`]).
pub fn load_current(model: LoadModel, s: Complex64, nominal: f64, floor_pu: f64, u: Complex64) -> Complex64 {
    match model {
        LoadModel::Impedance => s.conj() * u / (nominal * nominal),
        LoadModel::Current if u.norm() == 0.0 => ZERO,
        LoadModel::Current => s.conj() / nominal * u / u.norm(),
        LoadModel::Power => {
            let floor = floor_pu * nominal;
            if u.norm() >= floor && u.norm() > 0.0 {
                (s / u).conj()
            } else if floor > 0.0 {
                let m = u.norm_sqr() / (floor * floor);
                s.conj() * u * (2.0 - m) / (floor * floor)
            } else {
                ZERO
            }
        }
    }
}
