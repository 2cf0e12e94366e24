//! One solve of the engine against general-purpose sparse LU, in one run: `cargo bench --bench solve`.
//!
//! LU: the nodal admittance matrix of every conductor but the source's, factored once; then load
//! currents from the present voltages and a solve in place, with the same stop test from the same
//! start. Both on one thread, in turn, the best of several repeats.
#![allow(clippy::print_stdout, clippy::print_stderr)]

#[path = "../tests/support/feeder.rs"]
mod feeder;
#[path = "solve/limits.rs"]
mod limits;
#[path = "solve/sparse.rs"]
mod sparse;

use std::hint::black_box;
use std::time::Instant;

use fourwire::math::Complex64;
use fourwire::network::{Network, build};
use fourwire::solver::{Settings, Status, Workspace, solve};

use sparse::Sparse;

const TOLERANCE_PU: f64 = 1e-9;
const LIMIT: usize = 200;

/// Best times of one method, seconds.
#[derive(Clone, Copy)]
struct Best {
    set_up: f64,
    iterate: f64,
    iterations: usize,
}

impl Best {
    fn none() -> Best {
        Best { set_up: f64::INFINITY, iterate: f64::INFINITY, iterations: 0 }
    }

    fn take(&mut self, set_up: f64, iterate: f64, iterations: usize) {
        self.set_up = self.set_up.min(set_up);
        self.iterate = self.iterate.min(iterate);
        self.iterations = iterations;
    }
}

fn seconds<T>(work: impl FnOnce() -> T) -> (T, f64) {
    let start = Instant::now();
    let result = work();
    (result, start.elapsed().as_secs_f64())
}

/// Both methods in turn, so many times.
fn compare(network: &Network, repeats: usize) -> (Best, Best, Agreement) {
    let (mut engine, mut lu) = (Best::none(), Best::none());
    let mut agreement = Agreement { difference: f64::NAN, lowest_pu: f64::NAN };
    for repeat in 0..repeats {
        let (mut workspace, set_up) = seconds(|| Workspace::new(network).expect("a regular network"));
        let (done, iterate) = seconds(|| {
            workspace.start_flat();
            workspace.iterate(TOLERANCE_PU, LIMIT)
        });
        engine.take(set_up, iterate, done.count);
        black_box(&workspace);

        let (mut sparse, set_up) = seconds(|| Sparse::new(network));
        let (iterations, iterate) = seconds(|| sparse.iterate(TOLERANCE_PU, LIMIT));
        lu.take(set_up, iterate, iterations);
        if repeat == 0 {
            agreement = agree(network, sparse.volts());
        }
    }
    (engine, lu, agreement)
}

/// How far the two methods agree, and the lowest phase voltage, per unit.
struct Agreement {
    difference: f64,
    lowest_pu: f64,
}

fn agree(network: &Network, other: &[Complex64]) -> Agreement {
    let solution = solve(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    let nominal = network.supply.nominal_volts / 3f64.sqrt();
    let mine = solution.volts.iter().skip(1).flat_map(|v| v.iter().copied().collect::<Vec<_>>());
    let difference = mine.zip(other).map(|(a, b)| (a - b).norm() / nominal).fold(0.0, f64::max);
    let phases = solution.volts.iter().flat_map(|v| [v[0] - v[3], v[1] - v[3], v[2] - v[3]]);
    Agreement { difference, lowest_pu: phases.map(|v| v.norm() / nominal).fold(f64::INFINITY, f64::min) }
}

fn main() {
    println!("One solve, four-wire feeder, one thread; times are the best of several repeats.\n");
    println!(
        "            lowest     iterations    ns a node, iteration     ratio on    ratio with     greatest"
    );
    println!(
        "   nodes   voltage   engine    LU       engine       LU     iterations       set-up   difference"
    );
    let mut largest = None;
    for nodes in [100, 1_000, 10_000, 100_000] {
        let network = build(&feeder::feeder(nodes)).network.expect("a good feeder");
        let (engine, lu, agreement) = compare(&network, (300_000 / nodes).clamp(5, 300));
        let each = |best: Best| best.iterate * 1e9 / (best.iterations * nodes) as f64;
        println!(
            "{nodes:>8} {:>9.3} {:>8} {:>5} {:>12.1} {:>8.1} {:>14.1} {:>12.1} {:>12.1e}",
            agreement.lowest_pu,
            engine.iterations,
            lu.iterations,
            each(engine),
            each(lu),
            each(lu) / each(engine),
            (lu.set_up + lu.iterate) / (engine.set_up + engine.iterate),
            agreement.difference,
        );
        assert!(agreement.difference < 1e-8, "the methods disagree by {} per unit", agreement.difference);
        largest = Some(each(engine));
    }
    let cached = build(&feeder::feeder(1_000)).network.expect("a good feeder");
    let (small, _, _) = compare(&cached, 100);
    limits::report(small.iterate * 1e9 / (small.iterations * 1_000) as f64, largest.unwrap_or(f64::NAN));
}
