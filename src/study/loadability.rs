//! How far all loads can grow together until the feeder has no solution, and where it gives way.

use crate::network::{Network, NodeId};
use crate::solver::{Path, Settings, Solution, Status, solve_operating};

/// Factors are told apart down to this share.
const RESOLUTION: f64 = 1e-3;
/// Solves that are expected while the limit is not enclosed yet.
const FIRST_GUESS: u32 = 13;
/// Growth beyond this is not looked for.
const MOST: f64 = 1000.0;

/// Result of [`loadability`].
#[derive(Debug, Clone, PartialEq, serde::Serialize)]
pub struct Loadability {
    /// Largest factor on all loads with a solution; `None` where none is found up to the highest tried.
    pub factor: Option<f64>,
    /// Largest factor that was solved.
    pub solved_factor: f64,
    /// Name of the node whose voltage falls fastest with load at that factor.
    pub weakest_node: Option<String>,
    /// Lowest voltage of that node's phases at that factor, per unit.
    pub weakest_pu: Option<f64>,
}

/// Grows all loads by one factor and finds, by bisection to 0.1 %, the largest with a solution.
///
/// Loads alone are scaled: generators deliver as before, and as their curves ask. Constant-power loads stay constant power at any voltage here (the floor of the study is left
/// out): it is their demand that a feeder cannot meet. A factor counts as solved only where the
/// solve passes both convergence tests. A network that has no solution as it stands gives a
/// factor below 1.
pub fn loadability(network: &Network, settings: &Settings) -> Loadability {
    loadability_with(network, settings, |_| {})
}

/// How far a search has come.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Progress {
    /// Solves done so far.
    pub solved: u32,
    /// Solves expected in all; settles once the limit is enclosed.
    pub expected: u32,
    /// Factor that is solved next.
    pub factor: f64,
}

/// [`loadability`], telling before each solve how far it has come.
pub fn loadability_with(
    network: &Network,
    settings: &Settings,
    mut tell: impl FnMut(Progress),
) -> Loadability {
    let mut solved_so_far = 0;
    let mut attempt = |factor: f64, left: u32| {
        tell(Progress { solved: solved_so_far, expected: solved_so_far + left, factor });
        solved_so_far += 1;
        let mut grown = grown(network, factor);
        let solution = solve_operating(&mut grown, settings);
        let good = solution.status == Status::Converged && !matches!(solution.path, Path::Folds { .. });
        good.then_some(solution)
    };
    let (mut low, mut high, mut solved) = (0.0, None, None);
    let mut factor = 1.0;
    while high.is_none() && factor <= MOST {
        match attempt(factor, FIRST_GUESS) {
            Some(solution) => (low, solved) = (factor, Some(solution)),
            None => high = Some(factor),
        }
        factor *= 2.0;
    }
    let Some(mut high) = high else {
        return Loadability { factor: None, solved_factor: low, weakest_node: None, weakest_pu: None };
    };
    while high - low > RESOLUTION * high && high > 1e-6 {
        let middle = 0.5 * (low + high);
        let left = ((high - low) / (RESOLUTION * high)).log2().ceil().max(1.0) as u32 + 1;
        match attempt(middle, left) {
            Some(solution) => (low, solved) = (middle, Some(solution)),
            None => high = middle,
        }
    }
    let weakest = solved.and_then(|at_limit| {
        let before = attempt(low * 0.99, 1)?;
        weakest(network, &before, &at_limit)
    });
    Loadability {
        factor: Some(low),
        solved_factor: low,
        weakest_node: weakest.map(|(id, _)| network.node(id).name.to_string()),
        weakest_pu: weakest.map(|(_, pu)| pu),
    }
}

/// The network with every load multiplied and the floor of constant power taken away.
fn grown(network: &Network, factor: f64) -> Network {
    let mut grown = network.clone();
    grown.study.constant_power_floor_percent = 0.0;
    for load in &mut grown.loads {
        load.watts *= factor;
        load.vars *= factor;
    }
    grown
}

/// The node whose voltage fell most between two solutions, with its lowest phase voltage in the second.
fn weakest(network: &Network, before: &Solution, after: &Solution) -> Option<(NodeId, f64)> {
    let mut found: Option<(NodeId, f64, f64)> = None;
    for &id in &network.order {
        let node = network.node(id);
        for c in node.conductors.phases().iter() {
            let pu = |s: &Solution| s.volts[id.index()][c.slot()].norm() / node.nominal_phase_volts();
            let fall = pu(before) - pu(after);
            if found.is_none_or(|(_, most, _)| fall > most) {
                found = Some((id, fall, pu(after)));
            }
        }
    }
    found.map(|(id, _, pu)| (id, pu))
}
