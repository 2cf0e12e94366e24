//! Losses by element and by kind, and the totals.

use serde::Serialize;

use super::{Electrode, ElementLoss, LoadDraw, MotorRun, element_volts};
use crate::math::{Complex64, PhaseVector, SLOTS};
use crate::network::{Branch, BranchKind, Conductor, End, Network, Transformer};
use crate::solver::Solution;
use crate::units::SQRT_3;

/// Sums over the network, kilowatts and kilovars. `source` and `generation` equal `load` plus `loss` to rounding.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct Totals {
    /// Active power at the supply node.
    pub source_kw: f64,
    /// Reactive power at the supply node.
    pub source_kvar: f64,
    /// Active power of loads, motors and capacitors.
    pub load_kw: f64,
    /// Reactive power of loads, motors and capacitors; capacitors count negative.
    pub load_kvar: f64,
    /// All losses.
    pub loss_kw: f64,
    /// Reactive losses; the charging of lines counts negative.
    pub loss_kvar: f64,
    /// Losses of the phase conductors of lines.
    pub line_loss_kw: f64,
    /// Losses of neutral conductors.
    pub neutral_loss_kw: f64,
    /// Losses of transformers.
    pub transformer_loss_kw: f64,
    /// Losses in earth electrodes.
    pub earth_loss_kw: f64,
    /// Active power of generators: source and generation together are loads and losses.
    pub generation_kw: f64,
    /// Their reactive power.
    pub generation_kvar: f64,
    /// Active power of running motors, which `load_kw` includes.
    pub motor_kw: f64,
    /// Their reactive power, which `load_kvar` includes.
    pub motor_kvar: f64,
    /// Losses inside the motors, part of `motor_kw`.
    pub motor_loss_kw: f64,
    /// Reactive power of capacitors, which `load_kvar` includes.
    pub capacitor_kvar: f64,
}

fn power(volts: &PhaseVector, amps: &PhaseVector) -> Complex64 {
    (0..SLOTS).map(|k| volts[k] * amps[k].conj()).sum()
}

/// Loss and loading of every branch, then of every electrode and of every reference to earth.
pub(super) fn elements(network: &Network, solution: &Solution, electrodes: &[Electrode]) -> Vec<ElementLoss> {
    let mut rows = Vec::with_capacity(network.branches.len());
    for (b, branch) in network.branches.iter().enumerate() {
        let (from, to) = (&solution.volts[branch.from.index()], &solution.volts[branch.to.index()]);
        let (from_amps, to_amps) = (&solution.from_amps[b], &solution.to_amps[b]);
        let loss = (power(from, from_amps) - power(to, to_amps)) / 1e3;
        rows.push(ElementLoss {
            element: branch.name.clone(),
            kind: branch.kind.word(),
            loss_kw: loss.re,
            loss_kvar: loss.im,
            rating_percent: rating_percent(branch, from_amps, to_amps),
        });
    }
    star_points(electrodes, &mut rows);
    for (node, volts) in network.nodes.iter().zip(&solution.volts) {
        let loss: Complex64 = node
            .earth_admittance()
            .iter()
            .enumerate()
            .map(|(k, y)| volts[k].norm_sqr() * y.conj())
            .sum::<Complex64>()
            / 1e3;
        if node.earth_ohm.is_some() || node.reference_siemens > 0.0 {
            rows.push(ElementLoss {
                element: node.name.clone(),
                kind: if node.earth_ohm.is_some() { "electrode" } else { "reference" },
                loss_kw: loss.re,
                loss_kvar: loss.im,
                rating_percent: None,
            });
        }
    }
    rows
}

/// Takes what is lost in the earthing of star points out of the transformers, as rows of its own.
fn star_points(electrodes: &[Electrode], rows: &mut Vec<ElementLoss>) {
    for electrode in electrodes {
        let Some(transformer) = &electrode.transformer else { continue };
        let (loss_kw, loss_kvar) = (
            electrode.amps * electrode.amps * electrode.r_ohm / 1e3,
            electrode.amps * electrode.amps * electrode.x_ohm / 1e3,
        );
        let of = |row: &&mut ElementLoss| row.kind == "transformer" && row.element == *transformer;
        if let Some(row) = rows.iter_mut().find(of) {
            row.loss_kw -= loss_kw;
            row.loss_kvar -= loss_kvar;
        }
        rows.push(ElementLoss {
            element: transformer.clone(),
            kind: "electrode",
            loss_kw,
            loss_kvar,
            rating_percent: None,
        });
    }
}

/// Largest phase current over the rating, percent.
fn rating_percent(branch: &Branch, from: &PhaseVector, to: &PhaseVector) -> Option<f64> {
    let largest = |amps: &PhaseVector| (0..Conductor::N.slot()).map(|k| amps[k].norm()).fold(0.0, f64::max);
    match &branch.kind {
        BranchKind::Line(_) => Some(100.0 * largest(from).max(largest(to)) / branch.rating_amps?),
        BranchKind::Transformer(t) => {
            let share = |amps: f64, end: End| 100.0 * amps / rated_amps(t, end);
            Some(share(largest(from), End::From).max(share(largest(to), End::To)))
        }
        BranchKind::Switch | BranchKind::Regulator(_) => None,
    }
}

/// Rated current of a side, amperes: in each line conductor of a three-phase bank, in the winding of
/// a single-phase unit; of several units the least.
fn rated_amps(t: &Transformer, end: End) -> f64 {
    let of = |unit: &Transformer| {
        let volts = if end == End::From { unit.from_volts } else { unit.to_volts };
        if unit.group.is_single() { unit.rated_va / volts } else { unit.rated_va / (SQRT_3 * volts) }
    };
    t.units().map(of).fold(f64::INFINITY, f64::min)
}

/// Totals of the network.
pub(super) fn totals(
    network: &Network,
    solution: &Solution,
    elements: &[ElementLoss],
    loads: &[LoadDraw],
    motors: &[MotorRun],
) -> Totals {
    let source = power(&solution.volts[network.supply.node.index()], &solution.source_amps) / 1e3;
    let mut totals = Totals { source_kw: source.re, source_kvar: source.im, ..Totals::default() };
    for load in loads {
        totals.load_kw += load.kw;
        totals.load_kvar += load.kvar;
    }
    for motor in motors {
        totals.motor_kw += motor.kw;
        totals.motor_kvar += motor.kvar;
        totals.motor_loss_kw += motor.loss_kw;
    }
    totals.load_kw += totals.motor_kw;
    totals.load_kvar += totals.motor_kvar;
    for capacitor in &network.capacitors {
        let siemens =
            capacitor.vars / capacitor.connection.elements().max(1) as f64 / capacitor.rated_volts.powi(2);
        let volts = element_volts(network, solution, capacitor.node, capacitor.connection);
        totals.capacitor_kvar -= volts.map(|u| u.norm_sqr() * siemens).sum::<f64>() / 1e3;
    }
    totals.load_kvar += totals.capacitor_kvar;
    for element in elements {
        totals.loss_kw += element.loss_kw;
        totals.loss_kvar += element.loss_kvar;
        match element.kind {
            "transformer" => totals.transformer_loss_kw += element.loss_kw,
            "electrode" | "reference" => totals.earth_loss_kw += element.loss_kw,
            _ => totals.line_loss_kw += element.loss_kw,
        }
    }
    totals.neutral_loss_kw = neutral_loss_kw(network, solution);
    totals.line_loss_kw -= totals.neutral_loss_kw;
    totals
}

/// Losses of the neutrals of lines: `Re((V_from,n - V_to,n) conj(I_n))`, `I_n` the current inside the
/// pi model: that of the from end less the charging there. The neutral's share of the common earth
/// path is in it.
fn neutral_loss_kw(network: &Network, solution: &Solution) -> f64 {
    let n = Conductor::N.slot();
    let mut watts = 0.0;
    for (branch, amps) in network.branches.iter().zip(&solution.from_amps) {
        let BranchKind::Line(line) = &branch.kind else { continue };
        if !branch.from_conductors.has_neutral() {
            continue;
        }
        let (from, to) = (&solution.volts[branch.from.index()], &solution.volts[branch.to.index()]);
        let charging = (network.line_shunt(line).row(n) * from)[0] / 2.0;
        watts += ((from[n] - to[n]) * (amps[n] - charging).conj()).re;
    }
    watts / 1e3
}
