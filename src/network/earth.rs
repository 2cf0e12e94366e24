//! Which galvanic sides anything holds to earth, and a stated reference for those that nothing does.
//!
//! A side is what lines, switches and regulators join without a transformer between. A delta
//! side, or a neutral earthed nowhere, has no defined voltage to earth; it gets a susceptance of
//! [`REFERENCE_SHARE`] of its transformer's rating at its first node, and a warning says so.

use super::carry::Carried;
use super::conductor::Connection;
use super::draft::{Draft, TransformerRecord};
use super::graph::{Graph, RawKind, Tree, place};
use super::load::LoadModel;
use super::model::End;
use super::transformer::{NeutralPoint, VectorGroup, Winding};
use crate::diagnostic::{Code, Diagnostics};
use crate::math::PhaseMatrix;

/// Reference susceptance of a side without earth, as a share of the transformer's `S / U^2`.
const REFERENCE_SHARE: f64 = 1e-6;

/// What the draft gives, resolved to indices: electrode of each node, construction of each line.
pub(super) struct Given {
    pub electrodes: Vec<Option<f64>>,
    pub line_constructions: Vec<Option<usize>>,
}

/// Reference susceptance of each node, siemens: zero but at the first node of a side without earth.
pub(super) fn references(
    draft: &Draft,
    graph: &Graph,
    tree: &Tree,
    carried: &Carried,
    given: &Given,
    diagnostics: &mut Diagnostics,
) -> Vec<f64> {
    let mut reference = vec![0.0; graph.names.len()];
    let heads: Vec<usize> =
        tree.order.iter().copied().filter(|&n| carried.side[n] == n && tree.feeds[n].is_some()).collect();
    if heads.is_empty() {
        return reference;
    }
    let held = held_siemens(draft, graph, tree, carried, given);
    for head in heads {
        let Some(feed) = tree.feeds[head] else { continue };
        let RawKind::Transformer(i) = graph.branches[feed.branch].kind else { continue };
        let record = &draft.transformers[i];
        let volts = carried.nominal_volts[head];
        let wanted = REFERENCE_SHARE * record.rated_va / (volts * volts);
        if held[head] >= wanted || !wanted.is_finite() {
            continue;
        }
        reference[head] = wanted;
        warn(draft, graph, carried, head, record, wanted, diagnostics);
    }
    reference
}

fn warn(
    draft: &Draft,
    graph: &Graph,
    carried: &Carried,
    head: usize,
    record: &TransformerRecord,
    siemens: f64,
    diagnostics: &mut Diagnostics,
) {
    let neutral = carried.conductors[head].has_neutral();
    let (what, cure) = if neutral {
        ("the neutral", format!("give its electrode: earth_ohm at node {} in nodes.csv", graph.names[head]))
    } else {
        ("the side", "where it is earthed, say how; if it is meant to float, voltages between phases are right and those to earth are not to be relied on".to_string())
    };
    diagnostics.warning(
        Code::NotEarthed,
        place(draft, record.origin, "group", &record.group.to_string()),
        format!(
            "{what} fed by transformer {} at node {} is earthed nowhere; it is held near earth by {:.3} microsiemens",
            record.transformer,
            graph.names[head],
            siemens * 1e6,
        ),
        cure,
    );
}

/// Admittance that holds each side to earth, siemens, at the index of its first node; infinite for a firm earth.
fn held_siemens(draft: &Draft, graph: &Graph, tree: &Tree, carried: &Carried, given: &Given) -> Vec<f64> {
    let mut held = vec![0.0; graph.names.len()];
    let firm = f64::INFINITY;
    for &node in &tree.order {
        let side = carried.side[node];
        if given.electrodes[node].is_some() {
            held[side] = firm;
        }
        let Some(feed) = tree.feeds[node] else {
            held[side] = firm;
            continue;
        };
        match graph.branches[feed.branch].kind {
            RawKind::Line(i) => held[side] += charging_siemens(draft, &given.line_constructions, i),
            RawKind::Transformer(i) => {
                let points = carried.neutrals[feed.branch];
                let (near, far) = match feed.upstream {
                    End::From => (points[0], points[1]),
                    End::To => (points[1], points[0]),
                };
                if matches!(far, NeutralPoint::Earthed(_)) {
                    held[side] = firm;
                }
                if matches!(near, NeutralPoint::Earthed(_))
                    && conducts_zero_sequence(&draft.transformers[i], feed.upstream)
                {
                    held[carried.side[feed.parent]] = firm;
                }
            }
            RawKind::Switch(_) | RawKind::Bank(_) => {}
        }
    }
    for (node, siemens) in linear_shunts(draft, graph, carried) {
        held[carried.side[node]] += siemens;
    }
    held
}

/// An earthed star winding holds its side where the other winding is a delta, or where it carries the no-load shunt.
fn conducts_zero_sequence(record: &TransformerRecord, upstream: End) -> bool {
    let VectorGroup::Three { from, to, .. } = record.group else { return false };
    let far = if upstream == End::From { to } else { from };
    let shunt = record.no_load_watts > 0.0 || record.magnetizing_pu > 0.0;
    far == Winding::Delta || (upstream == End::From && shunt)
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
        let volts = rated.unwrap_or(carried.nominal_volts[node] / crate::units::SQRT_3);
        let earth = matches!(connection, Connection::Star(_)) && !carried.conductors[node].has_neutral();
        (earth && volts > 0.0).then(|| (node, va / (volts * volts)))
    })
}
