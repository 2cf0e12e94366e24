//! Which galvanic sides anything holds to earth, and a stated reference for those that nothing does.
//!
//! A side is what lines, switches and regulators join without a transformer between. A delta
//! side, or a neutral earthed nowhere, has no defined voltage to earth; it gets a susceptance of
//! [`REFERENCE_SHARE`] of its transformer's rating at its first node, and a warning says so.
//!
//! A star winding with neutral whose other winding is a star without (Yyn), or a zigzag, cannot carry unbalanced
//! current: nothing balances it on the other side. Its phases float even where its neutral is
//! earthed, and loads from phase to neutral have no return path there.

use super::carry::Carried;
use super::conductor::{Conductors, Connection};
use super::draft::{Draft, TransformerRecord};
use super::graph::{Graph, RawKind, Tree, place};
use super::load::LoadModel;
use super::model::{End, nominal_phase_volts};
use super::transformer::{NeutralPoint, Winding};
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

/// How each side stands to earth, at the index of its first node.
pub(super) fn sides(
    draft: &Draft,
    graph: &Graph,
    tree: &Tree,
    carried: &Carried,
    given: &Given,
    diagnostics: &mut Diagnostics,
) -> Vec<SideEarth> {
    let mut sides = vec![SideEarth::default(); graph.names.len()];
    let is_head = |n: &usize| carried.side[*n] == *n && tree.feeds[*n].is_some();
    let heads: Vec<usize> = tree.order.iter().copied().filter(is_head).collect();
    if heads.is_empty() {
        return sides;
    }
    let held = holds(draft, graph, tree, carried, given);
    for head in heads {
        let Some(feed) = tree.feeds[head] else { continue };
        let RawKind::Transformer(i) = graph.branches[feed.branch].kind else { continue };
        let record = &draft.transformers[i];
        let volts = carried.nominal_volts[head];
        let wanted = REFERENCE_SHARE * record.rated_va / (volts * volts);
        let (hold, side) = (&held[head], &mut sides[head]);
        side.unbalance_blocked = blocks_unbalance(record, feed.upstream);
        let neutral = Conductors::N.intersection(carried.conductors[head]);
        let floats = match side.unbalance_blocked {
            true if hold.neutral => carried.conductors[head].phases(),
            true => carried.conductors[head],
            false if hold.neutral => continue,
            false if neutral.is_empty() => carried.conductors[head],
            false => neutral,
        };
        if hold.phases >= wanted || !wanted.is_finite() {
            continue;
        }
        side.reference_siemens = wanted;
        side.on = floats;
        warn(draft, graph, head, record, side, diagnostics);
    }
    sides
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

/// What holds each side, at the index of its first node.
fn holds(draft: &Draft, graph: &Graph, tree: &Tree, carried: &Carried, given: &Given) -> Vec<Hold> {
    let mut held = vec![Hold::default(); graph.names.len()];
    for &node in &tree.order {
        let side = carried.side[node];
        held[side].neutral |= given.electrodes[node].is_some();
        let Some(feed) = tree.feeds[node] else {
            held[side] = Hold { phases: f64::INFINITY, neutral: true };
            continue;
        };
        match graph.branches[feed.branch].kind {
            RawKind::Line(i) => held[side].phases += charging_siemens(draft, &given.line_constructions, i),
            RawKind::Transformer(i) => {
                let points = carried.neutrals[feed.branch];
                let (near, far) = match feed.upstream {
                    End::From => (points[0], points[1]),
                    End::To => (points[1], points[0]),
                };
                held[side].neutral |= matches!(far, NeutralPoint::Earthed(_));
                if matches!(near, NeutralPoint::Earthed(_))
                    && conducts_zero_sequence(&draft.transformers[i], feed.upstream)
                {
                    held[carried.side[feed.parent]].phases = f64::INFINITY;
                }
            }
            RawKind::Switch(_) | RawKind::Bank(_) => {}
        }
    }
    for (node, siemens) in linear_shunts(draft, graph, carried) {
        held[carried.side[node]].phases += siemens;
    }
    held
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
