//! Words for a branch that closes a ring.

use super::draft::Draft;
use super::graph::{Graph, RawKind, Tree, place, shorten};
use crate::diagnostic::{Code, Diagnostics};

/// Reports the branch `closing`, naming all branches of its ring.
pub(super) fn report_ring(
    draft: &Draft,
    graph: &Graph,
    tree: &Tree,
    closing: usize,
    diagnostics: &mut Diagnostics,
) {
    let branch = &graph.branches[closing];
    let path = |mut node: usize| {
        let mut branches = Vec::new();
        while let Some(feed) = tree.feeds[node] {
            branches.push(feed.branch);
            node = feed.parent;
        }
        branches
    };
    let (mut one, mut two) = (path(branch.from), path(branch.to));
    while one.last().is_some() && one.last() == two.last() {
        one.pop();
        two.pop();
    }
    two.reverse();
    if let (&[other], []) | ([], &[other]) = (&one[..], &two[..]) {
        return report_parallel(draft, graph, closing, other, diagnostics);
    }
    let ring: Vec<String> =
        [closing].into_iter().chain(one).chain(two).map(|b| graph.branches[b].called()).collect();
    let called = branch.called();
    diagnostics.error(
        Code::ClosedRing,
        place(draft, branch.origin, "to", &graph.names[branch.to]),
        format!("{called} closes a ring: {}", shorten(&ring, 12)),
        "open one of them (`state` open), or take it out; only radial feeders are solved",
    );
}

/// A ring of two branches: mostly parallel circuits, or units of one bank written apart.
fn report_parallel(
    draft: &Draft,
    graph: &Graph,
    closing: usize,
    other: usize,
    diagnostics: &mut Diagnostics,
) {
    let (branch, other) = (&graph.branches[closing], &graph.branches[other]);
    let cure = match (branch.kind, other.kind) {
        (RawKind::Line(_), RawKind::Line(_)) => {
            "write equal parallel circuits as one row with their number in `sets`, or open or take out one of them"
        }
        (RawKind::Bank(_), RawKind::Bank(_)) => {
            "write all units of one bank with the same `from` and the same `to`"
        }
        (RawKind::Transformer(_), RawKind::Transformer(_)) => {
            "write equal transformers in parallel as one with the sum of their kva, or take one of them out"
        }
        _ => "open one of them (`state` open), or take it out; only radial feeders are solved",
    };
    let (from, to) = (&graph.names[branch.from], &graph.names[branch.to]);
    diagnostics.error(
        Code::ClosedRing,
        place(draft, branch.origin, "to", to),
        format!("{} closes a ring with {}: both join nodes {from} and {to}", branch.called(), other.called()),
        cure,
    );
}
