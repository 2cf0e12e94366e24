//! Generators whose output follows the voltage: found around the solve.
//!
//! A generator delivers constant power in a solve. Its curves give another output at the voltage
//! it then sees; `f(x) = output(voltage(x)) - x` over all of them is brought to zero by Anderson's
//! method (see the module `accelerate`), which steep curves do not throw to and fro.

use nalgebra::{DMatrix, DVector};

use super::motors::solve_running;
use super::settings::Settings;
use super::solution::{Solution, Status};
use crate::math::Complex64;
use crate::network::{Generator, Network};

/// Solves after which the curves are given up.
const ROUNDS: usize = 100;
/// Past steps combined.
const DEPTH: usize = 5;
/// Share of the difference that a step takes.
const STEP: f64 = 0.4;
/// Difference between curve and output at which it is settled, share of the rating.
const SETTLED: f64 = 1e-9;

/// Mean voltage across the elements of a generator, per unit of nominal.
pub fn generator_pu(network: &Network, solution: &Solution, generator: &Generator) -> f64 {
    let node = network.node(generator.node);
    let volts = &solution.volts[generator.node.index()];
    let at = |c: crate::network::Conductor| {
        if node.conductors.has(c) { volts[c.slot()] } else { Complex64::default() }
    };
    let across = generator.connection.pairs().map(|(p, q)| (at(p) - at(q)).norm());
    let count = generator.connection.elements().max(1) as f64;
    across.sum::<f64>() / count / node.nominal_across(generator.connection)
}

/// Solves a network with its running motors and with generators that follow the voltage; what they
/// deliver is left in the network.
///
/// Ends with [`Status::CurvesMove`] where their curves do not come to rest.
pub fn solve_operating(network: &mut Network, settings: &Settings) -> Solution {
    let following: Vec<usize> =
        (0..network.generators.len()).filter(|&i| network.generators[i].follows_voltage()).collect();
    if following.is_empty() {
        return solve_running(network, settings);
    }
    let mut past: Vec<(DVector<f64>, DVector<f64>)> = Vec::new();
    let mut solution = solve_running(network, settings);
    if solution.status != Status::Converged {
        // Full output may be more than the feeder takes, and the curves hold it back: begin with none.
        for &i in &following {
            network.generators[i].delivering = Complex64::default();
        }
        solution = solve_running(network, settings);
    }
    for _ in 0..ROUNDS {
        if solution.status != Status::Converged {
            // The step went too far: half of it.
            let Some((last, _)) = past.last() else { return solution };
            for (k, &i) in following.iter().enumerate() {
                let generator = &mut network.generators[i];
                let good = Complex64::new(last[2 * k], last[2 * k + 1]) * scale(generator);
                generator.delivering = (generator.delivering + good) / 2.0;
            }
            solution = solve_running(network, settings);
            continue;
        }
        let (x, f) = outputs(network, &solution, &following);
        if f.amax() < SETTLED {
            return solution;
        }
        let next = next(&x, &f, &past);
        past.push((x, f));
        if past.len() > DEPTH {
            past.remove(0);
        }
        for (k, &i) in following.iter().enumerate() {
            let generator = &mut network.generators[i];
            generator.delivering = Complex64::new(next[2 * k], next[2 * k + 1]) * scale(generator);
        }
        solution = solve_running(network, settings);
    }
    Solution { status: Status::CurvesMove, ..solution }
}

fn scale(generator: &Generator) -> f64 {
    if generator.rated_va.is_finite() { generator.rated_va } else { generator.watts.max(1.0) }
}

/// Present outputs, and by how much the curves want them changed, shares of the ratings.
fn outputs(network: &Network, solution: &Solution, following: &[usize]) -> (DVector<f64>, DVector<f64>) {
    let (mut x, mut f) = (DVector::zeros(2 * following.len()), DVector::zeros(2 * following.len()));
    for (k, &i) in following.iter().enumerate() {
        let generator = &network.generators[i];
        let wanted = generator.output(generator_pu(network, solution, generator)).power;
        let (own, off) = (generator.delivering, wanted - generator.delivering);
        for (part, (a, b)) in [(own.re, off.re), (own.im, off.im)].into_iter().enumerate() {
            x[2 * k + part] = a / scale(generator);
            f[2 * k + part] = b / scale(generator);
        }
    }
    (x, f)
}

/// The next outputs: a step along the difference that is left when past differences are combined.
fn next(x: &DVector<f64>, f: &DVector<f64>, past: &[(DVector<f64>, DVector<f64>)]) -> DVector<f64> {
    let plain = x + f * STEP;
    if past.is_empty() {
        return plain;
    }
    let columns = past.len();
    let df = DMatrix::from_fn(f.len(), columns, |i, j| f[i] - past[j].1[i]);
    let dx = DMatrix::from_fn(f.len(), columns, |i, j| x[i] - past[j].0[i]);
    match df.clone().svd(true, true).solve(f, 1e-12 * df.norm()) {
        Ok(weights) => x - &dx * &weights + (f - &df * &weights) * STEP,
        Err(_) => plain,
    }
}
