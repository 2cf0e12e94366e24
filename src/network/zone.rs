//! Which meter a load is behind, and from which phases it draws there.

use std::collections::{HashMap, HashSet};

use super::branches::Branches;
use super::conductor::{Conductor, Connection};
use super::load::Load;
use super::meter::{Meter, MeterPlace};
use super::metering::hangs;
use super::model::{BranchId, BranchKind, End, Feed, NodeId, Tie};
use super::transformer::VectorGroup;

/// For each node the nearest meter towards the source, and the same for loads along a branch.
pub(super) struct Zones {
    head: Option<usize>,
    nodes: Vec<Option<usize>>,
    /// Of loads spread along a branch: behind a meter at its upper end, before one at its lower end.
    along: HashMap<BranchId, Option<usize>>,
    /// Node below each branch.
    below: HashMap<BranchId, NodeId>,
    places: Vec<MeterPlace>,
}

impl Zones {
    /// Walks outwards from the source; sets the outer meter of each.
    pub(super) fn new(
        parts: &Branches,
        feeds: &[Option<Feed>],
        order: &[NodeId],
        meters: &mut [Meter],
    ) -> Zones {
        let at = |wanted: MeterPlace| meters.iter().position(|m| m.place == wanted);
        let head = at(MeterPlace::Head);
        let mut by_branch: HashMap<BranchId, [Option<usize>; 2]> = HashMap::new();
        for (i, meter) in meters.iter().enumerate() {
            let MeterPlace::Branch { branch, end, upstream } = meter.place else { continue };
            let slot = usize::from(end != upstream);
            by_branch.entry(branch).or_default()[slot].get_or_insert(i);
        }
        let mut outer = vec![None; meters.len()];
        let mut zones = Zones {
            head,
            nodes: vec![head; feeds.len()],
            along: HashMap::with_capacity(parts.branches.len()),
            below: HashMap::with_capacity(parts.branches.len()),
            places: meters.iter().map(|m| m.place).collect(),
        };
        for &id in order {
            let Some(feed) = feeds.get(id.index()).copied().flatten() else { continue };
            let mut zone = zones.nodes.get(feed.parent.index()).copied().flatten();
            for (slot, meter) in by_branch.get(&feed.branch).copied().unwrap_or_default().iter().enumerate() {
                if let Some(meter) = *meter {
                    if let Some(o) = outer.get_mut(meter) {
                        *o = zone;
                    }
                    zone = Some(meter);
                }
                if slot == 0 {
                    zones.along.insert(feed.branch, zone);
                }
            }
            zones.below.insert(feed.branch, id);
            if let Some(z) = zones.nodes.get_mut(id.index()) {
                *z = zone;
            }
        }
        for (meter, outer) in meters.iter_mut().zip(outer) {
            meter.outer = outer;
        }
        zones
    }

    /// The meter whose reading a load is part of.
    pub(super) fn meter_of(&self, load: &Load) -> Option<usize> {
        match hangs(load) {
            (Some(node), _) => self.nodes.get(node.index()).copied().flatten(),
            (None, Some(line)) => self.along.get(&line).copied().flatten(),
            (None, None) => self.head,
        }
    }
}

/// Branches of closed rings: those between either end of a tie and where their paths meet.
pub(super) fn in_rings(feeds: &[Option<Feed>], ties: &[Tie]) -> HashSet<BranchId> {
    let path = |mut node: NodeId| {
        let mut branches = HashSet::new();
        while let Some(feed) = feeds.get(node.index()).copied().flatten() {
            branches.insert(feed.branch);
            node = feed.parent;
        }
        branches
    };
    let ring = |tie: &Tie| {
        let (near, far) = (path(tie.near), path(tie.far));
        let both: Vec<BranchId> = near.symmetric_difference(&far).copied().collect();
        both.into_iter().chain([tie.branch])
    };
    ties.iter().flat_map(ring).collect()
}

/// Direction of the voltage across an element, in hours of 30 degrees ahead of phase a.
fn hours(c: Conductor, connection: Connection) -> u8 {
    let phase = match c {
        Conductor::B => 8,
        Conductor::C => 4,
        _ => 0,
    };
    match connection {
        Connection::Star(_) => phase,
        Connection::Delta(_) => (phase + 1) % 12,
    }
}

/// Phases at a meter from which a load draws, each with its part: the voltage across the load is
/// turned back through the transformers between (clock numbers of IEC 60076-1); along a phase it
/// counts as that phase's, between two phases as half of each. A first guess only: the flow
/// itself tells what the meter reads.
pub(super) fn phases_at(
    parts: &Branches,
    feeds: &[Option<Feed>],
    zones: &Zones,
    meter: usize,
    load: &Load,
) -> Vec<(Conductor, f64)> {
    let count = load.connection.elements().max(1) as f64;
    let mut found: Vec<(Conductor, f64)> = Vec::new();
    for (c, _) in load.connection.pairs() {
        let turned = turned(parts, feeds, zones, meter, load, hours(c, load.connection));
        let [a, b, c] = Conductor::PHASES;
        let phases: &[Conductor] = match turned % 6 {
            0 => &[a],
            2 => &[b],
            4 => &[c],
            1 => &[a, b],
            3 => &[b, c],
            _ => &[c, a],
        };
        for &phase in phases {
            let part = 1.0 / (count * phases.len() as f64);
            match found.iter_mut().find(|(p, _)| *p == phase) {
                Some((_, sum)) => *sum += part,
                None => found.push((phase, part)),
            }
        }
    }
    found
}

/// The hours of an element as seen at the meter.
fn turned(
    parts: &Branches,
    feeds: &[Option<Feed>],
    zones: &Zones,
    meter: usize,
    load: &Load,
    mut hour: u8,
) -> u8 {
    let stop = zones.places.get(meter).copied().unwrap_or(MeterPlace::Head);
    let mut node = match hangs(load) {
        (Some(node), _) => node,
        (None, Some(line)) => match zones.below.get(&line) {
            Some(&node) => node,
            None => return hour,
        },
        (None, None) => return hour,
    };
    while let Some(feed) = feeds.get(node.index()).copied().flatten() {
        let here = matches!(stop, MeterPlace::Branch { branch, .. } if branch == feed.branch);
        let lower = matches!(stop, MeterPlace::Branch { end, upstream, .. } if end != upstream);
        if here && lower {
            break;
        }
        if let Some(branch) = parts.branches.get(feed.branch.index())
            && let BranchKind::Transformer(t) = &branch.kind
        {
            let ends = |[from, to]: [Connection; 2]| match feed.upstream {
                End::From => (from, to),
                End::To => (to, from),
            };
            let hour_of = |own: Connection| own.pairs().next().map(|(c, _)| hours(c, own));
            let mut units = t.units().filter_map(|unit| unit.terminals).map(ends);
            let first = units.next();
            // Of a bank of units, the one that the load hangs on.
            let own = first.into_iter().chain(units).find(|(_, lower)| hour_of(*lower) == Some(hour));
            let single = own.or(first).map(|(upper, _)| upper);
            hour = match (t.group, single) {
                (VectorGroup::Three { clock, .. }, _) if feed.upstream == End::From => {
                    (hour + 12 - clock) % 12
                }
                (VectorGroup::Three { clock, .. }, _) => (hour + clock) % 12,
                (_, Some(upper)) => hour_of(upper).unwrap_or(hour),
                _ => hour,
            };
        }
        if here {
            break;
        }
        node = feed.parent;
    }
    hour
}
