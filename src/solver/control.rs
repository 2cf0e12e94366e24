//! Taps of automatic regulators: an outer loop around the solve.
//!
//! Each unit looks at its relay voltage, `|(V_k - V_m)/PT - (R + jX) I_k/CT|` (voltage across it
//! on the regulated side over the potential-transformer ratio, less the line-drop compensator's
//! drop at the line current), and steps until it lies within half the band of the set point.
//! Banks nearer the source settle first, as their shorter delay makes them do.

use super::motors::solve_running;
use super::settings::Settings;
use super::solution::{Solution, Status};
use crate::math::{Complex64, ZERO};
use crate::network::{Across, BranchId, BranchKind, Conductor, End, Network, RegulatorUnit, TapMode};

/// Reversals of a unit's direction after which it is taken to hunt.
const REVERSALS: usize = 3;

/// How an automatic unit ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TapState {
    /// Within its band.
    Settled,
    /// At the end of its range and still outside its band.
    AtLimit,
    /// It stepped to and fro: one step is wider than the band, or it works against another.
    Hunting,
    /// Fed at its regulated side: it stays where it is.
    Reversed,
}

/// An automatic unit after control.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RegulatedUnit {
    /// Branch of its bank.
    pub branch: BranchId,
    /// Index of the unit in its bank.
    pub unit: usize,
    /// How it ended.
    pub state: TapState,
    /// Voltage at its relay, volts.
    pub relay_volts: f64,
}

/// Solves a network with its automatic regulators: their taps are left where they settle.
///
/// The taps found are in the network afterwards; the second value tells how each automatic unit
/// ended. Where a solve does not converge the loop stops there.
pub fn solve_regulated(network: &mut Network, settings: &Settings) -> (Solution, Vec<RegulatedUnit>) {
    let mut units = automatic_units(network);
    let mut solution = solve_running(network, settings);
    while solution.status == Status::Converged && step(network, &solution, &mut units) {
        solution = solve_running(network, settings);
    }
    let ended = units
        .iter()
        .map(|u| {
            let relay_volts = relay_volts(network, &solution, u);
            let within = u.state == TapState::AtLimit && wanted_steps(network, &solution, u) == 0;
            let state = if within { TapState::Settled } else { u.state };
            RegulatedUnit { branch: u.branch, unit: u.unit, state, relay_volts }
        })
        .collect();
    (solution, ended)
}

/// A unit while the loop runs.
struct Moving {
    branch: BranchId,
    unit: usize,
    /// Indices of the automatic units between it and the source.
    upstream: Vec<usize>,
    state: TapState,
    last: i32,
    reversals: usize,
}

fn automatic_units(network: &Network) -> Vec<Moving> {
    let mut units = Vec::new();
    for &node in &network.order {
        let Some(feed) = network.feeds[node.index()] else { continue };
        let BranchKind::Regulator(bank) = &network.branch(feed.branch).kind else { continue };
        let above: Vec<usize> = upstream_units(network, feed.parent, &units);
        for (unit, _) in bank.units.iter().enumerate().filter(|(_, u)| u.mode == TapMode::Automatic) {
            let state = if feed.upstream == End::To { TapState::Reversed } else { TapState::Settled };
            let upstream = above.clone();
            units.push(Moving { branch: feed.branch, unit, upstream, state, last: 0, reversals: 0 });
        }
    }
    units
}

fn upstream_units(network: &Network, mut node: crate::network::NodeId, units: &[Moving]) -> Vec<usize> {
    let mut found = Vec::new();
    while let Some(feed) = network.feeds[node.index()] {
        found.extend(units.iter().enumerate().filter(|(_, u)| u.branch == feed.branch).map(|(i, _)| i));
        node = feed.parent;
    }
    found
}

/// Moves every unit that is outside its band and has none upstream that moves; false where none does.
fn step(network: &mut Network, solution: &Solution, units: &mut [Moving]) -> bool {
    let wanted: Vec<i32> = units.iter().map(|u| wanted_steps(network, solution, u)).collect();
    let mut moved = false;
    for i in 0..units.len() {
        if wanted[i] == 0
            || units[i].upstream.iter().any(|&above| wanted[above] != 0 && can_move(&units[above]))
        {
            continue;
        }
        moved |= move_unit(network, &mut units[i], wanted[i]);
    }
    moved
}

fn can_move(unit: &Moving) -> bool {
    unit.state == TapState::Settled
}

fn move_unit(network: &mut Network, moving: &mut Moving, steps: i32) -> bool {
    if !can_move(moving) {
        return false;
    }
    let Some(unit) = unit_mut(network, moving.branch, moving.unit) else { return false };
    let range = i32::try_from(unit.steps).unwrap_or(i32::MAX);
    let tap = (unit.tap + steps).clamp(-range, range);
    if tap == unit.tap {
        moving.state = TapState::AtLimit;
        return false;
    }
    if moving.last.signum() * steps.signum() < 0 {
        moving.reversals += 1;
        if moving.reversals > REVERSALS {
            moving.state = TapState::Hunting;
            return false;
        }
    }
    moving.last = steps;
    unit.tap = tap;
    true
}

/// Steps that bring the relay from outside its band to the set point; 0 within it.
///
/// Several taps may lie within the band. As when the steps are counted by hand, a step is taken
/// as its share of the relay's rated voltage (0.75 V for 5/8 % of 120 V); what that leaves is
/// mended in the next round.
fn wanted_steps(network: &Network, solution: &Solution, moving: &Moving) -> i32 {
    let Some(unit) = unit_of(network, moving.branch, moving.unit) else { return 0 };
    let (Some(set), Some(band)) = (unit.control.set_volts, unit.control.band_volts) else { return 0 };
    let short = set - relay_volts(network, solution, moving);
    if short.abs() <= band / 2.0 || moving.state == TapState::Reversed {
        return 0;
    }
    let steps = (short.abs() / (unit.step_pu * relay_rating(set))).round().clamp(1.0, 1000.0) as i32;
    if short > 0.0 { steps } else { -steps }
}

/// Rated secondary voltage of the potential transformer: the standard one nearest the set point
/// (100 and 110 V, IEC 61869-3; 115 and 120 V, IEEE C57.13; from memory).
fn relay_rating(set_volts: f64) -> f64 {
    let nearer = |a: &f64, b: &f64| (a - set_volts).abs().total_cmp(&(b - set_volts).abs());
    [100.0, 110.0, 115.0, 120.0].into_iter().min_by(nearer).unwrap_or(set_volts)
}

fn relay_volts(network: &Network, solution: &Solution, moving: &Moving) -> f64 {
    let branch = network.branch(moving.branch);
    let Some(unit) = unit_of(network, moving.branch, moving.unit) else { return 0.0 };
    let volts = &solution.volts[branch.to.index()];
    let base = match unit.across {
        Across::Phase(m) => volts[m.slot()],
        Across::Neutral if branch.to_conductors.has_neutral() => volts[Conductor::N.slot()],
        Across::Neutral => ZERO,
    };
    let k = unit.phase.slot();
    let control = &unit.control;
    let compensator = match control.ct_amps {
        Some(rated) => {
            Complex64::new(control.r_volts, control.x_volts) * solution.to_amps[moving.branch.index()][k]
                / rated
        }
        None => ZERO,
    };
    ((volts[k] - base) / control.pt_ratio.unwrap_or(1.0) - compensator).norm()
}

fn unit_of(network: &Network, branch: BranchId, unit: usize) -> Option<&RegulatorUnit> {
    match &network.branch(branch).kind {
        BranchKind::Regulator(bank) => bank.units.get(unit),
        _ => None,
    }
}

fn unit_mut(network: &mut Network, branch: BranchId, unit: usize) -> Option<&mut RegulatorUnit> {
    match &mut network.branches[branch.index()].kind {
        BranchKind::Regulator(bank) => bank.units.get_mut(unit),
        _ => None,
    }
}
