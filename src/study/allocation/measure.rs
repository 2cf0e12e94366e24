//! What the meters of a network would read of a solved flow.

use crate::math::{Complex64, PhaseVector};
use crate::network::{Channel, Conductor, Conductors, End, LoadPlace, Meter, MeterPlace, Network, NodeId};
use crate::solver::{Solution, load_current};

/// What one channel of a meter reads.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Measured {
    /// Active power, watts, positive away from the source.
    pub watts: f64,
    /// Reactive power, vars.
    pub vars: f64,
    /// Current, amperes; of a total the mean of the phases.
    pub amps: f64,
    /// Apparent power of one ampere at nominal voltage, volt-amperes.
    pub nominal_va_per_amp: f64,
}

/// Readings of every meter, by meter and channel.
pub fn measure(network: &Network, solution: &Solution) -> Vec<Vec<Measured>> {
    network.meters.iter().map(|meter| meter_reads(network, solution, meter)).collect()
}

fn meter_reads(network: &Network, solution: &Solution, meter: &Meter) -> Vec<Measured> {
    let (node, conductors, amps) = through(network, solution, meter.place);
    let volts = solution.volts.get(node.index()).copied().unwrap_or_else(PhaseVector::zeros);
    let nominal = network.node(node).nominal_phase_volts();
    let n = if conductors.has_neutral() { volts[Conductor::N.slot()] } else { Complex64::default() };
    let phases = conductors.phases();
    let read = |channel: &Channel| match channel.phase {
        Some(phase) => {
            let (v, i) = (volts[phase.slot()] - n, amps[phase.slot()]);
            let power = v * i.conj();
            Measured { watts: power.re, vars: power.im, amps: i.norm(), nominal_va_per_amp: nominal }
        }
        None => {
            let power: Complex64 = conductors.iter().map(|c| volts[c.slot()] * amps[c.slot()].conj()).sum();
            let count = phases.count().max(1) as f64;
            let mean = phases.iter().map(|c| amps[c.slot()].norm()).sum::<f64>() / count;
            Measured { watts: power.re, vars: power.im, amps: mean, nominal_va_per_amp: count * nominal }
        }
    };
    meter.channels.iter().map(read).collect()
}

/// Node, conductors and currents away from the source where a meter reads.
fn through(network: &Network, solution: &Solution, place: MeterPlace) -> (NodeId, Conductors, PhaseVector) {
    let MeterPlace::Branch { branch: id, end, upstream } = place else {
        let node = network.supply.node;
        return (node, network.node(node).conductors, solution.source_amps);
    };
    let branch = network.branch(id);
    let (node, conductors, amps) = match end {
        End::From => (branch.from, branch.from_conductors, &solution.from_amps),
        End::To => (branch.to, branch.to_conductors, &solution.to_amps),
    };
    let sign = if upstream == End::From { 1.0 } else { -1.0 };
    let mut amps = amps.get(id.index()).copied().unwrap_or_else(PhaseVector::zeros) * Complex64::from(sign);
    // A load spread along the line is drawn half at each end: behind the meter at the upper end,
    // before it at the lower.
    let spread = if end == upstream { 1.0 } else { -1.0 };
    let floor = network.study.constant_power_floor_percent / 100.0;
    let at = network.node(node);
    let volts = solution.volts.get(node.index()).copied().unwrap_or_else(PhaseVector::zeros);
    for load in network.loads.iter().filter(|l| l.place == LoadPlace::Line(id)) {
        let each = Complex64::new(load.watts, load.vars) * (0.5 / load.connection.elements().max(1) as f64);
        for (p, q) in load.connection.pairs() {
            let base = if at.conductors.has(q) { volts[q.slot()] } else { Complex64::default() };
            let nominal = at.nominal_across(load.connection);
            let current = load_current(load.model, each, nominal, floor, volts[p.slot()] - base) * spread;
            amps[p.slot()] += current;
            if at.conductors.has(q) {
                amps[q.slot()] -= current;
            }
        }
    }
    (node, conductors, amps)
}
