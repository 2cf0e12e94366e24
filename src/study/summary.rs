//! What a network holds, on one screen: for a look at what was read before anything is solved.

use std::collections::BTreeMap;

use serde::Serialize;

use crate::network::{BranchKind, Conductor, Conductors, LoadModel, Network};

/// Nodes of one nominal voltage.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NodesAt {
    /// Nominal line-to-line voltage, kilovolts.
    pub kv: f64,
    /// Number of nodes.
    pub nodes: usize,
    /// Of them with an earth electrode.
    pub electrodes: usize,
}

/// Lines that carry the same conductors.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LinesOf {
    /// Conductors.
    pub conductors: String,
    /// Number of lines.
    pub lines: usize,
    /// Their length, kilometres.
    pub km: f64,
}

/// Loads of one model.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LoadsOf {
    /// `power`, `current` or `impedance`.
    pub model: &'static str,
    /// Number of loads.
    pub loads: usize,
    /// Active power at nominal voltage, kilowatts.
    pub kw: f64,
    /// Reactive power, kilovars.
    pub kvar: f64,
}

/// Load on each phase; phase-to-phase loads count half on each of their two.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LoadOn {
    /// Phase letter.
    pub phase: &'static str,
    /// Active power at nominal voltage, kilowatts.
    pub kw: f64,
    /// Reactive power, kilovars.
    pub kvar: f64,
}

/// Transformers of one vector group.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct TransformersOf {
    /// Vector group.
    pub group: String,
    /// Number.
    pub transformers: usize,
    /// Their ratings together, kilovolt-amperes.
    pub kva: f64,
}

/// What a network holds.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Summary {
    /// Name of the network.
    pub network: String,
    /// System frequency, hertz.
    pub frequency_hz: f64,
    /// Node of the source.
    pub source_node: String,
    /// Nominal line-to-line voltage of the source, kilovolts.
    pub source_kv: f64,
    /// Three-phase fault level the source impedance stands for, MVA; none for a stiff source.
    pub source_mva: Option<f64>,
    /// Nodes by nominal voltage, highest first.
    pub nodes: Vec<NodesAt>,
    /// Lines by conductors.
    pub lines: Vec<LinesOf>,
    /// Transformers by vector group.
    pub transformers: Vec<TransformersOf>,
    /// Loads by model.
    pub loads: Vec<LoadsOf>,
    /// Load on each phase.
    pub phases: Vec<LoadOn>,
    /// Branches that close a ring, each with its kind: `line L7`.
    pub rings_closed_by: Vec<String>,
    /// Number of closed switches.
    pub switches: usize,
    /// Number of regulated phases.
    pub regulated_phases: usize,
    /// Number of capacitors in service.
    pub capacitors: usize,
    /// Their reactive power at rated voltage, kilovars.
    pub capacitor_kvar: f64,
    /// Number of generators in service.
    pub generators: usize,
    /// Active power they could deliver, kilowatts.
    pub generation_kw: f64,
    /// Number of motors, running or not.
    pub motors: u32,
    /// Number of meters.
    pub meters: usize,
}

/// Counts and adds up what a network holds.
pub fn summary(network: &Network) -> Summary {
    let mut nodes: BTreeMap<u64, NodesAt> = BTreeMap::new();
    for node in &network.nodes {
        let kv = node.nominal_volts / 1e3;
        let entry = nodes.entry(u64::MAX - node.nominal_volts.to_bits()).or_insert(NodesAt {
            kv,
            nodes: 0,
            electrodes: 0,
        });
        entry.nodes += 1;
        entry.electrodes += usize::from(node.earth_ohm.is_some());
    }
    let branches = branches(network);
    let supply = &network.supply;
    let z = supply.impedance[(0, 0)] - supply.impedance[(0, 1)];
    let source_mva = (z.norm() > 0.0).then(|| supply.nominal_volts.powi(2) / z.norm() / 1e6);
    Summary {
        network: network.study.name.clone(),
        frequency_hz: network.study.frequency_hz,
        source_node: network.node(supply.node).name.to_string(),
        source_kv: supply.nominal_volts / 1e3,
        source_mva,
        nodes: nodes.into_values().collect(),
        lines: branches.lines.into_values().collect(),
        transformers: branches.transformers.into_values().collect(),
        loads: loads(network),
        phases: phases(network),
        rings_closed_by: network
            .ties
            .iter()
            .map(|tie| {
                let branch = network.branch(tie.branch);
                format!("{} {}", branch.kind.word(), branch.name)
            })
            .collect(),
        switches: branches.switches,
        regulated_phases: branches.regulated_phases,
        capacitors: network.capacitors.len(),
        capacitor_kvar: network.capacitors.iter().map(|c| c.vars).sum::<f64>() / 1e3,
        generators: network.generators.len(),
        generation_kw: network.generators.iter().map(|g| g.watts).sum::<f64>() / 1e3,
        motors: network.motors.iter().map(|m| m.count).sum(),
        meters: network.meters.len(),
    }
}

#[derive(Default)]
struct Counted {
    lines: BTreeMap<(std::cmp::Reverse<usize>, Conductors), LinesOf>,
    transformers: BTreeMap<String, TransformersOf>,
    switches: usize,
    regulated_phases: usize,
}

fn branches(network: &Network) -> Counted {
    let mut counted = Counted::default();
    for branch in &network.branches {
        match &branch.kind {
            BranchKind::Line(line) => {
                let conductors = branch.from_conductors;
                let key = (std::cmp::Reverse(conductors.count()), conductors);
                let fresh = LinesOf { conductors: conductors.to_string(), lines: 0, km: 0.0 };
                let entry = counted.lines.entry(key).or_insert(fresh);
                entry.lines += 1;
                entry.km += line.length_m / 1e3;
            }
            BranchKind::Transformer(t) => {
                let group = t.group.to_string();
                let fresh = TransformersOf { group: group.clone(), transformers: 0, kva: 0.0 };
                let entry = counted.transformers.entry(group).or_insert(fresh);
                entry.transformers += 1;
                entry.kva += t.rated_va / 1e3;
            }
            BranchKind::Switch => counted.switches += 1,
            BranchKind::Regulator(bank) => counted.regulated_phases += bank.units.len(),
        }
    }
    counted
}

fn loads(network: &Network) -> Vec<LoadsOf> {
    let of = |model: LoadModel| {
        let loads = || network.loads.iter().filter(|l| l.model == model);
        let (kw, kvar) = loads().fold((0.0, 0.0), |(p, q), l| (p + l.watts / 1e3, q + l.vars / 1e3));
        LoadsOf { model: model.word(), loads: loads().count(), kw, kvar }
    };
    let models = [LoadModel::Power, LoadModel::Current, LoadModel::Impedance];
    models.into_iter().map(of).filter(|l| l.loads > 0).collect()
}

fn phases(network: &Network) -> Vec<LoadOn> {
    let mut sums = [(0.0, 0.0); 3];
    let mut split = (0.0, 0.0);
    for load in &network.loads {
        if load.connection.phases().is_split() {
            split = (split.0 + load.watts / 1e3, split.1 + load.vars / 1e3);
            continue;
        }
        let share = 1.0 / load.connection.elements().max(1) as f64 / 1e3;
        for (p, q) in load.connection.pairs() {
            let ends: &[Conductor] = if q == Conductor::N { &[p] } else { &[p, q] };
            for end in ends {
                let part = share / ends.len() as f64;
                sums[end.slot()].0 += load.watts * part;
                sums[end.slot()].1 += load.vars * part;
            }
        }
    }
    Conductor::PHASES
        .iter()
        .map(|c| LoadOn { phase: c.letter(), kw: sums[c.slot()].0, kvar: sums[c.slot()].1 })
        .chain((split != (0.0, 0.0)).then_some(LoadOn { phase: "s1s2", kw: split.0, kvar: split.1 }))
        .collect()
}
