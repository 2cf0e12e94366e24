//! Which conductors each node carries and at what nominal voltage, from the supply outwards.

use super::conductor::{Conductor, Conductors, Connection};
use super::draft::{Across, Draft, TransformerRecord};
use super::graph::{Graph, RawFeed, RawKind, RawTie, Tree, place, written_conductors};
use super::model::{End, nominal_phase_volts};
use super::transformer::{NeutralPoint, VectorGroup, Winding};
use crate::diagnostic::{Code, Diagnostics};
use crate::math::Complex64;
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
    /// By how many twelfths of a turn the phases of each node lag the supply's; `None` where units
    /// joined otherwise on both sides lie between.
    hours: Vec<Option<u8>>,
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
            hours: vec![Some(0); nodes],
        },
    };
    for &node in &tree.order {
        match tree.feeds[node] {
            None => walk.supply(node),
            Some(feed) => walk.follow(node, feed),
        }
    }
    for tie in &tree.ties {
        walk.tie(tie);
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
            RawKind::Transformer(i) => return self.transformer(node, feed, i),
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
        self.carried.hours[node] = self.carried.hours[feed.parent];
    }

    /// A branch that closes a ring: what it carries and brings must be there at both its ends.
    fn tie(&mut self, tie: &RawTie) {
        let (feed, far) = (tie.feed, tie.far);
        let branch = &self.graph.branches[feed.branch];
        let (conductors, volts, hours) = match branch.kind {
            RawKind::Transformer(first) => {
                let ends = self.transformer_ends(feed, first, self.carried.conductors[far]);
                (ends.far_phases, ends.far_volts, ends.hours)
            }
            kind => {
                let carried = match kind {
                    RawKind::Bank(bank) => self.bank_conductors(bank, feed),
                    _ => written_conductors(self.draft, kind).unwrap_or(Conductors::NONE),
                };
                self.require(carried, feed);
                self.carried.ends[feed.branch] = [carried; 2];
                (carried, self.carried.nominal_volts[feed.parent], self.carried.hours[feed.parent])
            }
        };
        self.check_meeting(tie, conductors, volts, hours);
    }

    /// What a tie brings to its far node must be what the node carries, at its voltage and phase.
    fn check_meeting(&mut self, tie: &RawTie, conductors: Conductors, volts: f64, hours: Option<u8>) {
        let branch = &self.graph.branches[tie.feed.branch];
        let end = if branch.to == tie.far { "to" } else { "from" };
        let node = &self.graph.names[tie.far];
        let at = place(self.draft, branch.origin, end, node);
        let here = self.carried.conductors[tie.far];
        let missing = conductors.minus(here);
        let called = branch.called();
        if !missing.is_empty() {
            self.diagnostics.error(
                Code::PhaseNotCarried,
                at,
                format!(
                    "{called} closes a ring and brings {missing} to node {node}, which carries only {here}"
                ),
                match branch.kind {
                    RawKind::Switch(_) => format!(
                        "write all conductors of one switch in one row; else carry {missing} on the other way to node {node} as well"
                    ),
                    _ => format!("carry {missing} on the other way to node {node} as well, or open {called}"),
                },
            );
            return;
        }
        let nominal = self.carried.nominal_volts[tie.far];
        if (volts / nominal - 1.0).abs() > VOLTAGE_CLASS_TOLERANCE {
            self.diagnostics.error(
                Code::ClosedRing,
                at,
                format!(
                    "{called} closes a ring and brings {:.3} kV to node {node}, which is at {:.3} kV",
                    volts / 1e3,
                    nominal / 1e3
                ),
                format!("check the nodes it joins and the voltages of the transformers in the ring, or open {called}"),
            );
            return;
        }
        if let (Some(brought), Some(found)) = (hours, self.carried.hours[tie.far])
            && brought != found
        {
            self.diagnostics.error(
                Code::ClosedRing,
                at,
                format!(
                    "{called} closes a ring in which the phases do not meet: it brings them {} degrees behind the source to node {node}, where they are {} degrees behind",
                    30 * u32::from(brought),
                    30 * u32::from(found)
                ),
                format!("check the clock numbers of the transformers in the ring, or open {called}"),
            );
        }
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
            RawKind::Transformer(i) => self.draft.transformers[i].terminals.map(|[from, _]| from.to_string()),
            RawKind::Bank(bank) => {
                self.graph.banks[bank].first().map(|&i| self.draft.regulators[i].phases.to_string())
            }
        }
        .unwrap_or_default()
    }

    fn transformer(&mut self, node: usize, feed: RawFeed, first: usize) {
        let far = self.far_side(feed, first);
        let mut conductors = far.phases;
        if far.has_neutral && (far.phases.is_split() || self.wants_neutral(node)) {
            conductors = conductors.with(Conductor::N);
        }
        let ends = self.transformer_ends(feed, first, conductors);
        self.carried.conductors[node] = conductors;
        self.carried.nominal_volts[node] = ends.far_volts;
        self.carried.hours[node] = ends.hours;
        self.carried.side[node] = if ends.through { self.carried.side[feed.parent] } else { node };
    }

    fn records(&self, first: usize) -> Vec<&TransformerRecord> {
        self.graph.units_of(first).map(|i| &self.draft.transformers[i]).collect()
    }

    /// The side of a bank away from the source.
    fn far_side(&self, feed: RawFeed, first: usize) -> Side {
        let far_end = if feed.upstream == End::From { End::To } else { End::From };
        Side::bank(&self.records(first), far_end)
    }

    /// Ends and neutral points of a bank whose far node carries `there`; its near side is checked.
    fn transformer_ends(&mut self, feed: RawFeed, first: usize, there: Conductors) -> TransformerEnds {
        let (draft, graph) = (self.draft, self.graph);
        let records: Vec<&TransformerRecord> =
            graph.units_of(first).map(|i| &draft.transformers[i]).collect();
        let record = records[0];
        let (near, far) = (Side::bank(&records, feed.upstream), self.far_side(feed, first));
        self.require(near.phases, feed);
        for unit in &records {
            self.check_voltage(unit, feed);
        }
        self.check_far_voltages(&records, feed);
        let here = self.carried.conductors[feed.parent];
        let near_point = self.neutral_point(&near, here, feed.parent, record);
        let other = graph.branches[feed.branch].other(feed.parent);
        let far_point = self.neutral_point(&far, there, other, record);
        let with = |side: &Side, point: NeutralPoint| match point {
            NeutralPoint::Conductor => side.phases.with(Conductor::N),
            _ => side.phases,
        };
        let (near_conductors, far_conductors) = (with(&near, near_point), with(&far, far_point));
        let (ends, mut points) = match feed.upstream {
            End::From => ([near_conductors, far_conductors], [near_point, far_point]),
            End::To => ([far_conductors, near_conductors], [far_point, near_point]),
        };
        let auto = matches!(record.group, VectorGroup::Auto | VectorGroup::SingleAuto);
        if auto {
            points = self.shared_neutral(points, record);
        }
        // Where only the far side carries the shared neutral, that begins there.
        let near_index = if feed.upstream == End::From { 0 } else { 1 };
        let through = auto && points[near_index] != NeutralPoint::Shared;
        self.carried.ends[feed.branch] = ends;
        self.carried.neutrals[feed.branch] = points;
        let hours = lag(&records, feed.upstream)
            .zip(self.carried.hours[feed.parent])
            .map(|(own, above)| (own + above) % 12);
        TransformerEnds { far_phases: far.phases, far_volts: far.nominal_volts(), hours, through }
    }

    /// One neutral point for both sides of an autotransformer.
    fn shared_neutral(&mut self, points: [NeutralPoint; 2], record: &TransformerRecord) -> [NeutralPoint; 2] {
        let lost = match points {
            [NeutralPoint::Conductor, NeutralPoint::Conductor] => return points,
            [NeutralPoint::Earthed(_), NeutralPoint::Conductor] => 0,
            _ => 1,
        };
        let given = [record.from_earth_ohm, record.to_earth_ohm][lost];
        if let Some(ohm) = given {
            let (column, other) = if lost == 0 { ("earth_ohm_from", "to") } else { ("earth_ohm_to", "from") };
            self.diagnostics.error(
                Code::Conflict,
                place(self.draft, record.origin, column, &ohm.re.to_string()),
                format!(
                    "{column} of transformer {} has no effect: an autotransformer has one neutral, and that stands at its {other} side",
                    record.transformer
                ),
                if lost == 0 { "leave it blank" } else { "give it as earth_ohm_from, or at the node that carries n" },
            );
        }
        let mut points = points;
        points[lost] = NeutralPoint::Shared;
        points
    }

    fn neutral_point(
        &mut self,
        side: &Side,
        carried: Conductors,
        node: usize,
        record: &TransformerRecord,
    ) -> NeutralPoint {
        let neutral = carried.has_neutral();
        let point = match (side.has_neutral, side.floats) {
            (true, _) if neutral => NeutralPoint::Conductor,
            (true, _) => NeutralPoint::Earthed(side.earth_ohm.unwrap_or_default()),
            (false, true) => NeutralPoint::Floating,
            (false, false) => NeutralPoint::None,
        };
        if let Some(ohm) = side.earth_ohm
            && !matches!(point, NeutralPoint::Earthed(_))
        {
            let ohm = ohm.re;
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
                    "leave the cell blank, or give a group with a neutral (YN, yn, zn)".to_string(),
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

    /// Units of one bank must agree on the voltage of the side they feed.
    fn check_far_voltages(&mut self, records: &[&TransformerRecord], feed: RawFeed) {
        let far_end = if feed.upstream == End::From { End::To } else { End::From };
        let first = Side::of(records[0], far_end).nominal_volts();
        for record in &records[1..] {
            let far = Side::of(record, far_end);
            if (far.nominal_volts() / first - 1.0).abs() <= VOLTAGE_CLASS_TOLERANCE {
                continue;
            }
            self.diagnostics.error(
                Code::VoltageMismatch,
                place(self.draft, record.origin, far.volts_column, &(far.volts / 1e3).to_string()),
                format!(
                    "transformer {} makes {:.3} kV line-to-line, but {}, in the same bank, {:.3} kV",
                    record.transformer,
                    far.nominal_volts() / 1e3,
                    records[0].transformer,
                    first / 1e3
                ),
                format!("check {} of both, and their terminals", far.volts_column),
            );
        }
    }

    fn check_voltage(&mut self, record: &TransformerRecord, feed: RawFeed) {
        let far_end = if feed.upstream == End::From { End::To } else { End::From };
        let (near, far) = (Side::of(record, feed.upstream), Side::of(record, far_end));
        let nominal = self.carried.nominal_volts[feed.parent];
        let fits = |volts: f64| (volts / nominal - 1.0).abs() <= VOLTAGE_CLASS_TOLERANCE;
        if nominal <= 0.0 || fits(near.nominal_volts()) {
            return;
        }
        let phase_volts = nominal_phase_volts(self.carried.conductors[feed.parent], nominal);
        let cure = if fits(far.nominal_volts()) {
            "from and to, or kv_from and kv_to, look exchanged".to_string()
        } else if is_near(near.nominal_volts() * SQRT_3, nominal) {
            "give the line-to-line voltage (phase voltage times 1.732)".to_string()
        } else if near.phase_to_neutral && is_near(near.nominal_volts() / SQRT_3, nominal) {
            "give the voltage of the winding itself (line-to-line over 1.732)".to_string()
        } else {
            format!("check {}, and to which node that side is joined", near.volts_column)
        };
        let kv = near.volts / 1e3;
        let across = if near.phase_to_neutral {
            format!("{:.3} kV phase to neutral", phase_volts / 1e3)
        } else {
            format!("{} kV line-to-line", nominal / 1e3)
        };
        self.diagnostics.error(
            Code::VoltageMismatch,
            place(self.draft, record.origin, near.volts_column, &kv.to_string()),
            format!(
                "transformer {} is rated {kv} kV at node {}, which is at {across}",
                record.transformer, self.graph.names[feed.parent],
            ),
            cure,
        );
    }
}

/// What a bank brings to its far node.
struct TransformerEnds {
    far_phases: Conductors,
    far_volts: f64,
    hours: Option<u8>,
    /// Whether conductors go through, as in an autotransformer.
    through: bool,
}

/// Hours by which the far side lags the near one; `None` where single-phase units are joined
/// otherwise on both sides.
fn lag(records: &[&TransformerRecord], upstream: End) -> Option<u8> {
    let clock = match records[0].group {
        VectorGroup::Three { clock, .. } => clock,
        VectorGroup::Auto | VectorGroup::SingleAuto => 0,
        VectorGroup::Single { clock } => {
            let alike = |r: &&TransformerRecord| {
                r.group == records[0].group && r.terminals.is_some_and(|[from, to]| from == to)
            };
            records.iter().all(alike).then_some(clock)?
        }
        VectorGroup::CentreTap { .. } => return None,
    };
    Some(if upstream == End::From { clock } else { (12 - clock) % 12 })
}

/// Near enough to be the same rated voltage: 11 and 6.6 kV are no phase voltage of each other.
fn is_near(volts: f64, nominal: f64) -> bool {
    (volts / nominal - 1.0).abs() <= 0.025
}

/// One side of a transformer record, or of a bank of single-phase units.
struct Side {
    phases: Conductors,
    has_neutral: bool,
    floats: bool,
    volts: f64,
    earth_ohm: Option<Complex64>,
    volts_column: &'static str,
    earth_column: &'static str,
    phase_to_neutral: bool,
}

impl Side {
    fn of(record: &TransformerRecord, end: End) -> Side {
        let k = if end == End::From { 0 } else { 1 };
        let winding = record.group.windings().map(|w| w[k]);
        let terminals = record.terminals.map(|t| t[k]);
        let star = matches!(terminals, Some(Connection::Star(_)));
        let centre_tap = matches!(record.group, VectorGroup::CentreTap { .. }) && end == End::To;
        Side {
            phases: terminals.map_or(Conductors::ABC, Connection::phases),
            has_neutral: winding.map_or(star, Winding::has_neutral),
            floats: winding.is_some_and(Winding::floats),
            volts: [record.from_volts, record.to_volts][k],
            earth_ohm: [record.from_earth_ohm, record.to_earth_ohm][k],
            volts_column: ["kv_from", "kv_to"][k],
            earth_column: ["earth_ohm_from", "earth_ohm_to"][k],
            phase_to_neutral: winding.is_none() && star && !centre_tap,
        }
    }

    /// The side of all units together: their phases, a neutral where one has it.
    fn bank(records: &[&TransformerRecord], end: End) -> Side {
        let mut bank = Side::of(records[0], end);
        for record in &records[1..] {
            let unit = Side::of(record, end);
            bank.phases = bank.phases.union(unit.phases);
            bank.has_neutral |= unit.has_neutral;
            bank.earth_ohm = bank.earth_ohm.or(unit.earth_ohm);
        }
        bank
    }

    /// Nominal line-to-line voltage this side stands for.
    fn nominal_volts(&self) -> f64 {
        match (self.phase_to_neutral, self.phases.is_split()) {
            (true, true) => 2.0 * self.volts,
            (true, false) => self.volts * SQRT_3,
            (false, _) => self.volts,
        }
    }
}
