//! Which nodes there are, what joins them, and the tree that hangs from the supply.

use std::cmp::Reverse;
use std::collections::{BinaryHeap, HashMap, HashSet, VecDeque};

use super::conductor::Conductors;
use super::draft::{Draft, Name, SwitchState, TransformerRecord};
use super::model::End;
use super::ring::check_rings;
use super::transformer::VectorGroup;
use crate::diagnostic::{Code, Diagnostics, Origin, Place};

/// What a branch of the draft is: the kind and the index of its record.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum RawKind {
    Line(usize),
    Switch(usize),
    Transformer(usize),
    /// Index of a bank in [`Graph::banks`].
    Bank(usize),
}

/// A branch of the draft between two numbered nodes.
#[derive(Debug, Clone)]
pub(super) struct RawBranch {
    pub name: Name,
    pub from: usize,
    pub to: usize,
    pub kind: RawKind,
    pub state: SwitchState,
    pub origin: Option<Origin>,
}

impl RawBranch {
    /// The node at the other end of the branch.
    pub fn other(&self, node: usize) -> usize {
        if self.from == node { self.to } else { self.from }
    }

    /// `line L1`, `switch S3`: how messages call it.
    pub fn called(&self) -> String {
        let word = match self.kind {
            RawKind::Line(_) => "line",
            RawKind::Switch(_) => "switch",
            RawKind::Transformer(_) => "transformer",
            RawKind::Bank(_) => "regulator",
        };
        format!("{word} {}", self.name)
    }
}

/// Nodes, branches and adjacency of a draft.
pub(super) struct Graph {
    pub names: Vec<Name>,
    pub index: HashMap<Name, usize>,
    pub branches: Vec<RawBranch>,
    /// Regulator records of each bank.
    pub banks: Vec<Vec<usize>>,
    /// Further single-phase transformers of the bank that begins with a record.
    mates: HashMap<usize, Vec<usize>>,
    /// Branches at each node, open ones too: those of node `i` are `ends[first[i]..first[i + 1]]`.
    first: Vec<u32>,
    ends: Vec<u32>,
}

impl Graph {
    /// Numbers the nodes in the order their names first appear and collects the branches.
    pub fn new(draft: &Draft, diagnostics: &mut Diagnostics) -> Graph {
        let mut graph = Graph {
            names: Vec::new(),
            index: HashMap::with_capacity(draft.lines.len() + 16),
            branches: Vec::with_capacity(draft.lines.len() + draft.transformers.len() + 16),
            banks: Vec::new(),
            mates: HashMap::new(),
            first: Vec::new(),
            ends: Vec::new(),
        };
        for supply in &draft.supplies {
            graph.number(&supply.node);
        }
        graph.add_branches(draft, diagnostics);
        graph.connect();
        graph
    }

    fn add_branches(&mut self, draft: &Draft, diagnostics: &mut Diagnostics) {
        let mut add = |graph: &mut Graph, name: &Name, ends: [&Name; 2], kind, state, origin| {
            if ends[0] == ends[1] {
                diagnostics.error(
                    Code::SelfLoop,
                    place(draft, origin, "to", ends[1]),
                    format!("both ends of {name} are node {}", ends[1]),
                    "give the node at its other end in `to`",
                );
                return;
            }
            let (from, to) = (graph.number(ends[0]), graph.number(ends[1]));
            graph.branches.push(RawBranch { name: name.clone(), from, to, kind, state, origin });
        };
        for (i, r) in draft.lines.iter().enumerate() {
            add(self, &r.line, [&r.from, &r.to], RawKind::Line(i), r.state, r.origin);
        }
        for (i, r) in draft.switches.iter().enumerate() {
            add(self, &r.switch, [&r.from, &r.to], RawKind::Switch(i), r.state, r.origin);
        }
        let mut units: HashMap<(&Name, &Name), usize> = HashMap::new();
        for (i, r) in draft.transformers.iter().enumerate() {
            if joins_bank(r) {
                let first = *units.entry((&r.from, &r.to)).or_insert(i);
                if first != i {
                    self.mates.entry(first).or_default().push(i);
                    continue;
                }
            }
            let kind = RawKind::Transformer(i);
            add(self, &r.transformer, [&r.from, &r.to], kind, SwitchState::Closed, r.origin);
        }
        let mut banks: HashMap<(&Name, &Name), usize> = HashMap::new();
        for (i, r) in draft.regulators.iter().enumerate() {
            if let Some(&bank) = banks.get(&(&r.from, &r.to)) {
                self.banks[bank].push(i);
                continue;
            }
            let bank = self.banks.len();
            self.banks.push(vec![i]);
            banks.insert((&r.from, &r.to), bank);
            add(self, &r.regulator, [&r.from, &r.to], RawKind::Bank(bank), SwitchState::Closed, r.origin);
        }
    }

    /// Transformer records of the bank that begins with one: itself, and its mates.
    pub fn units_of(&self, first: usize) -> impl Iterator<Item = usize> + '_ {
        std::iter::once(first).chain(self.mates.get(&first).into_iter().flatten().copied())
    }

    fn number(&mut self, name: &Name) -> usize {
        if let Some(&node) = self.index.get(name) {
            return node;
        }
        let node = self.names.len();
        self.names.push(name.clone());
        self.index.insert(name.clone(), node);
        node
    }

    fn connect(&mut self) {
        self.first = vec![0; self.names.len() + 1];
        for branch in &self.branches {
            self.first[branch.from + 1] += 1;
            self.first[branch.to + 1] += 1;
        }
        for i in 1..self.first.len() {
            self.first[i] += self.first[i - 1];
        }
        let mut next = self.first.clone();
        self.ends = vec![0; 2 * self.branches.len()];
        for (b, branch) in self.branches.iter().enumerate() {
            for node in [branch.from, branch.to] {
                self.ends[next[node] as usize] = b as u32;
                next[node] += 1;
            }
        }
    }

    /// Indices of the branches at a node, open ones too.
    pub fn at(&self, node: usize) -> impl Iterator<Item = usize> + '_ {
        self.ends[self.first[node] as usize..self.first[node + 1] as usize].iter().map(|&b| b as usize)
    }

    /// Indices of the closed branches at a node.
    pub fn closed_at(&self, node: usize) -> impl Iterator<Item = usize> + '_ {
        self.at(node).filter(|&b| self.branches[b].state == SwitchState::Closed)
    }
}

/// Single-phase units of two windings form one bank with others between the same two nodes.
fn joins_bank(record: &TransformerRecord) -> bool {
    matches!(record.group, VectorGroup::Single { .. } | VectorGroup::SingleAuto)
}

/// The place of a record's cell, where the draft came from files.
pub(super) fn place(draft: &Draft, origin: Option<Origin>, column: &str, found: &str) -> Option<Place> {
    draft.sources.place(origin?, Some(column), Some(found))
}

/// How a node of the graph is fed.
#[derive(Debug, Clone, Copy)]
pub(super) struct RawFeed {
    pub branch: usize,
    pub parent: usize,
    pub upstream: End,
}

/// A closed branch between two nodes that are fed without it; `far` is its other end.
#[derive(Debug, Clone, Copy)]
pub(super) struct RawTie {
    pub feed: RawFeed,
    pub far: usize,
}

/// The tree from the supply: nodes breadth first, how each is fed, and what closes rings.
pub(super) struct Tree {
    pub ties: Vec<RawTie>,
    pub order: Vec<usize>,
    pub feeds: Vec<Option<RawFeed>>,
    pub fed: Vec<bool>,
}

/// Walks outwards from the supply over closed branches; a branch between nodes that are fed already is a tie.
pub(super) fn grow(draft: &Draft, graph: &Graph, root: usize, diagnostics: &mut Diagnostics) -> Tree {
    let count = graph.names.len();
    let mut tree =
        Tree { ties: Vec::new(), order: vec![root], feeds: vec![None; count], fed: vec![false; count] };
    tree.fed[root] = true;
    let mut closing = HashSet::new();
    let mut next = 0;
    while next < tree.order.len() {
        let node = tree.order[next];
        next += 1;
        for b in graph.closed_at(node) {
            if tree.feeds[node].is_some_and(|f| f.branch == b) {
                continue;
            }
            let branch = &graph.branches[b];
            let other = branch.other(node);
            let upstream = if branch.from == node { End::From } else { End::To };
            let feed = RawFeed { branch: b, parent: node, upstream };
            if tree.fed[other] {
                // A branch to a child is met again from there.
                if tree.feeds[other].is_none_or(|f| f.branch != b) && closing.insert(b) {
                    tree.ties.push(RawTie { feed, far: other });
                }
                continue;
            }
            tree.fed[other] = true;
            tree.feeds[other] = Some(feed);
            tree.order.push(other);
        }
    }
    if !tree.ties.is_empty() {
        let reported = check_rings(draft, graph, diagnostics);
        tree = widest(draft, graph, root);
        // What was told once is not told again in other words.
        tree.ties.retain(|tie| !reported.contains(&tie.feed.branch));
    }
    tree
}

/// The tree of a network with rings: every node is fed by the way that carries most conductors, and
/// of such the one with fewest branches; the branches left over are ties.
fn widest(draft: &Draft, graph: &Graph, root: usize) -> Tree {
    let count = graph.names.len();
    let mut tree =
        Tree { ties: Vec::new(), order: Vec::new(), feeds: vec![None; count], fed: vec![false; count] };
    // Widest first, then nearest, then in the order met.
    let mut queue = BinaryHeap::new();
    let mut met = Reverse(0u32);
    queue.push((usize::MAX, Reverse(0u32), met, root, None::<(usize, usize)>));
    while let Some((width, Reverse(depth), _, node, by)) = queue.pop() {
        let upstream = |b: usize| if graph.branches[b].to == node { End::From } else { End::To };
        let feed = by.map(|(branch, parent)| RawFeed { branch, parent, upstream: upstream(branch) });
        if tree.fed[node] {
            tree.ties.extend(feed.map(|feed| RawTie { feed, far: node }));
            continue;
        }
        tree.fed[node] = true;
        tree.feeds[node] = feed;
        tree.order.push(node);
        for b in graph.closed_at(node) {
            let other = graph.branches[b].other(node);
            let known = tree.feeds[node].is_some_and(|f| f.branch == b) || tree.fed[other];
            if known {
                continue;
            }
            met.0 += 1;
            let width = width.min(conductors_of(draft, graph, b));
            queue.push((width, Reverse(depth + 1), met, other, Some((b, node))));
        }
    }
    tree
}

/// How many conductors a branch takes on.
fn conductors_of(draft: &Draft, graph: &Graph, branch: usize) -> usize {
    match graph.branches[branch].kind {
        RawKind::Bank(bank) => {
            let units = graph.banks[bank].iter().map(|&i| draft.regulators[i].phases);
            // The neutral goes through where there is one.
            units.fold(Conductors::N, Conductors::union).count()
        }
        RawKind::Transformer(first) => {
            let units = graph.units_of(first).map(|i| draft.transformers[i].terminals);
            let far =
                units.map(|t| t.map_or(Conductors::ABCN, |[from, to]| from.phases().union(to.phases())));
            far.fold(Conductors::N, Conductors::union).count()
        }
        kind => written_conductors(draft, kind).map_or(0, Conductors::count),
    }
}

/// Joins names with commas, the first `most` of them, and counts the rest.
pub(super) fn shorten(names: &[String], most: usize) -> String {
    let shown = names.iter().take(most).cloned().collect::<Vec<_>>().join(", ");
    match names.len().saturating_sub(most) {
        0 => shown,
        more => format!("{shown} and {more} more"),
    }
}

/// Reports every part without supply: behind an open switch or line a warning, else an error.
pub(super) fn report_unfed(draft: &Draft, graph: &Graph, tree: &Tree, diagnostics: &mut Diagnostics) {
    if tree.order.len() == graph.names.len() {
        return;
    }
    let part = parts(graph, tree);
    let behind_open = reached_over_open(graph, tree, &part);
    let watts = unfed_watts(draft, graph, &part);
    let alike: HashMap<String, usize> =
        tree.order.iter().map(|&node| (plain(&graph.names[node]), node)).collect();
    let count = part.iter().flatten().max().map_or(0, |&p| p + 1);
    let mut members: Vec<Vec<usize>> = vec![Vec::new(); count];
    for (node, p) in part.iter().enumerate() {
        if let Some(p) = p {
            members[*p].push(node);
        }
    }
    for (p, nodes) in members.iter().enumerate() {
        if nodes.iter().any(|&n| draft.unread.joins(&graph.names[n])) {
            continue; // a branch that was told as faulty may feed it
        }
        if nodes.len() == 1 && graph.at(nodes[0]).all(|b| is_switch(graph, b)) && watts[p] == 0.0 {
            continue; // nothing but a switch end: told as an isolated switch
        }
        let names: Vec<String> = nodes.iter().map(|&n| graph.names[n].to_string()).collect();
        let what = match names.len() {
            1 => format!("node {}", names[0]),
            n => format!("{n} nodes ({})", shorten(&names, 6)),
        };
        let verb = |one: &'static str, many: &'static str| if nodes.len() == 1 { one } else { many };
        let load =
            if watts[p] == 0.0 { String::new() } else { format!(", with {} kW of load,", watts[p] / 1e3) };
        let at = nodes.first().and_then(|&n| first_place(draft, graph, n));
        if let Some(open) = behind_open[p] {
            let called = graph.branches[open].called();
            diagnostics.warning(
                Code::SwitchedOff,
                place(draft, graph.branches[open].origin, "state", "open"),
                format!("{what}{load} {} no supply: {called} is open", verb("has", "have")),
                format!("{} left out; close {called} for a supply", verb("it is", "they are")),
            );
            continue;
        }
        let slip = nodes.iter().find_map(|&n| {
            let near = *alike.get(&plain(&graph.names[n]))?;
            Some(format!("did you mean node {:?} where {:?} is written?", graph.names[near], graph.names[n]))
        });
        let cure = slip.unwrap_or_else(|| {
            let it = verb("it", "them");
            format!("join {it} to the feeder with a line, switch or transformer, or take {it} out")
        });
        diagnostics.error(
            Code::NotFed,
            at,
            format!("{what}{load} {} not fed from the source: no closed path leads there", verb("is", "are")),
            cure,
        );
    }
}

fn is_switch(graph: &Graph, branch: usize) -> bool {
    matches!(graph.branches[branch].kind, RawKind::Switch(_))
}

/// A name without case and spaces, to find slips.
fn plain(name: &str) -> String {
    name.chars().filter(|c| !c.is_whitespace()).flat_map(char::to_lowercase).collect()
}

/// Where a node is first written: the row of its first branch.
fn first_place(draft: &Draft, graph: &Graph, node: usize) -> Option<Place> {
    let branch = &graph.branches[graph.at(node).next()?];
    let column = if branch.from == node { "from" } else { "to" };
    place(draft, branch.origin, column, &graph.names[node])
}

/// Number of the unfed part each node belongs to; `None` where it is fed.
fn parts(graph: &Graph, tree: &Tree) -> Vec<Option<usize>> {
    let mut part = vec![None; graph.names.len()];
    let mut count = 0;
    for start in 0..graph.names.len() {
        if tree.fed[start] || part[start].is_some() {
            continue;
        }
        part[start] = Some(count);
        let mut queue = VecDeque::from([start]);
        while let Some(node) = queue.pop_front() {
            for b in graph.closed_at(node) {
                let other = graph.branches[b].other(node);
                if part[other].is_none() {
                    part[other] = Some(count);
                    queue.push_back(other);
                }
            }
        }
        count += 1;
    }
    part
}

/// For each unfed part, an open branch that would feed it, directly or through other parts.
fn reached_over_open(graph: &Graph, tree: &Tree, part: &[Option<usize>]) -> Vec<Option<usize>> {
    let count = part.iter().flatten().max().map_or(0, |&p| p + 1);
    let mut by = vec![None; count];
    let open: Vec<usize> =
        (0..graph.branches.len()).filter(|&b| graph.branches[b].state == SwitchState::Open).collect();
    let mut found = true;
    while found {
        found = false;
        for &b in &open {
            let RawBranch { from, to, .. } = graph.branches[b];
            let live = |node: usize| tree.fed[node] || part[node].is_some_and(|p| by[p].is_some());
            let (one, two) = (live(from), live(to));
            if one == two {
                continue;
            }
            if let Some(p) = part[if one { to } else { from }] {
                by[p] = Some(b);
                found = true;
            }
        }
    }
    by
}

fn unfed_watts(draft: &Draft, graph: &Graph, part: &[Option<usize>]) -> Vec<f64> {
    let count = part.iter().flatten().max().map_or(0, |&p| p + 1);
    let mut watts = vec![0.0; count];
    for load in &draft.loads {
        if let super::draft::LoadSite::Node(name) = &load.site
            && let Some(p) = graph.index.get(name).and_then(|&node| part[node])
        {
            watts[p] += load.watts;
        }
    }
    watts
}

/// Warns of switches with an end where nothing else connects.
pub(super) fn report_isolated_switches(
    draft: &Draft,
    graph: &Graph,
    root: Option<usize>,
    diagnostics: &mut Diagnostics,
) {
    if graph.branches.iter().all(|b| !matches!(b.kind, RawKind::Switch(_))) {
        return;
    }
    let mut used: HashSet<usize> = root.into_iter().collect();
    let sites = draft.loads.iter().filter_map(|l| match &l.site {
        super::draft::LoadSite::Node(name) => Some(name),
        super::draft::LoadSite::Line(_) => None,
    });
    used.extend(
        sites
            .chain(draft.capacitors.iter().map(|c| &c.node))
            .chain(draft.generators.iter().map(|g| &g.node))
            .chain(draft.motors.iter().map(|m| &m.node))
            .filter_map(|n| graph.index.get(n).copied()),
    );
    for (b, branch) in graph.branches.iter().enumerate() {
        if !is_switch(graph, b) {
            continue;
        }
        let lonely: Vec<usize> = [branch.from, branch.to]
            .into_iter()
            .filter(|&n| graph.at(n).count() == 1 && !used.contains(&n))
            .filter(|&n| !draft.unread.joins(&graph.names[n]) && !draft.unread.loads)
            .collect();
        if let Some(&node) = lonely.first() {
            let column = if branch.from == node { "from" } else { "to" };
            diagnostics.warning(
                Code::IsolatedSwitch,
                place(draft, branch.origin, column, &graph.names[node]),
                format!(
                    "{} leads nowhere: nothing else connects at node {}",
                    branch.called(),
                    graph.names[node]
                ),
                "check the node's name, or take the switch out",
            );
        }
    }
}

/// Conductors a record of the draft names for a branch; `None` for transformers and banks.
pub(super) fn written_conductors(draft: &Draft, kind: RawKind) -> Option<Conductors> {
    match kind {
        RawKind::Line(i) => Some(draft.lines[i].conductors),
        RawKind::Switch(i) => Some(draft.switches[i].conductors),
        RawKind::Transformer(_) | RawKind::Bank(_) => None,
    }
}
