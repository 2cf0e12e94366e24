//! The extremes that a reader looks for first.

use std::fmt;

use super::{ElementLoss, NodeSummary, phase_volts};
use crate::network::{BranchKind, Conductor, Conductors, Network, Node, NodeId, VectorGroup};
use crate::solver::Solution;

/// An extreme value and where it is.
#[derive(Debug, Clone, PartialEq)]
pub struct Extreme {
    /// The value, in the unit its field names.
    pub value: f64,
    /// Node or element, with the conductors where they matter: `node 652, a`.
    pub place: String,
}

/// Extremes of a solved network; `None` where there is nothing to compare.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Glance {
    /// Lowest voltage across a load's terminals at any node, per unit.
    pub lowest_pu: Option<Extreme>,
    /// Highest, per unit.
    pub highest_pu: Option<Extreme>,
    /// Largest drop from the last source, transformer or regulator, percent of nominal.
    pub drop_percent: Option<Extreme>,
    /// Largest unbalance factor, percent.
    pub unbalance_percent: Option<Extreme>,
    /// Highest neutral current of a line, amperes.
    pub neutral_amps: Option<Extreme>,
    /// Highest voltage of a neutral to remote earth, volts.
    pub neutral_volts: Option<Extreme>,
    /// Most loaded element, percent of its rating.
    pub rating_percent: Option<Extreme>,
}

/// Between what a voltage is judged at a node.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Across {
    /// A phase to the neutral where the node carries it, else to earth.
    Phase(Conductor),
    /// Two phases.
    Phases(Conductor, Conductor),
}

impl fmt::Display for Across {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Across::Phase(c) => write!(f, "{c}"),
            Across::Phases(p, q) => write!(f, "{p}{q}"),
        }
    }
}

/// What is judged at a node: each phase; each pair of phases on a side that no earth holds.
fn spans(node: &Node, floats: bool) -> impl Iterator<Item = Across> + use<> {
    let carried = node.conductors;
    carried.phases().iter().filter_map(move |c| {
        if !floats {
            Some(Across::Phase(c))
        } else {
            let pair = carried.has(c.next()) && c != Conductor::S2;
            pair.then_some(Across::Phases(c, c.next()))
        }
    })
}

/// Voltage of a span at a node, per unit of its nominal.
fn span_pu(network: &Network, solution: &Solution, id: NodeId, across: Across) -> f64 {
    let node = network.node(id);
    let volts = phase_volts(node, &solution.volts[id.index()]);
    match across {
        Across::Phase(c) => volts[c.slot()].norm() / node.nominal_phase_volts(),
        Across::Phases(p, q) => (volts[p.slot()] - volts[q.slot()]).norm() / node.nominal_volts,
    }
}

/// Voltages that are judged at a node, per unit: phase to neutral (or earth); between phases on a
/// side that no earth holds.
pub(super) fn judged<'a>(
    network: &'a Network,
    solution: &'a Solution,
    floating: &[bool],
    id: NodeId,
) -> impl Iterator<Item = (Across, f64)> + use<'a> {
    spans(network.node(id), floating[id.index()])
        .map(move |across| (across, span_pu(network, solution, id, across)))
}

/// Lowest judged voltage of each node, per unit; infinite at a node where nothing is judged, such
/// as a single phase of a side that no earth holds. In the order of [`Network::nodes`].
pub fn lowest_judged(network: &Network, solution: &Solution) -> Vec<f64> {
    let floating = floating_nodes(network);
    let lowest = |i: usize| {
        let id = NodeId(i as u32);
        judged(network, solution, &floating, id).map(|(_, pu)| pu).fold(f64::INFINITY, f64::min)
    };
    (0..network.nodes.len()).map(lowest).collect()
}

/// Whether the phases of each node's side have no earth of their own but a stated reference.
pub(super) fn floating_nodes(network: &Network) -> Vec<bool> {
    let mut floating = vec![false; network.nodes.len()];
    for &id in &network.order {
        let inherits = network.feeds[id.index()]
            .filter(|feed| !isolates(&network.branch(feed.branch).kind))
            .is_some_and(|feed| floating[feed.parent.index()]);
        floating[id.index()] = inherits || !network.node(id).reference_on.phases().is_empty();
    }
    floating
}

/// True where no conductor goes through.
fn isolates(kind: &BranchKind) -> bool {
    matches!(kind, BranchKind::Transformer(t) if !matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto))
}

/// For each node, where the voltage was last set on its way: the supply, a transformer's or a regulator's far node.
pub(super) fn set_points(network: &Network) -> Vec<NodeId> {
    let mut set_at = vec![network.supply.node; network.nodes.len()];
    for &id in &network.order {
        set_at[id.index()] = match network.feeds[id.index()] {
            None => id,
            Some(feed) => match network.branch(feed.branch).kind {
                BranchKind::Transformer(_) | BranchKind::Regulator(_) => id,
                BranchKind::Line(_) | BranchKind::Switch => set_at[feed.parent.index()],
            },
        };
    }
    set_at
}

/// Largest drop at a node from where its voltage was last set, percent of nominal, with its span.
///
/// The drop is the held voltage's magnitude less the node's, over the same span: both nodes are on
/// one side, so they are judged alike.
pub(super) fn drop_percent(
    network: &Network,
    solution: &Solution,
    floating: &[bool],
    set_at: &[NodeId],
    id: NodeId,
) -> Option<(f64, Across)> {
    let head = set_at[id.index()];
    if head == id {
        return None;
    }
    judged(network, solution, floating, id)
        .map(|(across, here)| (100.0 * (span_pu(network, solution, head, across) - here), across))
        .max_by(|a, b| a.0.total_cmp(&b.0))
}

fn keep(
    slot: &mut Option<Extreme>,
    value: f64,
    place: impl FnOnce() -> String,
    better: impl Fn(f64, f64) -> bool,
) {
    if slot.as_ref().is_none_or(|e| better(value, e.value)) {
        *slot = Some(Extreme { value, place: place() });
    }
}

/// Finds the extremes.
pub(super) fn glance(
    network: &Network,
    solution: &Solution,
    elements: &[ElementLoss],
    nodes: &[NodeSummary],
) -> Glance {
    let mut glance = Glance::default();
    let greater = |a: f64, b: f64| a > b;
    let (floating, set_at) = (floating_nodes(network), set_points(network));
    for (i, summary) in nodes.iter().enumerate() {
        let id = NodeId(i as u32);
        let name = &network.node(id).name;
        for (across, pu) in judged(network, solution, &floating, id) {
            keep(&mut glance.lowest_pu, pu, || format!("node {name}, {across}"), |a, b| a < b);
            keep(&mut glance.highest_pu, pu, || format!("node {name}, {across}"), greater);
        }
        if let Some((percent, across)) = drop_percent(network, solution, &floating, &set_at, id) {
            keep(&mut glance.drop_percent, percent, || format!("node {name}, {across}"), greater);
        }
        if let Some(percent) = summary.unbalance_percent {
            keep(&mut glance.unbalance_percent, percent, || format!("node {name}"), greater);
        }
        if let Some(volts) = summary.neutral_volts {
            keep(&mut glance.neutral_volts, volts, || format!("node {name}"), greater);
        }
    }
    for (b, branch) in network.branches.iter().enumerate() {
        let neutral =
            matches!(branch.kind, BranchKind::Line(_)) && Conductors::N.is_subset_of(branch.from_conductors);
        if neutral {
            let n = Conductor::N.slot();
            let amps = solution.from_amps[b][n].norm().max(solution.to_amps[b][n].norm());
            keep(&mut glance.neutral_amps, amps, || format!("line {}", branch.name), greater);
        }
    }
    for element in elements {
        if let Some(percent) = element.rating_percent {
            keep(
                &mut glance.rating_percent,
                percent,
                || format!("{} {}", element.kind, element.element),
                greater,
            );
        }
    }
    glance
}
