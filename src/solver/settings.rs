//! When an iteration counts as converged, and when it is given up.

use super::residual::Residual;
use super::solution::Solution;
use crate::network::Network;

/// Stop tests of the iteration.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Largest change of any node voltage in one iteration, per unit of nominal.
    pub voltage_tolerance_pu: f64,
    /// Largest current mismatch at any node, amperes, ...
    pub current_tolerance_amps: f64,
    /// ... or, where greater, this share of the feeder current.
    pub current_tolerance_share: f64,
    /// Iterations after which the solve is given up.
    pub iteration_limit: usize,
}

impl Default for Settings {
    fn default() -> Self {
        Settings {
            voltage_tolerance_pu: 1e-9,
            current_tolerance_amps: 1e-6,
            current_tolerance_share: 1e-9,
            iteration_limit: 500,
        }
    }
}

impl Settings {
    /// Whether the mismatches that the independent check found of a solution are small enough.
    pub(super) fn allow(&self, check: &Residual, solution: &Solution, network: &Network) -> bool {
        let feeder = solution.source_amps.iter().map(|i| i.norm()).fold(0.0, f64::max);
        check.amps <= self.current_tolerance_amps.max(self.current_tolerance_share * feeder)
            && check.volts <= self.voltage_tolerance_pu * network.supply.nominal_volts
    }
}
