//! Taps of automatic regulators and switched capacitors: an outer loop around the solve.
//!
//! Each unit looks at its relay voltage, `|(V_k - V_m)/PT - (R + jX) I_k/CT|` (voltage across it
//! on the regulated side over the potential-transformer ratio, less the line-drop compensator's
//! drop at the line current), and steps until it lies within half the band of the set point.
//!
//! The order is that of the delays: banks nearer the source settle first; then, with all
//! regulators at rest, one capacitor switches (shortest delay first); then the regulators settle
//! anew. What goes to and fro without end is stopped and told as hunting.

use super::generators::solve_operating;
use super::relay::{PowerFlow, Seen, look, unit_of};
use super::settings::Settings;
use super::solution::{Solution, Status};
use super::switching::{SwitchedCapacitor, Switching, switch_one, switched};
use crate::network::{BranchId, BranchKind, End, Name, Network, NodeId, RegulatorUnit, ReverseFlow, TapMode};

/// Reversals of a unit's direction after which it is taken to hunt.
const REVERSALS: usize = 3;
/// Solves after which whatever still moves is taken to hunt.
const ROUNDS: usize = 500;
/// Voltages at the relay nearer than this are one, volts.
const SAME_VOLTS: f64 = 1e-9;

/// How an automatic unit ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TapState {
    /// Within its band.
    Settled,
    /// At the end of its range and still outside its band.
    AtLimit,
    /// Below its band: one step more would lift its own terminals beyond the first customer's limit.
    VoltageLimit,
    /// It stepped to and fro: one step is wider than the band, or it works against another.
    Hunting,
    /// Power flows backwards: it stays where it is.
    Reversed,
    /// Power flows backwards: it stands at neutral.
    ReversedNeutral,
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
    /// Voltage at its relay, volts; of the source side where it regulates that.
    pub relay_volts: f64,
    /// Voltage at the terminals of its regulated side, volts over the ratio of its potential transformer.
    pub terminal_volts: f64,
    /// Which way power flows through it.
    pub flow: PowerFlow,
}

/// How all controls ended.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Controls {
    /// Automatic regulator units; those that follow another in a gang are not among them.
    pub units: Vec<RegulatedUnit>,
    /// Switched capacitors.
    pub capacitors: Vec<SwitchedCapacitor>,
}

/// Solves a network with its automatic regulators: [`solve_controlled`] without the capacitors' story.
pub fn solve_regulated(network: &mut Network, settings: &Settings) -> (Solution, Vec<RegulatedUnit>) {
    let (solution, controls) = solve_controlled(network, settings);
    (solution, controls.units)
}

/// Solves a network with its automatic regulators and switched capacitors.
///
/// The taps and states found are in the network afterwards; the second value tells how each control
/// ended. Where a solve does not converge the loop stops there.
pub fn solve_controlled(network: &mut Network, settings: &Settings) -> (Solution, Controls) {
    let mut units = automatic_units(network);
    let mut capacitors = switched(network);
    let mut solution = solve_operating(network, settings);
    let mut spent = Spent::No;
    for round in 0.. {
        if solution.status != Status::Converged {
            break;
        }
        if round == ROUNDS {
            spent = Spent::Yes;
            break;
        }
        if !advance(network, &solution, &mut units, &mut capacitors) {
            break;
        }
        solution = solve_operating(network, settings);
    }
    let ended = Controls {
        units: units.iter().filter_map(|u| ended(network, &solution, u, spent)).collect(),
        capacitors: capacitors.iter().map(|c| c.ended(network, &solution)).collect(),
    };
    (solution, ended)
}

/// Whether the rounds were used up.
#[derive(Clone, Copy, PartialEq)]
enum Spent {
    No,
    Yes,
}

/// One round: regulators, or with all of them at rest one capacitor. False where nothing moves.
fn advance(
    network: &mut Network,
    solution: &Solution,
    units: &mut [Moving],
    capacitors: &mut [Switching],
) -> bool {
    let moved = step(network, solution, units);
    for name in &moved {
        capacitors.iter_mut().for_each(|c| c.note(name));
    }
    if !moved.is_empty() {
        return true;
    }
    if switch_one(network, solution, capacitors).is_none() {
        return false;
    }
    // Another network now: what the units did before says nothing about them.
    for unit in units.iter_mut().filter(|u| !u.hunts) {
        (unit.last, unit.reversals, unit.ceiling) = (0, 0, None);
    }
    true
}

/// A unit while the loop runs.
struct Moving {
    branch: BranchId,
    unit: usize,
    fed_at: End,
    /// Indices of the automatic units between it and the source.
    upstream: Vec<usize>,
    hunts: bool,
    last: i32,
    last_flow: Option<PowerFlow>,
    reversals: usize,
    /// Highest tap that was not found to lift the terminals beyond the limit.
    ceiling: Option<i32>,
}

fn automatic_units(network: &Network) -> Vec<Moving> {
    let mut units = Vec::new();
    for &node in &network.order {
        let Some(feed) = network.feeds[node.index()] else { continue };
        add_bank(network, feed.branch, feed.parent, feed.upstream, &mut units);
    }
    for tie in &network.ties {
        add_bank(network, tie.branch, tie.near, tie.upstream, &mut units);
    }
    units
}

fn add_bank(network: &Network, branch: BranchId, parent: NodeId, fed_at: End, units: &mut Vec<Moving>) {
    let BranchKind::Regulator(bank) = &network.branch(branch).kind else { return };
    let upstream = upstream_units(network, parent, units);
    for (unit, _) in bank.units.iter().enumerate().filter(|(_, u)| u.mode == TapMode::Automatic) {
        units.push(Moving {
            branch,
            unit,
            fed_at,
            upstream: upstream.clone(),
            hunts: false,
            last: 0,
            last_flow: None,
            reversals: 0,
            ceiling: None,
        });
    }
}

fn upstream_units(network: &Network, mut node: NodeId, units: &[Moving]) -> Vec<usize> {
    let mut found = Vec::new();
    while let Some(feed) = network.feeds[node.index()] {
        found.extend(units.iter().enumerate().filter(|(_, u)| u.branch == feed.branch).map(|(i, _)| i));
        node = feed.parent;
    }
    found
}

/// Moves every unit that asks to move and has none upstream that does; the names of those moved.
fn step(network: &mut Network, solution: &Solution, units: &mut [Moving]) -> Vec<Name> {
    let plans: Vec<Option<Plan>> = units.iter().map(|u| plan(network, solution, u)).collect();
    let mut moved = Vec::new();
    for (i, plan) in plans.iter().enumerate() {
        let Some(plan) = plan else { continue };
        if units[i].upstream.iter().any(|&above| plans[above].is_some()) {
            continue;
        }
        if !move_unit(network, &mut units[i], plan) {
            continue;
        }
        moved.extend(unit_of(network, units[i].branch, units[i].unit).map(|u| u.name.clone()));
        for below in units.iter_mut().filter(|u| u.upstream.contains(&i)) {
            below.ceiling = None;
        }
    }
    moved
}

/// Where a unit asks to go.
struct Plan {
    tap: i32,
    flow: PowerFlow,
    /// The highest tap allowed from now on.
    ceiling: Option<i32>,
}

/// The tap a unit asks for; `None` where it stays.
fn plan(network: &Network, solution: &Solution, moving: &Moving) -> Option<Plan> {
    if moving.hunts {
        return None;
    }
    let unit = unit_of(network, moving.branch, moving.unit)?;
    let seen = look(network, solution, moving.branch, unit, moving.fed_at);
    let range = i32::try_from(unit.steps).unwrap_or(i32::MAX);
    let mut ceiling = moving.ceiling;
    let tap = match wish(unit, &seen) {
        Wish::Stay => return None,
        Wish::Neutral => 0,
        Wish::Steps(steps) => {
            let steps = damped(steps, moving.last);
            let room = room(unit, &seen);
            if room < 0 {
                ceiling = Some(unit.tap - 1);
            }
            let highest = ceiling.map_or(range, |c| c.min(range));
            (unit.tap + steps.min(room)).min(highest).clamp(-range, range)
        }
    };
    (tap != unit.tap).then_some(Plan { tap, flow: seen.flow, ceiling })
}

/// After a turn at most half the steps made last: with units that work on each other (a closed
/// delta) whole steps would overshoot again and again.
fn damped(steps: i32, last: i32) -> i32 {
    if last.signum() * steps.signum() < 0 {
        let most = (last.abs() / 2).max(1);
        steps.clamp(-most, most)
    } else {
        steps
    }
}

/// What a control asks for.
enum Wish {
    Stay,
    Neutral,
    Steps(i32),
}

fn wish(unit: &RegulatorUnit, seen: &Seen) -> Wish {
    let (Some(set), Some(band)) = (unit.control.set_volts, unit.control.band_volts) else {
        return Wish::Stay;
    };
    let steps = match (seen.flow, unit.control.reverse) {
        (PowerFlow::Backward, ReverseFlow::Hold) => return Wish::Stay,
        (PowerFlow::Backward, ReverseFlow::Neutral) => return Wish::Neutral,
        // Fed from its `to` side, a raised tap lowers the voltage of the other.
        (PowerFlow::Backward, ReverseFlow::Regulate { set_volts }) => {
            -steps_to(unit, set_volts, band, seen.source_side)
        }
        _ => steps_to(unit, set, band, seen.relay),
    };
    if steps == 0 && room(unit, seen) >= 0 { Wish::Stay } else { Wish::Steps(steps) }
}

/// Steps that bring the relay from outside its band to the set point; 0 within it.
///
/// Several taps may lie within the band. As when the steps are counted by hand, a step is taken
/// as its share of the relay's rated voltage (0.75 V for 5/8 % of 120 V); what that leaves is
/// mended in the next round.
fn steps_to(unit: &RegulatorUnit, set: f64, band: f64, volts: f64) -> i32 {
    let short = set - volts;
    if short.abs() <= band / 2.0 + SAME_VOLTS {
        return 0;
    }
    let steps = (short.abs() / (unit.step_pu * relay_rating(set))).round().clamp(1.0, 1000.0) as i32;
    if short > 0.0 { steps } else { -steps }
}

/// Steps that the terminals may still rise below the first customer's limit; negative beyond it.
fn room(unit: &RegulatorUnit, seen: &Seen) -> i32 {
    let Some(limit) = unit.control.limit_volts else { return i32::MAX / 2 };
    let a_step = unit.step_pu * seen.terminals / unit.ratio().abs().max(1e-3);
    if a_step <= 0.0 || seen.flow == PowerFlow::Backward && unit.control.reverse != ReverseFlow::Ignore {
        return i32::MAX / 2;
    }
    ((limit - seen.terminals + SAME_VOLTS) / a_step).floor().clamp(-1000.0, 1000.0) as i32
}

fn move_unit(network: &mut Network, moving: &mut Moving, plan: &Plan) -> bool {
    let Some(unit) = unit_mut(network, moving.branch, moving.unit) else { return false };
    let steps = plan.tap - unit.tap;
    let turned = moving.last.signum() * steps.signum() < 0 && steps.abs() == 1;
    let flow_turned = moving.last_flow.is_some_and(|flow| flow != plan.flow);
    if turned || flow_turned {
        moving.reversals += 1;
        if moving.reversals > REVERSALS {
            moving.hunts = true;
            return false;
        }
    }
    (moving.last, moving.last_flow, moving.ceiling) = (steps, Some(plan.flow), plan.ceiling);
    let (tap, phase) = (plan.tap, unit.phase);
    if let BranchKind::Regulator(bank) = &mut network.branches[moving.branch.index()].kind {
        let gang = |u: &&mut RegulatorUnit| u.phase == phase || u.mode == TapMode::Follows(phase);
        bank.units.iter_mut().filter(gang).for_each(|u| u.tap = tap);
    }
    true
}

fn ended(network: &Network, solution: &Solution, moving: &Moving, spent: Spent) -> Option<RegulatedUnit> {
    let unit = unit_of(network, moving.branch, moving.unit)?;
    let seen = look(network, solution, moving.branch, unit, moving.fed_at);
    let regulates_back = matches!(unit.control.reverse, ReverseFlow::Regulate { .. });
    let backward = seen.flow == PowerFlow::Backward;
    let still_asks = spent == Spent::Yes && plan(network, solution, moving).is_some();
    let state = if moving.hunts || still_asks {
        TapState::Hunting
    } else {
        match (backward, unit.control.reverse, wish(unit, &seen)) {
            (true, ReverseFlow::Hold, _) => TapState::Reversed,
            (true, ReverseFlow::Neutral, _) => TapState::ReversedNeutral,
            (_, _, Wish::Steps(steps)) if steps > 0 && stopped_by_limit(unit, &seen, moving) => {
                TapState::VoltageLimit
            }
            (_, _, Wish::Steps(_)) => TapState::AtLimit,
            _ => TapState::Settled,
        }
    };
    Some(RegulatedUnit {
        branch: moving.branch,
        unit: moving.unit,
        state,
        relay_volts: if backward && regulates_back { seen.source_side } else { seen.relay },
        terminal_volts: seen.terminals,
        flow: seen.flow,
    })
}

fn stopped_by_limit(unit: &RegulatorUnit, seen: &Seen, moving: &Moving) -> bool {
    room(unit, seen) == 0 || moving.ceiling.is_some_and(|c| unit.tap >= c)
}

/// Rated secondary voltage of the potential transformer: the standard one nearest the set point
/// (100 and 110 V, IEC 61869-3; 115 and 120 V, IEEE C57.13; from memory).
fn relay_rating(set_volts: f64) -> f64 {
    let nearer = |a: &f64, b: &f64| (a - set_volts).abs().total_cmp(&(b - set_volts).abs());
    [100.0, 110.0, 115.0, 120.0].into_iter().min_by(nearer).unwrap_or(set_volts)
}

fn unit_mut(network: &mut Network, branch: BranchId, unit: usize) -> Option<&mut RegulatorUnit> {
    match &mut network.branches[branch.index()].kind {
        BranchKind::Regulator(bank) => bank.units.get_mut(unit),
        _ => None,
    }
}
