//! Rings that cannot be solved: those without any impedance, in which a current is not determined.

use std::collections::{HashMap, VecDeque};

use super::conductor::{Conductor, Conductors};
use super::draft::{Across, Draft};
use super::graph::{Graph, RawKind, place, shorten};
use crate::diagnostic::{Code, Diagnostics};

/// Reports every switch or regulator that closes a ring of nothing but switches and regulators; gives these branches.
pub(super) fn check_rings(draft: &Draft, graph: &Graph, diagnostics: &mut Diagnostics) -> Vec<usize> {
    let mut reported = Vec::new();
    let mut joined = Joined(HashMap::new());
    let mut seen: Vec<usize> = Vec::new();
    for (b, branch) in graph.branches.iter().enumerate() {
        if branch.state == super::draft::SwitchState::Open {
            continue;
        }
        let Some(conductors) = ideal_conductors(draft, graph, b) else { continue };
        let mut closes = false;
        for c in conductors.iter() {
            closes |= !joined.join((branch.from, c), (branch.to, c));
        }
        if closes {
            report(draft, graph, b, &path(graph, &seen, branch.from, branch.to), diagnostics);
            reported.push(b);
        }
        seen.push(b);
    }
    reported
}

/// Conductors of a branch without impedance.
fn ideal_conductors(draft: &Draft, graph: &Graph, branch: usize) -> Option<Conductors> {
    match graph.branches[branch].kind {
        RawKind::Switch(i) => Some(draft.switches[i].conductors),
        // The neutral goes through a bank, and so does a phase that others are regulated against.
        RawKind::Bank(bank) => Some(graph.banks[bank].iter().fold(Conductors::N, |all, &i| {
            let unit = &draft.regulators[i];
            let against = match unit.across {
                Across::Phase(other) => Conductors::NONE.with(other),
                Across::Neutral => Conductors::NONE,
            };
            all.union(unit.phases).union(against)
        })),
        RawKind::Line(_) | RawKind::Transformer(_) => None,
    }
}

/// Which conductors of which nodes are joined.
struct Joined(HashMap<(usize, Conductor), (usize, Conductor)>);

impl Joined {
    fn root(&mut self, mut at: (usize, Conductor)) -> (usize, Conductor) {
        while let Some(&up) = self.0.get(&at) {
            at = up;
        }
        at
    }

    /// Joins two; false where they were joined already.
    fn join(&mut self, one: (usize, Conductor), two: (usize, Conductor)) -> bool {
        let (one, two) = (self.root(one), self.root(two));
        if one != two {
            self.0.insert(one, two);
        }
        one != two
    }
}

/// A shortest path between two nodes over some branches.
fn path(graph: &Graph, branches: &[usize], from: usize, to: usize) -> Vec<usize> {
    let mut by: HashMap<usize, usize> = HashMap::new();
    let mut queue = VecDeque::from([from]);
    while let Some(node) = queue.pop_front() {
        for &b in branches {
            let branch = &graph.branches[b];
            if branch.from != node && branch.to != node {
                continue;
            }
            let other = branch.other(node);
            if other != from && !by.contains_key(&other) {
                by.insert(other, b);
                queue.push_back(other);
            }
        }
    }
    let (mut found, mut node) = (Vec::new(), to);
    while let Some(&b) = by.get(&node) {
        found.push(b);
        node = graph.branches[b].other(node);
    }
    found
}

fn report(draft: &Draft, graph: &Graph, closing: usize, others: &[usize], diagnostics: &mut Diagnostics) {
    if let &[other] = others {
        return report_parallel(draft, graph, closing, other, diagnostics);
    }
    let branch = &graph.branches[closing];
    let ring = std::iter::once(&closing).chain(others);
    let names: Vec<String> = ring.map(|&b| graph.branches[b].called()).collect();
    diagnostics.error(
        Code::ClosedRing,
        place(draft, branch.origin, "to", &graph.names[branch.to]),
        format!("{} closes a ring without any impedance: {}", branch.called(), shorten(&names, 12)),
        "open one of them (`state` open), or take it out: how current shares itself there cannot be told",
    );
}

/// Two branches without impedance between the same nodes: mostly units of one bank written apart.
fn report_parallel(
    draft: &Draft,
    graph: &Graph,
    closing: usize,
    other: usize,
    diagnostics: &mut Diagnostics,
) {
    let (branch, other) = (&graph.branches[closing], &graph.branches[other]);
    let cure = match (branch.kind, other.kind) {
        (RawKind::Bank(_), RawKind::Bank(_)) => {
            "write all units of one bank with the same `from` and the same `to`"
        }
        _ => "open one of them (`state` open), or take it out",
    };
    let (from, to) = (&graph.names[branch.from], &graph.names[branch.to]);
    diagnostics.error(
        Code::ClosedRing,
        place(draft, branch.origin, "to", to),
        format!(
            "{} closes a ring without any impedance with {}: both join nodes {from} and {to}",
            branch.called(),
            other.called()
        ),
        cure,
    );
}
