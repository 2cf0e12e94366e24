//! The sweep against an independent nodal method on random networks: every voltage within 1e-8 of
//! nominal, losses and source currents within 1e-8.

#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use fourwire::math::Complex64;
use fourwire::network::{Network, build};
use fourwire::solver::{Settings, Solution, Status, solve};

const NETWORKS: u64 = 240;
const TOLERANCE: f64 = 1e-8;

fn losses(network: &Network, solution: &Solution) -> Complex64 {
    let power = |volts: &fourwire::math::PhaseVector, amps: &fourwire::math::PhaseVector| -> Complex64 {
        (0..4).map(|k| volts[k] * amps[k].conj()).sum()
    };
    let branches: Complex64 = network
        .branches
        .iter()
        .enumerate()
        .map(|(b, branch)| {
            power(&solution.volts[branch.from.index()], &solution.from_amps[b])
                - power(&solution.volts[branch.to.index()], &solution.to_amps[b])
        })
        .sum();
    let earth: Complex64 = network
        .nodes
        .iter()
        .zip(&solution.volts)
        .flat_map(|(node, v)| {
            node.earth_admittance()
                .into_iter()
                .enumerate()
                .map(|(k, y)| v[k].norm_sqr() * y.conj())
                .collect::<Vec<_>>()
        })
        .sum();
    branches + earth
}

#[test]
fn random_networks_agree_with_the_nodal_method() {
    let (mut compared, mut refused, mut below_floor) = (0, Vec::new(), 0);
    let mut worst = 0.0f64;
    for seed in 0..NETWORKS {
        let built = build(&random::random_draft(seed));
        let Some(network) = built.network else {
            let first = built
                .diagnostics
                .items()
                .iter()
                .find(|d| d.severity == fourwire::diagnostic::Severity::Error);
            refused.push(format!("seed {seed}: {}", first.map_or(String::new(), |d| d.message.clone())));
            continue;
        };
        let solution = solve(&network, &Settings::default());
        assert_eq!(
            solution.status,
            Status::Converged,
            "seed {seed}: {} iterations, {:e}",
            solution.iterations,
            solution.change_pu
        );
        let other = nodal::solve_nodal(&network)
            .unwrap_or_else(|| panic!("seed {seed}: the nodal method does not settle"));
        let mut lowest = f64::INFINITY;
        for (i, node) in network.nodes.iter().enumerate() {
            for c in node.conductors.iter() {
                let (a, b) = (solution.volts[i][c.slot()], other.volts[i][c.slot()]);
                let off = (a - b).norm() / node.nominal_phase_volts();
                assert!(
                    off < TOLERANCE,
                    "seed {seed}, node {} {c}: {a} and {b}, {off:e} of nominal",
                    node.name
                );
                worst = worst.max(off);
                if c != fourwire::network::Conductor::N {
                    lowest = lowest.min(a.norm() / node.nominal_phase_volts());
                }
            }
        }
        below_floor += usize::from(lowest < 0.7);
        let feeder = other.source_amps.iter().map(|i| i.norm()).fold(1e-3, f64::max);
        for k in 0..4 {
            let off = (solution.source_amps[k] - other.source_amps[k]).norm();
            assert!(off < TOLERANCE * feeder, "seed {seed}: source current off by {off:e} A of {feeder}");
        }
        let mine = losses(&network, &solution);
        let scale = other.losses.norm().max(1e-3 * network.supply.nominal_volts * feeder);
        let off = (mine - other.losses).norm() / scale;
        assert!(off < TOLERANCE, "seed {seed}: losses {mine} and {}, {off:e}", other.losses);
        compared += 1;
    }
    println!(
        "{compared} networks, worst {worst:.1e} of nominal, {below_floor} with loads below the floor, refused {}",
        refused.len()
    );
    assert!(refused.len() <= 5, "{refused:#?}");
    assert!(compared >= 200 && below_floor >= 3);
}
