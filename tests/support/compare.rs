//! A solved network held against the nodal method: voltages, source currents and losses.

use fourwire::math::{Complex64, PhaseVector};
use fourwire::network::{Conductor, Network};
use fourwire::solver::{Settings, Solution, Status, residual, solve};

use super::nodal;

/// Voltages as a share of nominal; currents and losses as a share of the feeder's.
pub const TOLERANCE: f64 = 1e-8;

/// What a comparison found.
pub struct Compared {
    /// Largest difference of a node voltage, share of nominal.
    pub worst_pu: f64,
    /// Lowest phase voltage to earth, share of nominal phase voltage.
    pub lowest_pu: f64,
}

fn losses(network: &Network, solution: &Solution) -> Complex64 {
    let power = |volts: &PhaseVector, amps: &PhaseVector| -> Complex64 {
        (0..4).map(|k| volts[k] * amps[k].conj()).sum()
    };
    let branches = network.branches.iter().enumerate().map(|(b, branch)| {
        power(&solution.volts[branch.from.index()], &solution.from_amps[b])
            - power(&solution.volts[branch.to.index()], &solution.to_amps[b])
    });
    let earth =
        network.nodes.iter().zip(&solution.volts).flat_map(|(node, v)| {
            (0..4).zip(node.earth_admittance()).map(|(k, y)| v[k].norm_sqr() * y.conj())
        });
    branches.sum::<Complex64>() + earth.sum::<Complex64>()
}

/// Solves both ways; `label` says which network, for the message of a failure.
pub fn compare(label: &str, network: &Network) -> Compared {
    let solution = solve(network, &Settings::default());
    let (status, iterations) = (solution.status, solution.iterations);
    let left = residual(network, &solution);
    let (amps, volts, node) = (left.amps, left.volts, &network.node(left.node).name);
    assert_eq!(
        status,
        Status::Converged,
        "{label}: {iterations} iterations, {:e} pu, {amps:e} A at {node}, {volts:e} V",
        solution.change_pu
    );
    let other =
        nodal::solve_nodal(network).unwrap_or_else(|| panic!("{label}: the nodal method does not settle"));
    let mut found = Compared { worst_pu: 0.0, lowest_pu: f64::INFINITY };
    for (i, node) in network.nodes.iter().enumerate() {
        for c in node.conductors.iter() {
            let (a, b) = (solution.volts[i][c.slot()], other.volts[i][c.slot()]);
            let off = (a - b).norm() / node.nominal_phase_volts();
            let name = &node.name;
            let followed = other.followed;
            assert!(
                off < TOLERANCE,
                "{label}, node {name} {c}: {a} and {b}, {off:e} of nominal (followed from no load: {followed})"
            );
            found.worst_pu = found.worst_pu.max(off);
            if c != Conductor::N {
                found.lowest_pu = found.lowest_pu.min(a.norm() / node.nominal_phase_volts());
            }
        }
    }
    let feeder = other.source_amps.iter().map(|i| i.norm()).fold(1e-3, f64::max);
    for k in 0..4 {
        let off = (solution.source_amps[k] - other.source_amps[k]).norm();
        assert!(off < TOLERANCE * feeder, "{label}: source current off by {off:e} A of {feeder}");
    }
    let mine = losses(network, &solution);
    let scale = other.losses.norm().max(1e-3 * network.supply.nominal_volts * feeder);
    let off = (mine - other.losses).norm() / scale;
    assert!(off < TOLERANCE, "{label}: losses {mine} and {}, {off:e}", other.losses);
    found
}
