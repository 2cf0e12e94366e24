//! From a [`Draft`] to a [`Network`]: the only way to make one.

use super::branches::Branches;
use super::carry::{Carried, carry};
use super::draft::Draft;
use super::earth::{Given, SideEarth, Standing, sides};
use super::graph::{Graph, RawFeed, RawTie, Tree, grow, place, report_isolated_switches, report_unfed};
use super::load::CapacitorBank;
use super::metering::Metered;
use super::model::{BranchId, Feed, Network, Node, NodeId, SOLID_EARTH_OHM, Stay, StayPlace, Tie};
use super::plausible;
use super::supply::{Supply, circulant, held_volts, sequence_impedance};
use super::validate;
use crate::diagnostic::{Code, Diagnostics, Origin, nearest};
use crate::math::PhaseMatrix;

/// What [`build`] gives: the network where there are no errors, and all remarks.
#[derive(Debug)]
pub struct Built {
    /// The network; `None` where an error was found.
    pub network: Option<Network>,
    /// Errors and warnings.
    pub diagnostics: Diagnostics,
}

/// Checks a draft as a whole and joins it to a network.
///
/// Every fault is gathered; a network comes out only where none is an error. Parts without
/// supply because of an open switch or line are left out with a warning.
pub fn build(draft: &Draft) -> Built {
    let mut diagnostics = Diagnostics::new();
    let network = Builder { draft, diagnostics: &mut diagnostics }.run();
    if let Some(network) = &network {
        plausible::sizes(draft, network, &mut diagnostics);
        plausible::star_points(draft, network, &mut diagnostics);
    }
    let network = if diagnostics.has_errors() { None } else { network };
    Built { network, diagnostics }
}

pub(super) struct Builder<'a> {
    pub(super) draft: &'a Draft,
    pub(super) diagnostics: &'a mut Diagnostics,
}

/// The draft joined up: graph, tree and what each node carries.
pub(super) struct Joined {
    pub(super) graph: Graph,
    pub(super) tree: Tree,
    pub(super) carried: Carried,
    pub(super) given: Given,
    pub(super) sides: Vec<SideEarth>,
    pub(super) stays: Vec<(usize, SideEarth)>,
}

impl Builder<'_> {
    fn run(&mut self) -> Option<Network> {
        let draft = self.draft;
        validate::constructions(draft, self.diagnostics);
        self.check_profiles();
        let graph = Graph::new(draft, self.diagnostics);
        let root = self.supply_node();
        report_isolated_switches(draft, &graph, root, self.diagnostics);
        let line_constructions = self.line_constructions();
        let electrodes = self.electrodes(&graph);
        let root = root?;
        if self.is_source_lonely(&graph, root) {
            return None;
        }
        let tree = grow(draft, &graph, root, self.diagnostics);
        report_unfed(draft, &graph, &tree, self.diagnostics);
        let carried = carry(draft, &graph, &tree, &electrodes, self.diagnostics);
        self.check_electrodes(&graph, &tree, &carried);
        let given = Given { electrodes, line_constructions };
        let Standing { sides, stays } = sides(draft, &graph, &tree, &carried, &given, self.diagnostics);
        self.assemble(&Joined { graph, tree, carried, given, sides, stays })
    }

    /// Index of the supply node: always 0, where there is a supply.
    fn supply_node(&mut self) -> Option<usize> {
        let Some((first, others)) = self.draft.supplies.split_first() else {
            if self.draft.unread.supply {
                return None;
            }
            self.diagnostics.error(
                Code::NoSource,
                None,
                "the network has no source",
                "give its node and voltage in one row of source.csv",
            );
            return None;
        };
        for other in others {
            self.diagnostics.error(
                Code::TwoSources,
                place(self.draft, other.origin, "node", &other.node),
                format!("a second source, at node {}; the first is at node {}", other.node, first.node),
                "keep one row in source.csv: a radial feeder has one supply",
            );
        }
        validate::supply(self.draft, first, self.diagnostics);
        Some(0)
    }

    /// Reports a source at a node that nothing joins; all else would be reported as not fed.
    fn is_source_lonely(&mut self, graph: &Graph, root: usize) -> bool {
        if graph.branches.is_empty() || graph.at(root).next().is_some() {
            return false;
        }
        let name = &graph.names[root];
        if self.draft.unread.joins(name) {
            return false;
        }
        let others = graph.names.iter().filter(|n| *n != name).map(|n| &**n);
        let cure = match nearest(name, others) {
            Some(near) => format!("did you mean {near:?}?"),
            None => "write the node where the feeder begins, as it is written in the other files".to_string(),
        };
        let origin = self.draft.supplies.first().and_then(|s| s.origin);
        let message =
            format!("the source is at node {name:?}, but no line, switch or transformer connects it");
        self.diagnostics.error(Code::UnknownNode, place(self.draft, origin, "node", name), message, cure);
        true
    }

    /// Electrode of each node of the graph; data for a node that does not exist is an error.
    fn electrodes(&mut self, graph: &Graph) -> Vec<Option<f64>> {
        let mut electrodes = vec![None; graph.names.len()];
        for record in &self.draft.nodes {
            match graph.index.get(&record.node) {
                Some(&node) => electrodes[node] = record.earth_ohm.map(|ohm| ohm.max(SOLID_EARTH_OHM)),
                None => self.unknown_node(graph, &record.node, record.origin, "nodes.csv names"),
            }
        }
        electrodes
    }

    pub(super) fn unknown_node(&mut self, graph: &Graph, node: &str, origin: Option<Origin>, who: &str) {
        if self.draft.unread.joins(node) {
            return;
        }
        let cure = match nearest(node, graph.names.iter().map(|n| &**n)) {
            _ if self.draft.lines.iter().any(|l| &*l.line == node) => self.line_for_node(node, who),
            Some(near) => format!("did you mean {near:?}?"),
            None => "join it with a line, switch or transformer, or take the row out".to_string(),
        };
        let message = format!("{who} node {node:?}, but no line, switch or transformer connects it");
        self.diagnostics.error(Code::UnknownNode, place(self.draft, origin, "node", node), message, cure);
    }

    /// The cure where a line stands in the place of a node.
    fn line_for_node(&self, name: &str, who: &str) -> String {
        match who.starts_with("load ") {
            true => format!("{name} is a line: put it in column `line`"),
            false => format!("{name} is a line: name the node at one of its ends"),
        }
    }

    fn check_electrodes(&mut self, graph: &Graph, tree: &Tree, carried: &Carried) {
        for record in &self.draft.nodes {
            let Some(&node) = graph.index.get(&record.node) else { continue };
            let Some(ohm) = record.earth_ohm else { continue };
            if tree.fed[node] && !carried.conductors[node].has_neutral() {
                self.diagnostics.error(
                    Code::NoNeutral,
                    place(self.draft, record.origin, "earth_ohm", &ohm.to_string()),
                    format!(
                        "node {} has an electrode but no neutral; it carries {}",
                        record.node, carried.conductors[node]
                    ),
                    "carry n on the line that feeds it, or leave earth_ohm blank",
                );
            }
        }
    }

    fn assemble(&mut self, joined: &Joined) -> Option<Network> {
        let (graph, tree) = (&joined.graph, &joined.tree);
        let mut new_node = vec![None; graph.names.len()];
        let mut nodes = Vec::with_capacity(tree.order.len());
        for node in (0..graph.names.len()).filter(|&n| tree.fed[n]) {
            new_node[node] = Some(NodeId(nodes.len() as u32));
            nodes.push(Node {
                name: graph.names[node].clone(),
                conductors: joined.carried.conductors[node],
                nominal_volts: joined.carried.nominal_volts[node],
                earth_ohm: joined.given.electrodes[node],
                reference_siemens: joined.sides[node].reference_siemens,
                reference_on: joined.sides[node].on,
                xy: None,
            });
        }
        for record in &self.draft.nodes {
            if let Some(id) = graph.index.get(&record.node).and_then(|&n| new_node[n]) {
                nodes[id.index()].xy = record.xy;
            }
        }
        let parts = self.branches(joined, &new_node)?;
        let supply = self.supply(new_node[0]?)?;
        let feeds = feeds(tree, &new_node, &parts.new_branch, nodes.len());
        let order: Vec<NodeId> = tree.order.iter().filter_map(|&n| new_node[n]).collect();
        let ties = ties(tree, &new_node, &parts.new_branch);
        let stays = joined.stays.iter().filter_map(|&(part, earth)| {
            let place = match part.checked_sub(graph.names.len()) {
                None => StayPlace::Node(new_node[part]?),
                Some(tie) => StayPlace::TieEnd(tie),
            };
            Some(Stay { place, siemens: earth.reference_siemens, on: earth.on })
        });
        let stays = stays.collect();
        let (loads, capacitor_banks) = self.shunts(joined, &new_node, &parts);
        let (loads, meters) = self.meters(Metered {
            joined,
            parts: &parts,
            new_node: &new_node,
            feeds: &feeds,
            order: &order,
            ties: ties.as_deref().unwrap_or_default(),
            loads,
        });
        let generators = self.generators(joined, &new_node);
        let motors = self.motors(joined, &new_node);
        let study = self.draft.study.clone();
        let Branches { branches, constructions, .. } = parts;
        Some(Network {
            at: self.draft.at.clone(),
            study,
            supply,
            nodes,
            branches,
            constructions,
            loads,
            capacitors: CapacitorBank::in_service(&capacitor_banks),
            capacitor_banks,
            meters,
            generators,
            motors,
            feeds,
            order,
            ties: ties?,
            stays,
        })
    }

    fn supply(&self, node: NodeId) -> Option<Supply> {
        let record = self.draft.supplies.first()?;
        let impedance =
            sequence_impedance(record).map_or_else(PhaseMatrix::zeros, |(z1, z0)| circulant(z1, z0));
        Some(Supply {
            node,
            nominal_volts: record.nominal_volts,
            held_volts: held_volts(record),
            impedance,
            earth_ohm: record.earth_ohm,
        })
    }
}

/// The ties by new indices; `None` where a branch of one could not be made, which was told.
fn ties(tree: &Tree, new_node: &[Option<NodeId>], new_branch: &[Option<BranchId>]) -> Option<Vec<Tie>> {
    let of = |tie: &RawTie| {
        let RawFeed { branch, parent, upstream } = tie.feed;
        Some(Tie { branch: new_branch[branch]?, near: new_node[parent]?, far: new_node[tie.far]?, upstream })
    };
    tree.ties.iter().map(of).collect()
}

fn feeds(
    tree: &Tree,
    new_node: &[Option<NodeId>],
    new_branch: &[Option<BranchId>],
    count: usize,
) -> Vec<Option<Feed>> {
    let mut feeds = vec![None; count];
    for (node, raw) in tree.feeds.iter().enumerate() {
        let (Some(id), Some(raw)) = (new_node[node], raw) else { continue };
        if let (Some(branch), Some(parent)) = (new_branch[raw.branch], new_node[raw.parent]) {
            feeds[id.index()] = Some(Feed { branch, parent, upstream: raw.upstream });
        }
    }
    feeds
}
