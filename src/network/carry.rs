//! Which conductors each node carries and at what nominal voltage, from the supply outwards.

use super::conductor::{Conductor, Conductors, Connection};
use super::draft::{Across, Draft, TransformerRecord};
use super::graph::{Graph, RawFeed, RawKind, Tree, place, written_conductors};
use super::model::End;
use super::transformer::{NeutralPoint, VectorGroup, Winding};
use crate::diagnostic::{Code, Diagnostics};
use crate::units::SQRT_3;

/// A rated voltage may differ from the nominal voltage of its node by this share.
const VOLTAGE_CLASS_TOLERANCE: f64 = 0.15;

/// What the walk finds out about each node and branch of the graph.
pub(super) struct Carried {
    /// Conductors of each node.
    pub conductors: Vec<Conductors>,
    /// Nominal line-to-line voltage of each node, volts.
    pub nominal_volts: Vec<f64>,
    /// Conductors at the from and the to end of each branch.
    pub ends: Vec<[Conductors; 2]>,
    /// Neutral points at the from and the to side of each transformer branch.
    pub neutrals: Vec<[NeutralPoint; 2]>,
    /// First node of the galvanic side each node belongs to.
    pub side: Vec<usize>,
}

/// Walks the tree; conductors used where they are not carried, and voltages that do not fit, are errors.
pub(super) fn carry(
    draft: &Draft,
    graph: &Graph,
    tree: &Tree,
    electrodes: &[Option<f64>],
    diagnostics: &mut Diagnostics,
) -> Carried {
    let nodes = graph.names.len();
    let branches = graph.branches.len();
    let mut walk = Walk {
        draft,
        graph,
        electrodes,
        diagnostics,
        carried: Carried {
            conductors: vec![Conductors::NONE; nodes],
            nominal_volts: vec![0.0; nodes],
            ends: vec![[Conductors::NONE; 2]; branches],
            neutrals: vec![[NeutralPoint::None; 2]; branches],
            side: (0..nodes).collect(),
        },
    };
    for &node in &tree.order {
        match tree.feeds[node] {
            None => walk.supply(node),
            Some(feed) => walk.follow(node, feed),
        }
    }
    walk.carried
}

struct Walk<'a> {
    draft: &'a Draft,
    graph: &'a Graph,
    electrodes: &'a [Option<f64>],
    diagnostics: &'a mut Diagnostics,
    carried: Carried,
}

impl Walk<'_> {
    fn supply(&mut self, node: usize) {
        let mut conductors = Conductors::ABC;
        if self.wants_neutral(node) {
            conductors = conductors.with(Conductor::N);
        }
        self.carried.conductors[node] = conductors;
        self.carried.nominal_volts[node] = self.draft.supplies[0].nominal_volts;
    }

    /// A winding's node has a neutral conductor where a line or switch takes one on, or an electrode stands.
    fn wants_neutral(&self, node: usize) -> bool {
        self.electrodes[node].is_some()
            || self.graph.closed_at(node).any(|b| {
                written_conductors(self.draft, self.graph.branches[b].kind)
                    .is_some_and(Conductors::has_neutral)
            })
    }

    fn follow(&mut self, node: usize, feed: RawFeed) {
        let branch = &self.graph.branches[feed.branch];
        let carried = match branch.kind {
            RawKind::Transformer(i) => return self.transformer(node, feed, &self.draft.transformers[i]),
            RawKind::Bank(bank) => self.bank_conductors(bank, feed),
            RawKind::Line(_) | RawKind::Switch(_) => {
                written_conductors(self.draft, branch.kind).unwrap_or(Conductors::NONE)
            }
        };
        self.require(carried, feed);
        self.carried.conductors[node] = carried;
        self.carried.ends[feed.branch] = [carried; 2];
        self.carried.nominal_volts[node] = self.carried.nominal_volts[feed.parent];
        self.carried.side[node] = self.carried.side[feed.parent];
    }

    /// A bank carries its phases, what they are regulated against, and the neutral where there is one.
    fn bank_conductors(&self, bank: usize, feed: RawFeed) -> Conductors {
        let own = self.graph.banks[bank].iter().map(|&i| {
            let unit = &self.draft.regulators[i];
            match unit.across {
                Across::Phase(other) => unit.phases.with(other),
                Across::Neutral => unit.phases,
            }
        });
        let parent = self.carried.conductors[feed.parent];
        own.fold(Conductors::N.intersection(parent), Conductors::union)
    }

    /// The parent must carry what the branch takes from it.
    fn require(&mut self, wanted: Conductors, feed: RawFeed) {
        let parent = self.carried.conductors[feed.parent];
        let missing = wanted.minus(parent);
        if missing.is_empty() {
            return;
        }
        let branch = &self.graph.branches[feed.branch];
        let node = &self.graph.names[feed.parent];
        let (what, cure) = match missing.phases().is_empty() {
            true => (
                "the neutral n".to_string(),
                format!(
                    "write the feeding line with n as well, give node {node} an earth_ohm where a winding feeds it, or leave n out here"
                ),
            ),
            false => (
                format!("{} {missing}", if missing.count() == 1 { "conductor" } else { "conductors" }),
                match wanted.intersection(parent) {
                    _ if matches!(branch.kind, RawKind::Transformer(i) if self.draft.transformers[i].terminals.is_none()) =>
                    {
                        format!(
                            "carry {missing} as far as node {node}, or choose a single-phase transformer (Ii0)"
                        )
                    }
                    common if common.phases().is_empty() => {
                        format!("carry {missing} as far as node {node}, or use another phase here")
                    }
                    common => format!("carry {missing} as far as node {node}, or use {common} here"),
                },
            ),
        };
        self.diagnostics.error(
            Code::PhaseNotCarried,
            place(self.draft, branch.origin, "phases", &self.written_phases(branch.kind)),
            format!(
                "{} uses {what}, but node {node}, where it begins, carries only {parent}",
                branch.called()
            ),
            cure,
        );
    }

    /// The `phases` a branch is written with, blank for a three-phase bank.
    fn written_phases(&self, kind: RawKind) -> String {
        match kind {
            RawKind::Line(_) | RawKind::Switch(_) => {
                written_conductors(self.draft, kind).map(|c| c.to_string())
            }
            RawKind::Transformer(i) => self.draft.transformers[i].terminals.map(|t| t.to_string()),
            RawKind::Bank(bank) => {
                self.graph.banks[bank].first().map(|&i| self.draft.regulators[i].phases.to_string())
            }
        }
        .unwrap_or_default()
    }

    fn transformer(&mut self, node: usize, feed: RawFeed, record: &TransformerRecord) {
        let sides = [Side::from(record), Side::to(record)];
        let (near, far) = match feed.upstream {
            End::From => (&sides[0], &sides[1]),
            End::To => (&sides[1], &sides[0]),
        };
        self.require(near.phases, feed);
        let near_point = self.neutral_point(near, feed.parent, record);
        self.check_voltage(near, far, feed);
        let mut conductors = far.phases;
        if far.has_neutral && self.wants_neutral(node) {
            conductors = conductors.with(Conductor::N);
        }
        self.carried.conductors[node] = conductors;
        self.carried.nominal_volts[node] = far.nominal_volts();
        self.carried.side[node] = node;
        let far_point = self.neutral_point(far, node, record);
        let near_conductors = match near_point {
            NeutralPoint::Conductor => near.phases.with(Conductor::N),
            _ => near.phases,
        };
        let (ends, points) = match feed.upstream {
            End::From => ([near_conductors, conductors], [near_point, far_point]),
            End::To => ([conductors, near_conductors], [far_point, near_point]),
        };
        self.carried.ends[feed.branch] = ends;
        self.carried.neutrals[feed.branch] = points;
    }

    fn neutral_point(&mut self, side: &Side, node: usize, record: &TransformerRecord) -> NeutralPoint {
        let neutral = self.carried.conductors[node].has_neutral();
        let point = match (side.has_neutral, side.floats) {
            (true, _) if neutral => NeutralPoint::Conductor,
            (true, _) => NeutralPoint::Earthed(side.earth_ohm.unwrap_or(0.0)),
            (false, true) => NeutralPoint::Floating,
            (false, false) => NeutralPoint::None,
        };
        if let Some(ohm) = side.earth_ohm
            && !matches!(point, NeutralPoint::Earthed(_))
        {
            let (code, why, cure) = if point == NeutralPoint::Conductor {
                (
                    Code::Conflict,
                    format!("node {} carries the neutral as a conductor", self.graph.names[node]),
                    format!("move it to nodes.csv: earth_ohm {ohm} at node {}", self.graph.names[node]),
                )
            } else {
                (
                    Code::NoNeutral,
                    format!("that winding of {} has no neutral to earth", record.group),
                    "leave the cell blank, or give a group with a neutral (YN, yn)".to_string(),
                )
            };
            let what =
                format!("{} of transformer {} has no effect: {why}", side.earth_column, record.transformer);
            self.diagnostics.error(
                code,
                place(self.draft, record.origin, side.earth_column, &ohm.to_string()),
                what,
                cure,
            );
        }
        point
    }

    fn check_voltage(&mut self, near: &Side, far: &Side, feed: RawFeed) {
        let nominal = self.carried.nominal_volts[feed.parent];
        let fits = |volts: f64| (volts / nominal - 1.0).abs() <= VOLTAGE_CLASS_TOLERANCE;
        if nominal <= 0.0 || fits(near.nominal_volts()) {
            return;
        }
        let branch = &self.graph.branches[feed.branch];
        let cure = if fits(far.nominal_volts()) {
            "from and to, or kv_from and kv_to, look exchanged".to_string()
        } else if fits(near.nominal_volts() * SQRT_3) {
            "give the line-to-line voltage (phase voltage times 1.732)".to_string()
        } else if fits(near.nominal_volts() / SQRT_3) {
            "give the voltage of the winding itself (line-to-line over 1.732)".to_string()
        } else {
            format!("check {}, and to which node that side is joined", near.volts_column)
        };
        let kv = near.volts / 1e3;
        let across = if near.phase_to_neutral {
            format!("{:.3} kV phase to neutral", nominal / SQRT_3 / 1e3)
        } else {
            format!("{} kV line-to-line", nominal / 1e3)
        };
        self.diagnostics.error(
            Code::VoltageMismatch,
            place(self.draft, branch.origin, near.volts_column, &kv.to_string()),
            format!(
                "{} is rated {kv} kV at node {}, which is at {across}",
                branch.called(),
                self.graph.names[feed.parent],
            ),
            cure,
        );
    }
}

/// One side of a transformer record.
struct Side {
    phases: Conductors,
    has_neutral: bool,
    floats: bool,
    volts: f64,
    earth_ohm: Option<f64>,
    volts_column: &'static str,
    earth_column: &'static str,
    phase_to_neutral: bool,
}

impl Side {
    fn from(record: &TransformerRecord) -> Side {
        let winding = match record.group {
            VectorGroup::Three { from, .. } => Some(from),
            VectorGroup::Single { .. } => None,
        };
        Side::new(record, winding, record.from_volts, record.from_earth_ohm, ["kv_from", "earth_ohm_from"])
    }

    fn to(record: &TransformerRecord) -> Side {
        let winding = match record.group {
            VectorGroup::Three { to, .. } => Some(to),
            VectorGroup::Single { .. } => None,
        };
        Side::new(record, winding, record.to_volts, record.to_earth_ohm, ["kv_to", "earth_ohm_to"])
    }

    fn new(
        record: &TransformerRecord,
        winding: Option<Winding>,
        volts: f64,
        earth_ohm: Option<f64>,
        columns: [&'static str; 2],
    ) -> Side {
        let star_unit = matches!(record.terminals, Some(Connection::Star(_)));
        Side {
            phases: record.terminals.map_or(Conductors::ABC, Connection::phases),
            has_neutral: winding.map_or(star_unit, |w| w == Winding::StarNeutral),
            floats: winding == Some(Winding::Star),
            volts,
            earth_ohm,
            volts_column: columns[0],
            earth_column: columns[1],
            phase_to_neutral: winding.is_none() && star_unit,
        }
    }

    /// Nominal line-to-line voltage this side stands for.
    fn nominal_volts(&self) -> f64 {
        if self.phase_to_neutral { self.volts * SQRT_3 } else { self.volts }
    }
}
