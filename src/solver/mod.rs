//! Solves a [`crate::network::Network`]: voltages and currents of every conductor.

mod settings;
mod solution;

pub use settings::Settings;
pub use solution::{Solution, Status};

use crate::network::Network;

/// Solves the network from a flat start.
///
/// Never fails: look at [`Solution::status`] before using a number of it.
pub fn solve(network: &Network, settings: &Settings) -> Solution {
    let _ = settings;
    Solution::unsolved(network)
}
