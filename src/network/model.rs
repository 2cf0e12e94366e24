//! The network as it is solved: a tree of nodes and branches and the ties that close rings in it,
//! checked and with indices.
//!
//! Only [`super::build`] makes one, so whoever holds a [`Network`] may rely on this:
//! every node is fed from the supply by exactly one path of the tree; every branch carries only
//! conductors both its nodes have; impedances are positive; names are unique a kind.

use super::conductor::{Conductor, Conductors, Connection};
use super::draft::{Construction, Name, SwitchState};
use super::generator::Generator;
use super::load::{Capacitor, CapacitorBank, Load, LoadPlace};
use super::meter::Meter;
use super::motor::Motor;
use super::regulator::Regulator;
use super::study::Study;
use super::supply::Supply;
use super::transformer::Transformer;
use crate::math::{Complex64, PhaseMatrix};

/// Index of a node in [`Network::nodes`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct NodeId(pub u32);

/// Index of a branch in [`Network::branches`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct BranchId(pub u32);

/// Index of a construction in [`Network::constructions`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct ConstructionId(pub u32);

impl NodeId {
    /// As an index of [`Network::nodes`].
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

impl BranchId {
    /// As an index of [`Network::branches`].
    pub fn index(self) -> usize {
        self.0 as usize
    }
}

/// An electrode of zero ohms is solved as one of a micro-ohm.
pub const SOLID_EARTH_OHM: f64 = 1e-6;

/// Phase-to-neutral voltage where these conductors have that line-to-line voltage, volts.
pub(super) fn nominal_phase_volts(conductors: Conductors, line_to_line: f64) -> f64 {
    if conductors.is_split() { line_to_line / 2.0 } else { line_to_line / crate::units::SQRT_3 }
}

/// A node: up to four conductors at one place.
#[derive(Debug, Clone)]
pub struct Node {
    /// Name.
    pub name: Name,
    /// Conductors it carries.
    pub conductors: Conductors,
    /// Nominal line-to-line voltage, volts; behind a centre tap between s1 and s2.
    pub nominal_volts: f64,
    /// Electrode from the neutral to remote earth, ohms (at least [`SOLID_EARTH_OHM`]); `None`: none.
    pub earth_ohm: Option<f64>,
    /// Susceptance to earth, siemens, that gives a side earthed nowhere its reference. Zero at
    /// every other node.
    pub reference_siemens: f64,
    /// Conductors that each have that susceptance: the neutral where earthing it would hold the
    /// side, else the phases.
    pub reference_on: Conductors,
    /// Coordinates for drawing.
    pub xy: Option<[f64; 2]>,
}

impl Node {
    /// Nominal phase-to-neutral voltage, volts; behind a centre tap that of one half.
    pub fn nominal_phase_volts(&self) -> f64 {
        nominal_phase_volts(self.conductors, self.nominal_volts)
    }

    /// Nominal voltage across each element of a load or capacitor joined so, volts.
    pub fn nominal_across(&self, connection: Connection) -> f64 {
        match connection {
            Connection::Star(_) => self.nominal_phase_volts(),
            Connection::Delta(_) => self.nominal_volts,
        }
    }

    /// Admittance from each conductor to earth of electrode and reference, siemens, slots a, b, c, n.
    pub fn earth_admittance(&self) -> [Complex64; 4] {
        let mut y = [Complex64::new(0.0, 0.0); 4];
        let n = Conductor::N.slot();
        if let Some(ohm) = self.earth_ohm {
            y[n] += 1.0 / ohm;
        }
        for c in self.reference_on.iter() {
            y[c.slot()] += Complex64::new(0.0, self.reference_siemens);
        }
        y
    }
}

/// A line: construction, length and number of equal circuits.
#[derive(Debug, Clone)]
pub struct Line {
    /// Construction.
    pub construction: ConstructionId,
    /// Length, metres.
    pub length_m: f64,
    /// Equal circuits in parallel.
    pub sets: u32,
}

/// What a branch is.
#[derive(Debug, Clone)]
pub enum BranchKind {
    /// Series impedance with half the shunt admittance at each end (pi model).
    Line(Line),
    /// A closed switch: no impedance.
    Switch,
    /// A regulator bank: an ideal ratio.
    Regulator(Regulator),
    /// A transformer.
    Transformer(Transformer),
}

impl BranchKind {
    /// Word used in results: `line`, `switch`, `regulator`, `transformer`.
    pub fn word(&self) -> &'static str {
        match self {
            BranchKind::Line(_) => "line",
            BranchKind::Switch => "switch",
            BranchKind::Regulator(_) => "regulator",
            BranchKind::Transformer(_) => "transformer",
        }
    }
}

/// A branch between two nodes.
#[derive(Debug, Clone)]
pub struct Branch {
    /// Name.
    pub name: Name,
    /// Node at the from end, as the user wrote it.
    pub from: NodeId,
    /// Node at the to end.
    pub to: NodeId,
    /// Conductors at the from end.
    pub from_conductors: Conductors,
    /// Conductors at the to end; the same but for transformers.
    pub to_conductors: Conductors,
    /// Current rating, amperes, of a line.
    pub rating_amps: Option<f64>,
    /// What it is.
    pub kind: BranchKind,
}

/// How a node hangs on the tree.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Feed {
    /// Branch that feeds the node.
    pub branch: BranchId,
    /// Node at the other end, towards the source.
    pub parent: NodeId,
    /// Which end of the branch is towards the source.
    pub upstream: End,
}

/// A closed branch that the tree leaves out: it closes a ring. Its `upstream` end is at `near`, its
/// other end at `far`; both nodes are fed without it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Tie {
    /// The branch.
    pub branch: BranchId,
    /// Node at its end nearer the source.
    pub near: NodeId,
    /// Node at its other end.
    pub far: NodeId,
    /// Which end of the branch is at `near`.
    pub upstream: End,
}

/// Where a [`Stay`] stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StayPlace {
    /// At a node.
    Node(NodeId),
    /// At the far end of a tie, on its side of the opening: index in [`Network::ties`].
    TieEnd(usize),
}

/// A susceptance to earth for a part of the network that only its ties hold: with the rings opened
/// it would float. It is no part of the network; a method that opens rings may put it there if it
/// takes its current out again.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stay {
    /// Where it stands.
    pub place: StayPlace,
    /// Susceptance on each conductor, siemens.
    pub siemens: f64,
    /// Conductors that have it.
    pub on: Conductors,
}

/// An end of a branch.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// The from end.
    From,
    /// The to end.
    To,
}

/// A checked network: a tree of branches from the supply, and ties that close rings.
#[derive(Debug, Clone)]
pub struct Network {
    /// Time of the profiles that loads and capacitors are taken at; `None`: as their rows say.
    pub at: Option<Name>,
    /// Settings and limits.
    pub study: Study,
    /// The supply.
    pub supply: Supply,
    /// Nodes in the order their names first appear.
    pub nodes: Vec<Node>,
    /// Closed branches.
    pub branches: Vec<Branch>,
    /// Constructions the lines use.
    pub constructions: Vec<Construction>,
    /// Loads.
    pub loads: Vec<Load>,
    /// Capacitors in service: the closed ones of `capacitor_banks`.
    pub capacitors: Vec<Capacitor>,
    /// Every capacitor with what switches it.
    pub capacitor_banks: Vec<CapacitorBank>,
    /// Meters whose readings loads share; those loads draw nothing until they are allocated
    /// (see `study::allocation`), so a network with meters is not solved as it stands.
    pub meters: Vec<Meter>,
    /// Generators in service.
    pub generators: Vec<Generator>,
    /// Motors.
    pub motors: Vec<Motor>,
    /// How each node is fed; `None` only for the supply node.
    pub feeds: Vec<Option<Feed>>,
    /// Nodes from the supply outwards, breadth first: a parent stands before its children.
    pub order: Vec<NodeId>,
    /// Branches that close rings; none in a radial network.
    pub ties: Vec<Tie>,
    /// What would float with the rings opened.
    pub stays: Vec<Stay>,
}

impl Network {
    /// The node of that index.
    pub fn node(&self, id: NodeId) -> &Node {
        &self.nodes[id.index()]
    }

    /// The branch of that index.
    pub fn branch(&self, id: BranchId) -> &Branch {
        &self.branches[id.index()]
    }

    /// Construction of a line.
    pub fn construction(&self, line: &Line) -> &Construction {
        &self.constructions[line.construction.0 as usize]
    }

    /// Series impedance of a whole line, ohms: per metre, times length, over the circuits in parallel.
    pub fn line_impedance(&self, line: &Line) -> PhaseMatrix {
        self.construction(line).z_per_m * Complex64::from(line.length_m / f64::from(line.sets))
    }

    /// Shunt admittance of a whole line, siemens; half of it stands at each end.
    pub fn line_shunt(&self, line: &Line) -> PhaseMatrix {
        self.construction(line).y_per_m * Complex64::from(line.length_m * f64::from(line.sets))
    }

    /// The network with its rings opened at the far ends of the ties: each tie leads to a node of
    /// its own, after all others and in the order of [`Network::ties`], and the stays stand.
    pub fn opened(&self) -> Network {
        let mut opened = self.clone();
        for tie in std::mem::take(&mut opened.ties) {
            let tail = NodeId(opened.nodes.len() as u32);
            let far = self.node(tie.far);
            let branch = &mut opened.branches[tie.branch.index()];
            let conductors = match tie.upstream {
                End::From => {
                    branch.to = tail;
                    branch.to_conductors
                }
                End::To => {
                    branch.from = tail;
                    branch.from_conductors
                }
            };
            opened.nodes.push(Node {
                conductors,
                earth_ohm: None,
                reference_siemens: 0.0,
                reference_on: Conductors::NONE,
                ..far.clone()
            });
            opened.feeds.push(Some(Feed { branch: tie.branch, parent: tie.near, upstream: tie.upstream }));
            opened.order.push(tail);
        }
        for stay in std::mem::take(&mut opened.stays) {
            let index = match stay.place {
                StayPlace::Node(id) => id.index(),
                StayPlace::TieEnd(tie) => self.nodes.len() + tie,
            };
            let node = &mut opened.nodes[index];
            (node.reference_siemens, node.reference_on) = (stay.siemens, stay.on);
        }
        opened
    }

    /// Closes or opens a capacitor bank; one that is not there changes nothing.
    pub fn switch_capacitor(&mut self, bank: usize, state: SwitchState) {
        if let Some(bank) = self.capacitor_banks.get_mut(bank) {
            bank.state = state;
        }
        self.capacitors = CapacitorBank::in_service(&self.capacitor_banks);
    }

    /// Nodes where a load draws, each with its share of the load.
    pub fn load_sites(&self, load: &Load) -> impl Iterator<Item = (NodeId, f64)> + use<> {
        let sites = match load.place {
            LoadPlace::Node(node) => [Some((node, 1.0)), None],
            LoadPlace::Line(line) => {
                let branch = self.branch(line);
                [Some((branch.from, 0.5)), Some((branch.to, 0.5))]
            }
        };
        sites.into_iter().flatten()
    }
}
