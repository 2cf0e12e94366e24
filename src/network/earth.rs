//! Which galvanic sides anything holds to earth, and a stated reference for those that nothing does.
//!
//! A side is what lines, switches and regulators join without a transformer between. A delta
//! side, or a neutral earthed nowhere, has no defined voltage to earth; it gets a susceptance of
//! [`REFERENCE_SHARE`] of its transformer's rating at its first node, and a warning says so.
//!
//! A star winding with neutral whose other winding is a star without (Yyn), or a zigzag, cannot carry unbalanced
//! current: nothing balances it on the other side. Its phases float even where its neutral is
//! earthed, and loads from phase to neutral have no return path there.

use std::collections::{HashMap, HashSet};

use super::carry::Carried;
use super::conductor::{Conductors, Connection};
use super::draft::{Draft, TransformerRecord};
use super::graph::{Graph, RawFeed, RawKind, Tree, place};
use super::load::LoadModel;
use super::model::{End, nominal_phase_volts};
use super::transformer::{NeutralPoint, VectorGroup, Winding};
use crate::diagnostic::{Code, Diagnostics};
use crate::math::PhaseMatrix;

/// Reference susceptance of a side without earth, as a share of the transformer's `S / U^2`: of the
/// order of the stray capacitance of a real system (from memory). Much less would drown in rounding.
const REFERENCE_SHARE: f64 = 1e-4;

/// What the draft gives, resolved to indices: electrode of each node, construction of each line.
pub(super) struct Given {
    pub electrodes: Vec<Option<f64>>,
    pub line_constructions: Vec<Option<usize>>,
}

/// How the side that begins at a node stands to earth.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct SideEarth {
    /// Reference susceptance on each of `on`, siemens; zero where something holds the side.
    pub reference_siemens: f64,
    pub on: Conductors,
    /// True where the winding that feeds the side cannot carry unbalanced current.
    pub unbalance_blocked: bool,
}

/// How the sides stand to earth.
pub(super) struct Standing {
    /// Each side, at the index of its first node.
    pub sides: Vec<SideEarth>,
    /// What stands on parts that only ties hold: at a node, or beyond that many nodes at the end of a tie.
    pub stays: Vec<(usize, SideEarth)>,
}

/// A part that has no earth of its own with the rings opened: a side, or the far end of a tie.
struct Floating {
    part: usize,
    earth: SideEarth,
}

/// How each side stands to earth; a side floats only where nothing that a tie joins it to is earthed.
pub(super) fn sides(
    draft: &Draft,
    graph: &Graph,
    tree: &Tree,
    carried: &Carried,
    given: &Given,
    diagnostics: &mut Diagnostics,
) -> Standing {
    let count = graph.names.len();
    let mut standing = Standing { sides: vec![SideEarth::default(); count], stays: Vec::new() };
    let is_head = |n: &usize| carried.side[*n] == *n;
    let heads: Vec<usize> = tree.order.iter().copied().filter(is_head).collect();
    if heads.len() == 1 && tree.ties.is_empty() {
        return standing;
    }
    let held = holds(draft, graph, tree, carried, given);
    let groups = groups(draft, graph, tree, carried);
    let mut floating = Vec::new();
    let mut firm = HashSet::new();
    let mut blocked: HashMap<usize, bool> = HashMap::new();
    let tails = (0..tree.ties.len()).map(|t| count + t).filter(|&t| groups[t].is_some());
    for part in heads.iter().copied().chain(tails) {
        let Some(group) = groups[part] else { continue };
        let earth = fed_by(graph, tree, part).and_then(|(feed, node)| {
            let RawKind::Transformer(i) = graph.branches[feed.branch].kind else { return None };
            let there = if part < count { carried.conductors[node] } else { far_end(carried, feed) };
            part_earth(&draft.transformers[i], feed.upstream, there, carried.nominal_volts[node], &held[part])
        });
        *blocked.entry(group).or_insert(true) &= earth.is_some_and(|e| e.unbalance_blocked);
        match earth {
            Some(earth) if earth.reference_siemens > 0.0 => floating.push(Floating { part, earth }),
            _ => {
                firm.insert(group);
            }
        }
    }
    for Floating { part, earth } in floating {
        let Some(group) = groups[part] else { continue };
        // The first part of a group that floats as a whole gets the reference; the others follow it.
        if !firm.insert(group) || part >= count {
            // Its current is taken out again, so it may be of the size of the rating: nothing drowns then.
            let reference_siemens = earth.reference_siemens / REFERENCE_SHARE;
            standing.stays.push((part, SideEarth { reference_siemens, ..earth }));
            continue;
        }
        standing.sides[part] = earth;
        let Some(feed) = tree.feeds[part] else { continue };
        if let RawKind::Transformer(i) = graph.branches[feed.branch].kind {
            warn(draft, graph, part, &draft.transformers[i], &standing.sides[part], diagnostics);
        }
    }
    for head in heads {
        standing.sides[head].unbalance_blocked =
            groups[head].is_some_and(|g| blocked.get(&g).copied().unwrap_or(false));
    }
    standing
}

/// What feeds a part, and the node there.
fn fed_by(graph: &Graph, tree: &Tree, part: usize) -> Option<(RawFeed, usize)> {
    match part.checked_sub(graph.names.len()) {
        None => tree.feeds[part].map(|feed| (feed, part)),
        Some(t) => tree.ties.get(t).map(|tie| (tie.feed, tie.far)),
    }
}

/// Conductors at the end of a tie away from the source.
fn far_end(carried: &Carried, feed: RawFeed) -> Conductors {
    carried.ends[feed.branch][if feed.upstream == End::From { 1 } else { 0 }]
}

/// How a part that a transformer feeds stands to earth by itself.
fn part_earth(
    record: &TransformerRecord,
    upstream: End,
    conductors: Conductors,
    volts: f64,
    hold: &Hold,
) -> Option<SideEarth> {
    let wanted = REFERENCE_SHARE * record.rated_va / (volts * volts);
    let unbalance_blocked = blocks_unbalance(record, upstream);
    let neutral = Conductors::N.intersection(conductors);
    let on = match unbalance_blocked {
        true if hold.neutral => conductors.phases(),
        true => conductors,
        false if hold.neutral => return None,
        false if neutral.is_empty() => conductors,
        false => neutral,
    };
    let firm = hold.phases >= wanted || !wanted.is_finite();
    let reference_siemens = if firm { 0.0 } else { wanted };
    Some(SideEarth { reference_siemens, on, unbalance_blocked })
}

/// The group of parts that ties join without a transformer between, of each side's first node and of
/// the far end of each tie that is a transformer.
fn groups(draft: &Draft, graph: &Graph, tree: &Tree, carried: &Carried) -> Vec<Option<usize>> {
    let count = graph.names.len();
    let mut up: Vec<usize> = (0..count + tree.ties.len()).collect();
    fn root(up: &mut [usize], mut part: usize) -> usize {
        while up[part] != part {
            up[part] = up[up[part]];
            part = up[part];
        }
        part
    }
    let mut own = vec![false; tree.ties.len()];
    for (t, tie) in tree.ties.iter().enumerate() {
        own[t] = isolates(draft, graph, carried, tie.feed);
        let near = if own[t] { count + t } else { carried.side[tie.feed.parent] };
        let (one, two) = (root(&mut up, near), root(&mut up, carried.side[tie.far]));
        up[one] = two;
    }
    (0..up.len())
        .map(|part| match part.checked_sub(count) {
            None => (carried.side[part] == part).then(|| root(&mut up, part)),
            Some(t) => own[t].then(|| root(&mut up, part)),
        })
        .collect()
}

/// True where a side begins at the far end of a branch: no conductor goes through, or it is an
/// autotransformer whose neutral begins there.
fn isolates(draft: &Draft, graph: &Graph, carried: &Carried, feed: RawFeed) -> bool {
    let RawKind::Transformer(i) = graph.branches[feed.branch].kind else { return false };
    let near = carried.neutrals[feed.branch][if feed.upstream == End::From { 0 } else { 1 }];
    let auto = matches!(draft.transformers[i].group, VectorGroup::Auto | VectorGroup::SingleAuto);
    !auto || near == NeutralPoint::Shared
}

fn warn(
    draft: &Draft,
    graph: &Graph,
    head: usize,
    record: &TransformerRecord,
    side: &SideEarth,
    diagnostics: &mut Diagnostics,
) {
    let node = &graph.names[head];
    let (what, cure) = if side.unbalance_blocked {
        let cure = "three single-phase units joined so cannot carry unbalanced current; choose YNyn or Dyn where loads go from phase to neutral";
        ("the phases", cure.to_string())
    } else if side.on == Conductors::N {
        ("the neutral", format!("give its electrode: earth_ohm at node {node} in nodes.csv"))
    } else {
        let cure = "where it is earthed, say how; if it is meant to float, voltages between phases are right and those to earth are not to be relied on";
        ("the side", cure.to_string())
    };
    let verb = if what == "the phases" { "are" } else { "is" };
    let pronoun = if what == "the phases" { "they are" } else { "it is" };
    diagnostics.warning(
        Code::NotEarthed,
        place(draft, record.origin, "group", &record.group.to_string()),
        format!(
            "{what} fed by transformer {} at node {node} {verb} earthed nowhere; {pronoun} held near earth by {:.3} microsiemens",
            record.transformer,
            side.reference_siemens * 1e6,
        ),
        cure,
    );
}

/// What holds a side to earth.
#[derive(Debug, Clone, Copy, Default)]
struct Hold {
    /// Through its phases, siemens.
    phases: f64,
    /// Its neutral, by an electrode or the winding's earthing.
    neutral: bool,
}

/// What holds each part with the rings opened: each side, at the index of its first node, and
/// beyond the nodes the far end of each tie.
fn holds(draft: &Draft, graph: &Graph, tree: &Tree, carried: &Carried, given: &Given) -> Vec<Hold> {
    let count = graph.names.len();
    let mut held = vec![Hold::default(); count + tree.ties.len()];
    for &node in &tree.order {
        let side = carried.side[node];
        held[side].neutral |= given.electrodes[node].is_some();
        match tree.feeds[node] {
            None => held[side] = Hold { phases: f64::INFINITY, neutral: true },
            Some(feed) => hold_by(draft, graph, carried, given, feed, side, &mut held),
        }
    }
    for (t, tie) in tree.ties.iter().enumerate() {
        hold_by(draft, graph, carried, given, tie.feed, count + t, &mut held);
    }
    for (node, siemens) in linear_shunts(draft, graph, carried) {
        held[carried.side[node]].phases += siemens;
    }
    held
}

/// What a branch adds to the hold of the sides at its ends, `far` that away from the source.
fn hold_by(
    draft: &Draft,
    graph: &Graph,
    carried: &Carried,
    given: &Given,
    feed: RawFeed,
    far: usize,
    held: &mut [Hold],
) {
    let near = carried.side[feed.parent];
    match graph.branches[feed.branch].kind {
        RawKind::Line(i) => held[near].phases += charging_siemens(draft, &given.line_constructions, i),
        RawKind::Transformer(i) => {
            let points = carried.neutrals[feed.branch];
            let (near_point, far_point) = match feed.upstream {
                End::From => (points[0], points[1]),
                End::To => (points[1], points[0]),
            };
            // An autotransformer's own earthing does not hold the side it stands in.
            if isolates(draft, graph, carried, feed) {
                held[far].neutral |= matches!(far_point, NeutralPoint::Earthed(_));
            }
            if matches!(near_point, NeutralPoint::Earthed(_))
                && conducts_zero_sequence(&draft.transformers[i], feed.upstream)
            {
                held[near].phases = f64::INFINITY;
            }
        }
        RawKind::Switch(_) | RawKind::Bank(_) => {}
    }
}

/// True where the far winding is a star with neutral and the near one a star without, or a zigzag:
/// nothing on the near side balances what the three phases carry together. (A far zigzag balances itself.)
fn blocks_unbalance(record: &TransformerRecord, upstream: End) -> bool {
    let Some([near, far]) = near_and_far(record, upstream) else { return false };
    far == Winding::StarNeutral && (near == Winding::Star || near.is_zigzag())
}

/// An earthed star winding holds its side where the other winding is a delta, or where it carries
/// the no-load shunt; an earthed zigzag always does.
fn conducts_zero_sequence(record: &TransformerRecord, upstream: End) -> bool {
    let Some([near, far]) = near_and_far(record, upstream) else { return false };
    let shunt = record.no_load_watts > 0.0 || record.magnetizing_pu > 0.0;
    near.is_zigzag() || far == Winding::Delta || (upstream == End::From && shunt)
}

fn near_and_far(record: &TransformerRecord, upstream: End) -> Option<[Winding; 2]> {
    let [from, to] = record.group.windings()?;
    Some(if upstream == End::From { [from, to] } else { [to, from] })
}

fn charging_siemens(draft: &Draft, choice: &[Option<usize>], line: usize) -> f64 {
    choice[line]
        .map_or(0.0, |c| siemens_to_earth(&draft.constructions[c].y_per_m) * draft.lines[line].length_m)
}

/// Row sums of a shunt matrix are what goes to earth: their magnitudes added up.
fn siemens_to_earth(y: &PhaseMatrix) -> f64 {
    y.row_iter().map(|row| row.sum().norm()).sum()
}

/// Constant-impedance loads and capacitors from a phase to earth, siemens each.
fn linear_shunts<'a>(
    draft: &'a Draft,
    graph: &'a Graph,
    carried: &'a Carried,
) -> impl Iterator<Item = (usize, f64)> + 'a {
    let loads =
        draft.loads.iter().filter(|l| l.model == LoadModel::Impedance).filter_map(|l| match &l.site {
            super::draft::LoadSite::Node(name) => Some((name, l.connection, l.watts.hypot(l.vars), None)),
            super::draft::LoadSite::Line(_) => None,
        });
    let capacitors = draft
        .capacitors
        .iter()
        .filter(|c| c.state == super::draft::SwitchState::Closed)
        .map(|c| (&c.node, c.connection, c.vars, c.rated_volts));
    loads.chain(capacitors).filter_map(move |(name, connection, va, rated)| {
        let node = *graph.index.get(name)?;
        let volts =
            rated.unwrap_or(nominal_phase_volts(carried.conductors[node], carried.nominal_volts[node]));
        let earth = matches!(connection, Connection::Star(_)) && !carried.conductors[node].has_neutral();
        (earth && volts > 0.0).then(|| (node, va / (volts * volts)))
    })
}
