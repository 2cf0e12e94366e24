//! What is said instead of results where there is no solution: where, how far off, what to look at.

use crate::network::Network;
use crate::output::table::folded;
use crate::solver::{Path, Solution, Status};

/// The message for a solution that did not converge, without any voltage; empty for one that did.
pub fn no_solution_text(network: &Network, solution: &Solution) -> String {
    let limit = "load beyond what the feeder can carry (a load in kW that was meant in W), \
                 a length or impedance in the wrong unit, a missing transformer";
    let place = &network.node(solution.worst_node).name;
    let count = solution.iterations;
    let (why, look) = match solution.status {
        Status::BeyondLoadability => (beyond(solution), limit),
        Status::Converged => return String::new(),
        Status::CurvesMove => (
            "generators that follow the voltage do not come to rest".to_string(),
            "the steepest of the curves in curves.csv, and several generators near each other on steep ones",
        ),
        Status::Stalls(motor) => (
            network.motors.get(motor).map_or(String::new(), |m| {
                let v = &solution.volts[m.node.index()];
                let low = (0..3).map(|k| v[k].norm()).fold(f64::INFINITY, f64::min);
                format!(
                    "motor {} at node {} cannot carry its load: its lowest phase gets {:.1} % of nominal voltage",
                    m.name,
                    network.node(m.node).name,
                    100.0 * low / network.node(m.node).nominal_phase_volts()
                )
            }),
            "its load_percent and plate, the voltage on the way to it, other motors that draw there",
        ),
        Status::Singular(node) => (
            format!("the linear part of the network has no solution at node {}", network.node(node).name),
            "a side without any path to earth there, or a capacitor and a reactance that cancel",
        ),
        Status::Diverged => (format!("the iteration grew beyond all bounds after {count} iterations"), limit),
        Status::IterationLimit => (format!("the voltages have not settled after {count} iterations"), limit),
    };
    let at = network.at.as_ref().map_or(String::new(), |time| format!("at {time}: "));
    let mut text = folded("", &format!("error[no-solution]: {at}{why}."));
    if !matches!(solution.status, Status::Singular(_) | Status::Stalls(_)) {
        let far = format!(
            "Worst at node {place}: last change {}, current mismatch {}.",
            amount(solution.change_pu, "of nominal"),
            amount(solution.mismatch_amps, "A")
        );
        text.push_str(&folded("  ", &far));
    }
    text.push_str(&folded("  ", &format!("Look at: {look}.")));
    text.push_str("  No results are shown, since none are good.\n");
    text
}

/// How far the loads could be followed.
fn beyond(solution: &Solution) -> String {
    match solution.path {
        Path::Folds { share } if share > 0.0 => format!(
            "raised from nothing, the loads have a solution up to {:.1} % of what is given, and none beyond",
            100.0 * share
        ),
        _ => format!(
            "no share of the loads has a solution; the voltages have not settled after {} iterations",
            solution.iterations
        ),
    }
}

/// A number with its unit, or words for one that is none.
fn amount(value: f64, unit: &str) -> String {
    if value.is_finite() && value < f64::MAX {
        format!("{value:.1e} {unit}")
    } else {
        "beyond all bounds".to_string()
    }
}
