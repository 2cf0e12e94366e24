//! Running motors: the slip of each at which its torque meets its load, found around the solve.
//!
//! At a slip a motor is an admittance, which the sweep takes exactly; the voltages it then sees give
//! the slip at which it would run, and so on until none changes.

use super::settings::Settings;
use super::solution::{Solution, Status};
use super::solve;
use crate::machine::running_slip;
use crate::network::{MotorState, Network};

/// Rounds after which the slips are given up.
const ROUNDS: usize = 200;
/// Change of slip, share of slip, below which it is settled.
const SETTLED: f64 = 1e-10;

/// Solves a network with its running motors: their slips are left where torque meets load.
///
/// Ends with [`Status::Stalls`] where a motor cannot carry its load.
pub fn solve_running(network: &mut Network, settings: &Settings) -> Solution {
    let mut solution = solve(network, settings);
    if network.motors.iter().all(|m| m.state == MotorState::Off) {
        return solution;
    }
    for _ in 0..ROUNDS {
        if solution.status != Status::Converged {
            return solution;
        }
        let mut change = 0.0f64;
        for (i, motor) in network.motors.iter_mut().enumerate() {
            if motor.state == MotorState::Off {
                continue;
            }
            let v = &solution.volts[motor.node.index()];
            match running_slip(&motor.machine, &[v[0], v[1], v[2]]) {
                Ok(slip) => {
                    change = change.max(((slip - motor.slip) / slip.abs().max(1e-6)).abs());
                    motor.slip = slip;
                }
                Err(_) => return Solution { status: Status::Stalls(i), ..solution },
            }
        }
        solution = solve(network, settings);
        if change < SETTLED {
            return solution;
        }
    }
    Solution { status: Status::IterationLimit, ..solution }
}
