//! Meters of the network from the records of the draft: where each reads, which loads share it.

use std::collections::HashMap;

use super::branches::Branches;
use super::build::{Builder, Joined};
use super::conductor::Connection;
use super::draft::Name;
use super::graph::place;
use super::load::{Load, LoadPlace};
use super::meter::{
    Channel, Meter, MeterPlace, MeterRecord, MeterSite, ReactiveReading, Share, ShareBasis, ShareRecord,
};
use super::model::{BranchId, End, Feed, NodeId, Tie};
use super::zone::{Zones, in_rings, phases_at};
use crate::diagnostic::{Code, Origin, nearest};

/// The parts of the network that meters are joined to.
pub(super) struct Metered<'a> {
    pub(super) joined: &'a Joined,
    pub(super) parts: &'a Branches,
    pub(super) new_node: &'a [Option<NodeId>],
    pub(super) feeds: &'a [Option<Feed>],
    pub(super) order: &'a [NodeId],
    pub(super) ties: &'a [Tie],
    pub(super) loads: Vec<Load>,
}

impl Builder<'_> {
    /// Meters with their loads; under a meter that reads each phase, loads on several phases come
    /// back as one load a phase.
    pub(super) fn meters(&mut self, network: Metered<'_>) -> (Vec<Load>, Vec<Meter>) {
        if self.draft.meters.is_empty() && self.draft.shares.is_empty() {
            return (network.loads, Vec::new());
        }
        // A row, load or meter with a fault was reported; what follows from it is not.
        let before = self.diagnostics.counts().0;
        let (mut meters, origins) = self.placed(&network);
        let all_meters = self.diagnostics.counts().0 == before && !self.draft.metering_faulty;
        let all_loads = all_meters && before == 0;
        let zones = Zones::new(network.parts, network.feeds, network.order, &mut meters);
        let shares: HashMap<&str, &ShareRecord> = self.draft.shares.iter().map(|s| (&*s.load, s)).collect();
        let splits = |load: &Load| {
            shares.contains_key(&*load.name)
                && zones.meter_of(load).is_some_and(|m| meters[m].channels.iter().all(|c| c.phase.is_some()))
        };
        let pieces = split(&network.loads, splits);
        let mut counts: HashMap<&str, usize> = HashMap::new();
        pieces.iter().for_each(|(_, owner)| *counts.entry(owner).or_default() += 1);
        let of_row = |owner: &str| counts.get(owner).copied().unwrap_or(1);
        for (index, (load, share)) in pieces.iter().enumerate() {
            let Some(record) = shares.get(&**share) else { continue };
            match zones.meter_of(load) {
                Some(meter) => {
                    self.join(&network, &zones, &mut meters, meter, record, (index, load, of_row(share)))
                }
                None if all_meters => self.unmetered(record),
                None => {}
            }
        }
        for (meter, origins) in origins.iter().enumerate() {
            self.check_basis(&pieces, &zones, meter, &meters[meter].name, &shares);
            for (channel, origin) in origins.iter().enumerate().filter(|_| all_loads) {
                self.check_channel(&shares, &pieces, &mut meters, (meter, channel), *origin);
            }
        }
        self.check_remainders(&zones, &network, &pieces, &shares, &meters, &origins);
        (pieces.into_iter().map(|(load, _)| load).collect(), meters)
    }

    /// Every meter at its place, without loads, and where each of its rows was written.
    fn placed(&mut self, network: &Metered<'_>) -> (Vec<Meter>, Vec<Vec<Option<Origin>>>) {
        let mut meters: Vec<Meter> = Vec::new();
        let mut origins: Vec<Vec<Option<Origin>>> = Vec::new();
        let mut known: HashMap<&str, Option<usize>> = HashMap::new();
        let rings = in_rings(network.feeds, network.ties);
        let draft = self.draft;
        for record in &draft.meters {
            let index = match known.get(&*record.meter) {
                Some(index) => *index,
                None => {
                    let index = self.meter_place(network, record).map(|place| {
                        let name = record.meter.clone();
                        meters.push(Meter { name, place, outer: None, channels: Vec::new() });
                        origins.push(Vec::new());
                        meters.len() - 1
                    });
                    known.insert(&record.meter, index);
                    if let Some(index) = index {
                        self.check_place_is_free(&meters, index, record);
                    }
                    index
                }
            };
            let (Some(meter), Some(rows)) =
                (index.and_then(|i| meters.get_mut(i)), index.and_then(|i| origins.get_mut(i)))
            else {
                continue;
            };
            let (reading, reactive) = (record.reading, record.reactive);
            meter.channels.push(Channel { phase: record.phase, reading, reactive, shares: Vec::new() });
            rows.push(record.origin);
            let place = meter.place;
            self.check_phase(network, place, record);
            if matches!(place, MeterPlace::Branch { branch, .. } if rings.contains(&branch)) {
                self.ring_meter(record);
            }
        }
        (meters, origins)
    }

    fn meter_place(&mut self, network: &Metered<'_>, record: &MeterRecord) -> Option<MeterPlace> {
        let graph = &network.joined.graph;
        let who = format!("meter {} is at", record.meter);
        match &record.site {
            MeterSite::Head => Some(MeterPlace::Head),
            MeterSite::Node(name) => {
                let Some(&node) = graph.index.get(name) else {
                    self.unknown_node(graph, name, record.origin, &who);
                    return None;
                };
                let Some(id) = network.new_node.get(node).copied().flatten() else {
                    self.unfed_meter(record, "node", name);
                    return None;
                };
                Some(network.feeds.get(id.index()).copied().flatten().map_or(MeterPlace::Head, |feed| {
                    let end = if feed.upstream == End::From { End::To } else { End::From };
                    MeterPlace::Branch { branch: feed.branch, end, upstream: feed.upstream }
                }))
            }
            MeterSite::Line(name) => {
                let Some(&raw) = network.parts.lines.get(name) else {
                    self.unknown_line(network, record, name);
                    return None;
                };
                let branch = network.parts.new_branch.get(raw).copied().flatten();
                let feed = branch.and_then(|b| network.feeds.iter().flatten().find(|f| f.branch == b));
                let Some(feed) = feed else {
                    if branch.is_some() {
                        self.ring_meter(record);
                        return None;
                    }
                    self.unfed_meter(record, "line", name);
                    return None;
                };
                Some(MeterPlace::Branch { branch: feed.branch, end: End::From, upstream: feed.upstream })
            }
        }
    }

    fn unknown_line(&mut self, network: &Metered<'_>, record: &MeterRecord, name: &Name) {
        let known = self.draft.lines.iter().any(|l| l.line == *name);
        if known {
            return self.unfed_meter(record, "line", name);
        }
        let cure = match nearest(name, network.parts.lines.keys().map(|n| &**n)) {
            Some(near) => format!("did you mean {near:?}?"),
            None => "give the name of a line in lines.csv, or a node".to_string(),
        };
        let message = format!("meter {} is at line {name:?}, which does not exist", record.meter);
        self.diagnostics.error(
            Code::UnknownLine,
            place(self.draft, record.origin, "line", name),
            message,
            cure,
        );
    }

    fn unfed_meter(&mut self, record: &MeterRecord, what: &str, name: &Name) {
        self.diagnostics.error(
            Code::MeterNotFed,
            place(self.draft, record.origin, what, name),
            format!("meter {} is at {what} {name}, which is not fed: it can read nothing", record.meter),
            "close the switch or line that feeds it, or take the meter out",
        );
    }

    fn ring_meter(&mut self, record: &MeterRecord) {
        let (column, found) = match &record.site {
            MeterSite::Head => ("meter", &record.meter),
            MeterSite::Node(name) => ("node", name),
            MeterSite::Line(name) => ("line", name),
        };
        self.diagnostics.error(
            Code::NotSupported,
            place(self.draft, record.origin, column, found),
            format!("meter {} reads a branch of a closed ring: the loads behind it are fed from its other side as well", record.meter),
            "move the meter out of the ring, open the ring where it was open when the meter was read, or take the meter out",
        );
    }

    fn check_place_is_free(&mut self, meters: &[Meter], index: usize, record: &MeterRecord) {
        let same = |m: &&Meter| meters.get(index).is_some_and(|own| own.place == m.place);
        let Some(other) = meters.iter().take(index).find(same) else { return };
        self.diagnostics.error(
            Code::Conflict,
            place(self.draft, record.origin, "meter", &record.meter),
            format!("meters {} and {} read at the same place", other.name, record.meter),
            "keep one of them; rows for the phases of one meter share its name",
        );
    }

    fn check_phase(&mut self, network: &Metered<'_>, at: MeterPlace, record: &MeterRecord) {
        let Some(phase) = record.phase else { return };
        let carried = match at {
            MeterPlace::Head => network.joined.carried.conductors.first().copied().unwrap_or_default(),
            MeterPlace::Branch { branch, end, .. } => match network.parts.branches.get(branch.index()) {
                Some(b) if end == End::From => b.from_conductors,
                Some(b) => b.to_conductors,
                None => return,
            },
        };
        if !carried.has(phase) {
            self.diagnostics.error(
                Code::PhaseNotCarried,
                place(self.draft, record.origin, "phases", phase.letter()),
                format!("meter {} reads phase {phase}, but only {carried} is carried there", record.meter),
                "name a phase that is carried, or leave phases blank for the total",
            );
        }
    }

    /// Adds a load to the readings of its meter that it takes part in; a load split into `pieces`
    /// has its row's share spread over them.
    fn join(
        &mut self,
        network: &Metered<'_>,
        zones: &Zones,
        meters: &mut [Meter],
        index: usize,
        record: &ShareRecord,
        (load, data, pieces): (usize, &Load, usize),
    ) {
        let Some(meter) = meters.get_mut(index) else { return };
        let share = |part: f64| Share { load, part: part * record.amount, ratio: record.ratio };
        if let [Channel { phase: None, shares, .. }] = &mut meter.channels[..] {
            shares.push(share(1.0));
            return;
        }
        let phases = phases_at(network.parts, network.feeds, zones, index, data);
        let over = pieces.max(1) as f64;
        for (phase, part) in phases {
            match meter.channels.iter_mut().find(|c| c.phase == Some(phase)) {
                Some(channel) => channel.shares.push(share(part / over)),
                None => self.diagnostics.error(
                    Code::NoReading,
                    place(self.draft, record.origin, "load", &record.load),
                    format!(
                        "load {} takes part of its power from phase {phase}, which meter {} does not read",
                        record.load, meter.name
                    ),
                    format!("add a row for phase {phase} of that meter, or give the load its kw"),
                ),
            }
        }
    }

    fn unmetered(&mut self, record: &ShareRecord) {
        let cure = if self.draft.meters.is_empty()
            && self.draft.sources.files().iter().any(|f| f.name.eq_ignore_ascii_case("meters.csv"))
        {
            "add a row to meters.csv for the head of the feeder, with its kw, or give the load its kw"
        } else if self.draft.meters.is_empty() {
            "add meters.csv with the demand at the head of the feeder, or give the load its kw"
        } else {
            "add a meter between it and the source, or give the load its kw"
        };
        self.diagnostics.error(
            Code::NoReading,
            place(self.draft, record.origin, record.basis.column(), &record.amount.to_string()),
            format!("load {} has a share, but no meter is between it and the source", record.load),
            cure,
        );
    }

    /// Amounts of different kinds cannot be added.
    fn check_basis(
        &mut self,
        pieces: &[(Load, Name)],
        zones: &Zones,
        meter: usize,
        name: &Name,
        shares: &HashMap<&str, &ShareRecord>,
    ) {
        let mut first: Option<(ShareBasis, &Name)> = None;
        for (load, owner) in pieces.iter().filter(|(l, _)| zones.meter_of(l) == Some(meter)) {
            let Some(record) = shares.get(&**owner) else { continue };
            let (basis, other) = *first.get_or_insert((record.basis, owner));
            if basis != record.basis {
                self.diagnostics.error(
                    Code::Conflict,
                    place(self.draft, record.origin, record.basis.column(), &record.amount.to_string()),
                    format!(
                        "loads {other} and {} share meter {name} by {} and by {}, which cannot be added",
                        load.name,
                        basis.column(),
                        record.basis.column()
                    ),
                    "use one of the columns for all loads under a meter",
                );
                return;
            }
        }
    }

    /// A reading needs loads to share it, some of them with more than nothing, and power factors.
    fn check_channel(
        &mut self,
        records: &HashMap<&str, &ShareRecord>,
        pieces: &[(Load, Name)],
        meters: &mut [Meter],
        (meter, channel): (usize, usize),
        origin: Option<Origin>,
    ) {
        let Some(m) = meters.get_mut(meter) else { return };
        let name = m.name.clone();
        let Some(c) = m.channels.get_mut(channel) else { return };
        let what = c.phase.map_or(format!("meter {name}"), |p| format!("phase {p} of meter {name}"));
        let at = place(self.draft, origin, "meter", &name);
        let sum: f64 = c.shares.iter().map(|s| s.part).sum();
        if c.shares.is_empty() {
            let message = format!("no load shares {what}: nothing can be changed to meet it");
            let cure = "give loads behind it (and behind no other meter) a share_kva, share_kwh or share_weight, or take the meter out";
            self.diagnostics.error(Code::NoShare, at, message, cure);
            return;
        }
        if sum <= 0.0 {
            let message = format!("the shares of all loads behind {what} are zero");
            self.diagnostics.error(
                Code::NoShare,
                at,
                message,
                "give at least one of them a share above zero",
            );
            return;
        }
        c.shares.iter_mut().for_each(|s| s.part /= sum);
        let open = c.shares.iter().filter(|s| s.ratio.is_none() && s.part > 0.0).count();
        if c.reactive == ReactiveReading::None {
            for share in c.shares.iter().filter(|s| s.ratio.is_none()) {
                let Some((_, owner)) = pieces.get(share.load) else { continue };
                let origin = records.get(&**owner).and_then(|r| r.origin);
                self.diagnostics.error(
                    Code::MissingValue,
                    place(self.draft, origin, "pf", ""),
                    format!("neither load {owner} nor {what} has a power factor"),
                    "fill in the pf of the load, or kvar or pf of the meter",
                );
            }
        } else if open == 0 {
            self.diagnostics.error(
                Code::Conflict,
                at,
                format!(
                    "{what} gives its reactive power, but every load behind it has a power factor of its own"
                ),
                "clear the pf of at least one load, or kvar and pf of the meter",
            );
        }
    }
}

/// The loads, each with the name of its row; those that `splits` picks as one load an element.
fn split(loads: &[Load], splits: impl Fn(&Load) -> bool) -> Vec<(Load, Name)> {
    let mut pieces = Vec::with_capacity(loads.len());
    for load in loads {
        let elements = load.connection.elements();
        if elements < 2 || !splits(load) {
            pieces.push((load.clone(), load.name.clone()));
            continue;
        }
        for (c, _) in load.connection.pairs() {
            let one = std::iter::once(c).collect();
            let (connection, what) = match load.connection {
                Connection::Star(_) => (Connection::Star(one), c.letter().to_string()),
                Connection::Delta(_) => {
                    (Connection::Delta(one), format!("{}-{}", c.letter(), c.next().letter()))
                }
            };
            let name = Name::from(format!("{} ({what})", load.name));
            let share = 1.0 / elements as f64;
            let (watts, vars) = (load.watts * share, load.vars * share);
            pieces.push((Load { name, connection, watts, vars, ..load.clone() }, load.name.clone()));
        }
    }
    pieces
}

/// The branch and node where a load hangs: what it is behind.
pub(super) fn hangs(load: &Load) -> (Option<NodeId>, Option<BranchId>) {
    match load.place {
        LoadPlace::Node(node) => (Some(node), None),
        LoadPlace::Line(line) => (None, Some(line)),
    }
}
