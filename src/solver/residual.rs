//! An independent check of a solution: every branch equation and Kirchhoff's current law at every
//! node, from the network's own data. Shares no code with the sweep and its two-ports.

use crate::math::{Complex64, PhaseVector, ZERO};
use crate::network::{
    Branch, BranchKind, Conductor, Connection, LoadModel, Network, NeutralPoint, Node, NodeId, Transformer,
    VectorGroup, Winding,
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
        BranchKind::Transformer(t) => (0.0, transformer_mismatch(t, ends)),
    }
}

/// A winding: its terminals, and its voltage and current once the star point is known.
struct WindingPair {
    from: (usize, usize),
    to: (usize, usize),
}

/// Current mismatch of a transformer from its winding equations: each unit's currents follow from
/// its winding voltages, the star points' voltages from where they go.
fn transformer_mismatch(t: &Transformer, ends: &Ends) -> f64 {
    let pairs = winding_pairs(t);
    let rating = t.rated_va / pairs.len() as f64;
    let side_volts =
        |line: f64, delta: bool| if delta || pairs.len() == 1 { line } else { line / 3f64.sqrt() };
    let (from_delta, to_delta) = match t.group {
        VectorGroup::Three { from, to, .. } => (from == Winding::Delta, to == Winding::Delta),
        VectorGroup::Single { .. } => (false, false),
    };
    let (uf, ut) = (side_volts(t.from_volts, from_delta), side_volts(t.to_volts, to_delta));
    let ratio = uf / (ut * (1.0 + t.tap_pu));
    let ohm = Complex64::new(t.r_pu, t.x_pu) * ut * ut / rating;
    let shunt = Complex64::new(t.no_load_watts / pairs.len() as f64, -t.magnetizing_pu * rating) / (uf * uf);

    // Star points: known on a conductor or solid earth; through a resistance from the neutral
    // current the ends report (what the phases carry returns through it); floating ones drop out
    // of sums of three equal units, so only deviations from the mean are compared then.
    let star = |point: NeutralPoint, volts: &PhaseVector, phase_amps: Complex64| match point {
        NeutralPoint::Conductor => volts[3],
        NeutralPoint::Earthed(ohm) => phase_amps * ohm,
        NeutralPoint::Floating | NeutralPoint::None => ZERO,
    };
    let phase_sum = |amps: &PhaseVector| amps[0] + amps[1] + amps[2];
    let from_star = star(t.from_neutral, ends.from_volts, phase_sum(ends.from_amps));
    let to_star = star(t.to_neutral, ends.to_volts, -phase_sum(ends.to_amps));
    let across = |volts: &PhaseVector, pair: (usize, usize), star: Complex64| {
        let at = |slot: usize| if slot == 3 { star } else { volts[slot] };
        at(pair.0) - at(pair.1)
    };
    let mut from_volts: Vec<Complex64> =
        pairs.iter().map(|p| across(ends.from_volts, p.from, from_star)).collect();
    let mut to_volts: Vec<Complex64> = pairs.iter().map(|p| across(ends.to_volts, p.to, to_star)).collect();
    let floats = |point: NeutralPoint| point == NeutralPoint::Floating;
    if floats(t.from_neutral) || floats(t.to_neutral) {
        shift_star_points(t, &mut from_volts, &mut to_volts, ratio, shunt * ohm);
    }
    let mut expected = [PhaseVector::zeros(), PhaseVector::zeros()];
    for (k, pair) in pairs.iter().enumerate() {
        let to_current = (from_volts[k] / ratio - to_volts[k]) / ohm;
        let from_current = to_current / ratio + shunt * from_volts[k];
        expected[0][pair.from.0] += from_current;
        expected[0][pair.from.1] -= from_current;
        expected[1][pair.to.0] += to_current;
        expected[1][pair.to.1] -= to_current;
    }
    let phases = 0..3;
    let worst_phase = phases
        .map(|k| {
            larger((ends.from_amps[k] - expected[0][k]).norm(), (ends.to_amps[k] - expected[1][k]).norm())
        })
        .fold(0.0, larger);
    let neutral = |point: NeutralPoint, amps: &PhaseVector, expected: &PhaseVector| match point {
        NeutralPoint::Conductor => (amps[3] - expected[3]).norm(),
        _ => 0.0,
    };
    let worst_neutral = larger(
        neutral(t.from_neutral, ends.from_amps, &expected[0]),
        neutral(t.to_neutral, ends.to_amps, &expected[1]),
    );
    larger(worst_phase, worst_neutral)
}

/// Moves floating star points to where their winding currents add up to zero. With `x`, `y` the
/// shifts of the from and to winding voltages: the to currents `(vf / t - vt) / z` sum to zero
/// where the to star floats; the from currents, with their no-load part, where the from star floats.
fn shift_star_points(
    t: &Transformer,
    from: &mut [Complex64],
    to: &mut [Complex64],
    ratio: f64,
    shunt_ohm: Complex64,
) {
    let mean = |volts: &[Complex64]| volts.iter().sum::<Complex64>() / volts.len() as f64;
    let (f, w) = (mean(from), mean(to));
    let (x, y) = match (t.from_neutral == NeutralPoint::Floating, t.to_neutral == NeutralPoint::Floating) {
        // Both sums vanish: without a no-load shunt only f/t - w matters, with one f itself is zero.
        (true, true) => (-f, -w),
        // f/t - w + shunt z t f = 0 after the shift of f.
        (true, false) => (w / (1.0 / ratio + shunt_ohm * ratio) - f, ZERO),
        (false, _) => (ZERO, f / ratio - w),
    };
    from.iter_mut().for_each(|v| *v += x);
    to.iter_mut().for_each(|v| *v += y);
}

/// Winding terminals of each unit by vector group, as described at [`Transformer`].
fn winding_pairs(t: &Transformer) -> Vec<WindingPair> {
    let (from, to, clock) = match t.group {
        VectorGroup::Three { from, to, clock } => (from, to, clock as usize),
        VectorGroup::Single { clock } => {
            let pairs = t.terminals.into_iter().flat_map(Connection::pairs);
            let single = pairs.map(|(p, q)| (p.slot(), q.slot()));
            return single
                .map(|(p, q)| WindingPair { from: (p, q), to: if clock == 6 { (q, p) } else { (p, q) } })
                .collect();
        }
    };
    let (next, before) = (|k: usize| (k + 1) % 3, |k: usize| (k + 2) % 3);
    let plain = |winding: Winding, k: usize| if winding == Winding::Delta { (k, next(k)) } else { (k, 3) };
    let (from_delta, to_delta) = (from == Winding::Delta, to == Winding::Delta);
    let pair = |k: usize| match (from_delta, to_delta, clock % 4) {
        (true, false, 1) => ((k, before(k)), (k, 3)),
        (true, false, _) => ((k, next(k)), (k, 3)),
        (false, true, 1) => ((k, 3), (k, next(k))),
        (false, true, _) => ((k, 3), (k, before(k))),
        (_, _, 2) => (plain(from, k), {
            let (p, q) = plain(to, k);
            (q, p)
        }),
        _ => (plain(from, k), plain(to, k)),
    };
    let moves = match (from_delta == to_delta, clock) {
        (true, 0 | 6) | (false, 1 | 11) => 0,
        (true, 4 | 10) | (false, 5 | 3) => 1,
        _ => 2,
    };
    let moved = |slot: usize| (0..moves).fold(slot, |s, _| if s == 3 { 3 } else { before(s) });
    (0..3)
        .map(|k| {
            let (from, (p, q)) = pair(k);
            WindingPair { from, to: (moved(p), moved(q)) }
        })
        .collect()
}

/// Takes loads, capacitors and electrodes from the current balance of each node.
fn subtract_shunts(network: &Network, solution: &Solution, balance: &mut [PhaseVector]) {
    for (i, node) in network.nodes.iter().enumerate() {
        for (slot, y) in node.earth_admittance().into_iter().enumerate() {
            balance[i][slot] -= y * solution.volts[i][slot];
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
