//! Loads shared from what meters read, so that the solved flow, losses included, meets every meter.
//!
//! Each reading has one unknown, the active power its loads share by their parts, and another for
//! the reactive power where that is metered. The flow is solved with the loads at hand, and the
//! unknowns are corrected by what the meters are off, the outer ones less what the inner ones will
//! correct; Broyden's update (Mathematics of Computation 19 (1965), 577-593) learns how losses,
//! voltages and transformers turn a change of loads into a change of readings.
//!
//! A reading of the total is the power through all conductors, each to earth, as everywhere in the
//! results. A reading of one phase is that of a meter element between the phase and the neutral
//! (to earth where there is none).

mod loads;
mod measure;

use nalgebra::{DMatrix, DVector};
use serde::Serialize;

pub use loads::{AllocatedLoad, allocated_loads};
pub use measure::{Measured, measure};

use crate::network::{
    BranchKind, Channel, Meter, Name, Network, ReactiveReading, Reading, Regulator, TapMode,
};
use crate::solver::{Controls, Path, Settings, Solution, Status, solve_controlled, solve_operating};

/// Largest difference from a reading that counts as met, watts and vars.
pub const MET_WATTS: f64 = 100.0;
/// Difference at which the search ends, watts and vars.
const AIM_WATTS: f64 = 1.0;
/// Largest difference from a current that counts as met, share of the reading.
const MET_AMPS_SHARE: f64 = 1e-3;
/// The same where the search ends.
const AIM_AMPS_SHARE: f64 = 1e-6;
/// Solves before the search is given up.
const SOLVES: usize = 80;
/// Times the taps of automatic regulators may move between searches.
const TAP_ROUNDS: usize = 16;
/// Unknowns beyond which Broyden's matrix is left out.
const LARGEST: usize = 1500;

/// A reading and what the solved flow gives for it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MeterRead {
    /// Meter.
    pub meter: String,
    /// Phase letter; `None`: the total.
    pub phase: Option<&'static str>,
    /// Active power read, kilowatts.
    pub metered_kw: Option<f64>,
    /// Reactive power read (or that of the power factor read), kilovars.
    pub metered_kvar: Option<f64>,
    /// Current read, amperes.
    pub metered_amps: Option<f64>,
    /// Active power of the solved flow, kilowatts.
    pub kw: f64,
    /// Reactive power of the solved flow, kilovars.
    pub kvar: f64,
    /// Current of the solved flow, amperes; of a total the mean of the phases.
    pub amps: f64,
    /// Active power shared over its loads, kilowatts.
    pub shared_kw: f64,
    /// Number of loads that share it.
    pub loads: usize,
    /// True where the flow meets it.
    pub met: bool,
}

/// Loads that meet the meters, and the flow they give.
#[derive(Debug, Clone)]
pub struct Allocation {
    /// The flow.
    pub solution: Solution,
    /// How regulators and switched capacitors ended.
    pub controls: Controls,
    /// Every reading; all are met.
    pub meters: Vec<MeterRead>,
    /// Solves made.
    pub solves: usize,
}

/// Why the meters cannot be met.
#[derive(Debug, Clone)]
pub enum Unmet {
    /// The flow has no solution with the loads that were tried last.
    NoSolution(Box<Solution>),
    /// The flow has only a solution of collapsed voltages.
    Collapsed,
    /// Known loads, inner meters and losses take more than is read: these loads would have to generate.
    NegativeRemainder {
        /// Readings with less than nothing to share.
        meters: Vec<MeterRead>,
        /// Loads that would get less than nothing.
        loads: Vec<String>,
    },
    /// The search ended off these readings.
    Off(Vec<MeterRead>),
    /// Taps of automatic regulators do not come to rest while loads are shared.
    TapsMove,
}

/// Shares the loads of a network so that its flow meets every meter; they are in the network afterwards.
///
/// # Errors
/// Why the meters cannot be met; the loads of the network are then those tried last.
pub fn allocate(network: &mut Network, settings: &Settings) -> Result<Allocation, Unmet> {
    let mut search = Search::new(network);
    for _ in 0..TAP_ROUNDS {
        search.run(network, settings)?;
        let before = taps(network);
        let (solution, controls) = solve_controlled(network, settings);
        search.solves += 1;
        check(&solution)?;
        if taps(network) != before {
            continue;
        }
        let seen = measure(network, &solution);
        let meters = search.read(network, &seen);
        if meters.iter().any(|m| !m.met) {
            return Err(Unmet::Off(meters.into_iter().filter(|m| !m.met).collect()));
        }
        search.no_load_generates(network, &meters)?;
        return Ok(Allocation { solution, controls, meters, solves: search.solves });
    }
    Err(Unmet::TapsMove)
}

fn check(solution: &Solution) -> Result<(), Unmet> {
    match (solution.status, solution.path) {
        (Status::Converged, Path::Folds { .. }) => Err(Unmet::Collapsed),
        (Status::Converged, _) => Ok(()),
        _ => Err(Unmet::NoSolution(Box::new(solution.clone()))),
    }
}

/// Taps of the automatic regulators, and which capacitors are in service.
fn taps(network: &Network) -> (Vec<i32>, Vec<Name>) {
    let banks = network.branches.iter().filter_map(|b| match &b.kind {
        BranchKind::Regulator(bank) => Some(bank),
        _ => None,
    });
    let automatic = |b: &'_ Regulator| -> Vec<i32> {
        b.units.iter().filter(|u| u.mode == TapMode::Automatic).map(|u| u.tap).collect()
    };
    (banks.flat_map(automatic).collect(), network.capacitors.iter().map(|c| c.name.clone()).collect())
}

/// A reading among the unknowns.
#[derive(Debug, Clone, Copy)]
struct Slot {
    meter: usize,
    channel: usize,
    /// Index of its active power among the unknowns.
    active: usize,
    /// Index of its reactive power, where that is read.
    reactive: Option<usize>,
}

/// The unknowns, watts and vars, and what was learnt of them.
struct Search {
    slots: Vec<Slot>,
    shared: DVector<f64>,
    solves: usize,
}

/// Active and reactive power that a reading asks for, watts and vars.
#[derive(Debug, Clone, Copy)]
struct Target {
    watts: f64,
    vars: Option<f64>,
}

impl Search {
    fn new(network: &Network) -> Search {
        let (mut slots, mut count) = (Vec::new(), 0);
        for (meter, m) in network.meters.iter().enumerate() {
            for (channel, c) in m.channels.iter().enumerate() {
                let reactive = (c.reactive != ReactiveReading::None).then_some(count + 1);
                slots.push(Slot { meter, channel, active: count, reactive });
                count += 1 + usize::from(reactive.is_some());
            }
        }
        Search { slots, shared: DVector::zeros(count), solves: 0 }
    }

    /// Shares until every reading is met, with the taps as they stand.
    fn run(&mut self, network: &mut Network, settings: &Settings) -> Result<(), Unmet> {
        let (solution, mut residual) = self.attempt(network, settings);
        check(&solution)?;
        let mut residual_of = residual.take().unwrap_or_else(|| DVector::zeros(self.shared.len()));
        let mut last = solution;
        let learn = self.shared.len() <= LARGEST;
        let mut inverse =
            if learn { Some(DMatrix::<f64>::identity(self.shared.len(), self.shared.len())) } else { None };
        let end = self.solves + SOLVES;
        while self.solves < end && !self.is_met(network, &last, AIM_WATTS, AIM_AMPS_SHARE) {
            let mut step = inverse.as_ref().map_or_else(|| residual_of.clone(), |h| h * &residual_of);
            let start = self.shared.clone();
            let mut tried = None;
            // A step beyond what the feeder can carry is taken in part.
            for _ in 0..6 {
                self.shared = &start + &step;
                let (solution, residual) = self.attempt(network, settings);
                let good = check(&solution).is_ok();
                tried = Some((solution, residual));
                if good {
                    break;
                }
                step *= 0.5;
            }
            let Some((solution, residual)) = tried else { break };
            check(&solution)?;
            let Some(residual) = residual else { break };
            if let Some(h) = &mut inverse {
                learn_from(h, &step, &(&residual_of - &residual));
            }
            (residual_of, last) = (residual, solution);
        }
        Ok(())
    }

    /// Solves with the unknowns as they are; the corrections, where the flow has a solution.
    fn attempt(&mut self, network: &mut Network, settings: &Settings) -> (Solution, Option<DVector<f64>>) {
        self.apply(network);
        let solution = solve_operating(network, settings);
        self.solves += 1;
        let good = solution.status == Status::Converged && self.shared.iter().all(|x| x.is_finite());
        let residual = good.then(|| self.residual(network, &measure(network, &solution)));
        (solution, residual)
    }

    /// Gives every load with a share its power.
    fn apply(&self, network: &mut Network) {
        let Network { meters, loads, .. } = network;
        for channel in meters.iter().flat_map(|m| &m.channels) {
            for share in &channel.shares {
                if let Some(load) = loads.get_mut(share.load) {
                    (load.watts, load.vars) = (0.0, 0.0);
                }
            }
        }
        for slot in &self.slots {
            let Some(channel) = channel(meters, slot) else { continue };
            let watts = self.shared[slot.active];
            let open: f64 = channel.shares.iter().filter(|s| s.ratio.is_none()).map(|s| s.part).sum();
            let vars = slot.reactive.map_or(0.0, |i| self.shared[i]) / if open > 0.0 { open } else { 1.0 };
            for share in &channel.shares {
                let Some(load) = loads.get_mut(share.load) else { continue };
                load.watts += watts * share.part;
                load.vars += share.part * share.ratio.map_or(vars, |ratio| watts * ratio);
            }
        }
    }

    /// By how much to change the unknowns were there no losses.
    fn residual(&self, network: &Network, seen: &[Vec<Measured>]) -> DVector<f64> {
        let mut off = DVector::zeros(self.shared.len());
        for slot in &self.slots {
            let (Some(channel), Some(measured)) = (channel(&network.meters, slot), seen_by(seen, slot))
            else {
                continue;
            };
            let target = target(channel, measured);
            off[slot.active] = target.watts - measured.watts;
            if let (Some(i), Some(vars)) = (slot.reactive, target.vars) {
                off[i] = vars - measured.vars;
            }
        }
        let mut own = off.clone();
        for slot in &self.slots {
            let Some(outer) = self.outer(network, slot) else { continue };
            own[outer.active] -= off[slot.active];
            if let (Some(i), Some(o)) = (slot.reactive, outer.reactive) {
                own[o] -= off[i];
            }
        }
        own
    }

    /// The same reading (total, or that phase) of the outer meter.
    fn outer(&self, network: &Network, slot: &Slot) -> Option<Slot> {
        let outer = network.meters.get(slot.meter)?.outer?;
        let phase = channel(&network.meters, slot)?.phase;
        let same =
            |s: &&Slot| s.meter == outer && channel(&network.meters, s).is_some_and(|c| c.phase == phase);
        let all =
            |s: &&Slot| s.meter == outer && channel(&network.meters, s).is_some_and(|c| c.phase.is_none());
        self.slots.iter().find(same).or_else(|| self.slots.iter().find(all)).copied()
    }

    fn is_met(&self, network: &Network, solution: &Solution, watts: f64, amps_share: f64) -> bool {
        let seen = measure(network, solution);
        self.slots.iter().all(|slot| match (channel(&network.meters, slot), seen_by(&seen, slot)) {
            (Some(channel), Some(measured)) => met(channel, measured, watts, amps_share),
            _ => false,
        })
    }

    fn read(&self, network: &Network, seen: &[Vec<Measured>]) -> Vec<MeterRead> {
        let row = |slot: &Slot| {
            let (meter, c) = (network.meters.get(slot.meter)?, channel(&network.meters, slot)?);
            let measured = seen_by(seen, slot)?;
            let target = target(c, measured);
            let (metered_kw, metered_amps) = match c.reading {
                Reading::Watts(watts) => (Some(watts / 1e3), None),
                Reading::Amps(amps) => (None, Some(amps)),
            };
            Some(MeterRead {
                meter: meter.name.to_string(),
                phase: c.phase.map(|p| p.letter()),
                metered_kw,
                metered_kvar: target.vars.map(|v| v / 1e3),
                metered_amps,
                kw: measured.watts / 1e3,
                kvar: measured.vars / 1e3,
                amps: measured.amps,
                shared_kw: self.shared[slot.active] / 1e3,
                loads: c.shares.len(),
                met: met(c, measured, MET_WATTS, MET_AMPS_SHARE),
            })
        };
        self.slots.iter().filter_map(row).collect()
    }

    /// A load that shares a demand cannot get less than nothing.
    fn no_load_generates(&self, network: &Network, meters: &[MeterRead]) -> Result<(), Unmet> {
        let shared = network.meters.iter().flat_map(|m| &m.channels).flat_map(|c| &c.shares);
        let mut loads: Vec<String> = shared
            .filter_map(|s| network.loads.get(s.load))
            .filter(|load| load.watts < -AIM_WATTS)
            .map(|load| load.name.to_string())
            .collect();
        loads.dedup();
        if loads.is_empty() {
            return Ok(());
        }
        let meters = meters.iter().filter(|m| m.shared_kw < 0.0).cloned().collect();
        Err(Unmet::NegativeRemainder { meters, loads })
    }
}

fn channel<'a>(meters: &'a [Meter], slot: &Slot) -> Option<&'a Channel> {
    meters.get(slot.meter)?.channels.get(slot.channel)
}

fn seen_by<'a>(seen: &'a [Vec<Measured>], slot: &Slot) -> Option<&'a Measured> {
    seen.get(slot.meter)?.get(slot.channel)
}

/// What a reading asks for; a current is turned into power at the voltage and angle measured.
fn target(channel: &Channel, measured: &Measured) -> Target {
    let watts = match channel.reading {
        Reading::Watts(watts) => watts,
        Reading::Amps(amps) => {
            let apparent = measured.watts.hypot(measured.vars);
            // Before there is load the measured angle means nothing.
            let loaded = measured.amps > 1e-3 * amps && measured.watts > 0.05 * apparent;
            match (channel.reactive, loaded) {
                (ReactiveReading::Ratio(ratio), true) => apparent * amps / measured.amps / 1f64.hypot(ratio),
                (ReactiveReading::Ratio(ratio), false) => {
                    measured.nominal_va_per_amp * amps / 1f64.hypot(ratio)
                }
                (_, true) => measured.watts * amps / measured.amps,
                (_, false) => 0.9 * measured.nominal_va_per_amp * amps,
            }
        }
    };
    let vars = match channel.reactive {
        ReactiveReading::None => None,
        ReactiveReading::Vars(vars) => Some(vars),
        ReactiveReading::Ratio(ratio) => Some(watts * ratio),
    };
    Target { watts, vars }
}

fn met(channel: &Channel, measured: &Measured, watts: f64, amps_share: f64) -> bool {
    let target = target(channel, measured);
    let active = match channel.reading {
        Reading::Watts(read) => (measured.watts - read).abs() <= watts,
        Reading::Amps(amps) => (measured.amps - amps).abs() <= amps_share * amps,
    };
    active && target.vars.is_none_or(|vars| (measured.vars - vars).abs() <= watts)
}

/// Broyden's update of the inverse: a step `s` changed what is off by `-y`, so `H y = s` from now on.
fn learn_from(inverse: &mut DMatrix<f64>, step: &DVector<f64>, change: &DVector<f64>) {
    let guess = &*inverse * change;
    let scale = step.dot(&guess);
    // A step whose guess stands across it teaches nothing.
    if scale.abs() > 1e-3 * step.norm() * guess.norm() {
        let left = (step - guess) / scale;
        let right = inverse.tr_mul(step);
        inverse.ger(1.0, &left, &right, 1.0);
    }
}
