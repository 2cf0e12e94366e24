//! The arrays of the sweep, in the order in which it visits them, and how they are filled.
//!
//! Position 0 is the supply's held voltage; positions 1 to n are the nodes, breadth first, so a
//! parent stands before its children and the latency of one node hides behind its neighbours.
//! Within a level, nodes are sorted by what has to be done at them; a [`Run`] is a stretch of
//! equal work, so the passes have no choice to make a node.

use super::branch::{
    Eliminated, Floating, NO_IMPEDANCE, Seen, SingularNode, TwoPort, eliminate, shunt_matrix,
    supply_impedance, two_port,
};
use super::injection::{Gathered, Mixed, StarPower, gather};
use super::lanes::{Columns, Slots};
use super::ports::Ports;
use crate::math::{Complex64, PhaseMatrix, ZERO};
use crate::network::{BranchKind, LoadModel, MotorState, Network, NodeId};

/// Work at the branch of a position.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum BranchWork {
    /// Series impedance; at most the neutral shunted below.
    Series,
    /// General matrices.
    Dense,
    /// General matrices with a rank-one part of its own.
    Floating,
}

/// Work at the loads of a position.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum LoadWork {
    None,
    Star,
    Mixed,
}

/// A stretch of positions with equal work; the data of its first position stand at these indices.
#[derive(Debug, Clone, Copy)]
pub(super) struct Run {
    pub branch: BranchWork,
    pub load: LoadWork,
    pub start: usize,
    pub end: usize,
    pub branch_data: usize,
    pub load_data: usize,
}

/// A series branch: its impedance per metre in [`Layout::table`], its length, and the neutral's
/// `beta`, siemens. A table a construction instead of a matrix a branch: the sweep of a long
/// feeder waits for memory, not for arithmetic.
#[derive(Debug, Clone, Copy)]
pub(super) struct SeriesData {
    pub table: u32,
    pub length_m: f64,
    pub beta: Complex64,
}

/// Matrices of a general branch: `M`, its transpose, and `N`.
#[derive(Debug, Clone, Copy)]
pub(super) struct DenseData {
    pub m: Columns,
    pub m_transposed: Columns,
    pub n: Columns,
}

/// Matrices of a branch behind which nothing holds the conductors firmly to earth (see [`super::branch::Floating`]).
#[derive(Debug, Clone, Copy)]
pub(super) struct FloatingData {
    pub dense: DenseData,
    pub q: Slots,
    pub scale: Complex64,
}

/// Tree and matrices, fixed while loads and voltages change.
#[derive(Debug)]
pub(super) struct Layout {
    /// Position of the parent of each position.
    pub parent: Vec<u32>,
    pub runs: Vec<Run>,
    /// Impedances per metre: one a construction, then that of switches, then the supply's whole.
    pub table: Vec<Columns>,
    pub series: Vec<SeriesData>,
    pub dense: Vec<DenseData>,
    pub floating: Vec<FloatingData>,
    /// Inverse square of nominal phase voltage by position, 1/V^2.
    pub per_nominal2: Vec<f64>,
}

/// Load records in the order of the positions that have one.
#[derive(Debug)]
pub(super) struct Loads<S = f64> {
    pub star: Vec<StarPower<S>>,
    pub mixed: Vec<Mixed<S>>,
}

/// What the iteration changes, by position.
#[derive(Debug)]
pub(super) struct State<S = f64> {
    /// Voltages to earth, volts.
    pub volts: Vec<Slots<S>>,
    /// Load currents, own and gathered from below, amperes.
    pub amps: Vec<Slots<S>>,
    /// Voltage drop of the gathered currents in the branch, volts.
    pub drop: Vec<Slots<S>>,
}

/// Everything the iteration of one network touches. Building it allocates; iterating does not.
#[derive(Debug)]
pub struct Workspace<'a> {
    pub(super) network: &'a Network,
    /// Node at each position, from position 1.
    pub(super) nodes: Vec<NodeId>,
    pub(super) layout: Layout,
    pub(super) loads: Loads,
    pub(super) state: State,
    /// Linear admittance each node sees, by node index: needed once, for the currents.
    pub(super) seen: Vec<Seen>,
    /// Currents of rings and machines; `None` where there are none.
    pub(super) ports: Option<Box<Ports>>,
    /// The network itself, where [`Self::network`] is that with its rings opened.
    pub(super) whole: &'a Network,
}

impl<'a> Workspace<'a> {
    /// Lays out and eliminates a network without rings.
    ///
    /// # Errors
    /// The node where the linear part has no solution (opposite impedances, or a side without reference).
    pub fn new(network: &'a Network) -> Result<Workspace<'a>, NodeId> {
        let mut seen = own_shunts(network);
        let mut ports = eliminate_all(network, &mut seen)?;
        let gathered = gather(network);
        let nodes = sweep_order(network, &ports, &gathered);
        let count = nodes.len() + 1;
        let mut layout = Layout {
            parent: parents(network, &nodes),
            runs: Vec::new(),
            table: impedance_table(network),
            series: Vec::with_capacity(count),
            dense: Vec::new(),
            floating: Vec::new(),
            per_nominal2: vec![1.0; count],
        };
        let mut loads = Loads { star: Vec::with_capacity(count), mixed: Vec::new() };
        for (i, id) in nodes.iter().enumerate() {
            layout.per_nominal2[i + 1] = network.node(*id).nominal_phase_volts().powi(-2);
            if let Some(eliminated) = ports[id.index()].take() {
                let gathered = &gathered[id.index()];
                layout.extend_run(i + 1, branch_work(&eliminated), load_work(gathered), &loads);
                layout.push(eliminated, series_impedance(network, *id));
                loads.push(gathered);
            }
        }
        let zero = vec![Slots::ZERO; count];
        let mut state = State { volts: zero.clone(), amps: zero.clone(), drop: zero };
        state.volts[0] = Slots::from(&network.supply.held_volts);
        Ok(Workspace { network, nodes, layout, loads, state, seen, ports: None, whole: network })
    }

    /// The same for a network with rings and that network with its rings opened ([`Network::opened`]).
    ///
    /// # Errors
    /// As [`Self::new`]; also where a ring leaves a current undetermined.
    pub fn meshed(whole: &'a Network, opened: &'a Network) -> Result<Workspace<'a>, NodeId> {
        Self::with_machines(whole, opened, &[])
    }

    /// The same, with machines at three-phase nodes whose admittances are given later and may change.
    ///
    /// # Errors
    /// As [`Self::meshed`].
    pub(super) fn with_machines(
        whole: &'a Network,
        opened: &'a Network,
        machines: &[NodeId],
    ) -> Result<Workspace<'a>, NodeId> {
        let mut workspace = Workspace::new(opened)?;
        workspace.ports = Some(Box::new(Ports::new(&mut workspace, whole, machines)?));
        workspace.whole = whole;
        Ok(workspace)
    }
}

impl Layout {
    /// Takes a position into the last run, or begins a new one where its work differs.
    fn extend_run(&mut self, position: usize, branch: BranchWork, load: LoadWork, loads: &Loads) {
        if let Some(run) = self.runs.last_mut()
            && (run.branch, run.load) == (branch, load)
        {
            run.end = position + 1;
            return;
        }
        let branch_data = match branch {
            BranchWork::Series => self.series.len(),
            BranchWork::Dense => self.dense.len(),
            BranchWork::Floating => self.floating.len(),
        };
        let load_data = match load {
            LoadWork::None => 0,
            LoadWork::Star => loads.star.len(),
            LoadWork::Mixed => loads.mixed.len(),
        };
        self.runs.push(Run { branch, load, start: position, end: position + 1, branch_data, load_data });
    }

    fn push(&mut self, eliminated: Eliminated, (table, length_m): (u32, f64)) {
        match eliminated {
            Eliminated::Series { beta } => self.series.push(SeriesData { table, length_m, beta }),
            Eliminated::Dense(matrices) => {
                let [m, n] = *matrices;
                self.dense.push(DenseData::new(&m, &n));
            }
            Eliminated::Floating(parts) => {
                let Floating { m, n, q, scale } = *parts;
                self.floating.push(FloatingData { dense: DenseData::new(&m, &n), q: Slots::from(&q), scale });
            }
        }
    }
}

impl DenseData {
    fn new(m: &PhaseMatrix, n: &PhaseMatrix) -> Self {
        DenseData { m: Columns::from(m), m_transposed: Columns::from(&m.transpose()), n: Columns::from(n) }
    }
}

/// Impedances of [`Layout::table`].
fn impedance_table(network: &Network) -> Vec<Columns> {
    let constructions = network.constructions.iter().map(|c| &c.z_per_m);
    let others = [NO_IMPEDANCE, supply_impedance(network)];
    constructions.chain(&others).map(Columns::from).collect()
}

/// Entry of [`Layout::table`] and length of the branch that feeds a node; of no meaning for one without series impedance.
fn series_impedance(network: &Network, id: NodeId) -> (u32, f64) {
    let lines = network.constructions.len() as u32;
    match network.feeds[id.index()].map(|feed| &network.branch(feed.branch).kind) {
        Some(BranchKind::Line(line)) => (line.construction.0, line.length_m / f64::from(line.sets)),
        Some(_) => (lines, 0.0),
        None => (lines + 1, 1.0),
    }
}

impl Loads {
    fn push(&mut self, gathered: &Gathered) {
        match gathered {
            Gathered::None => {}
            Gathered::Star(star) => self.star.push(*star),
            Gathered::Mixed(mixed) => self.mixed.push(*mixed),
        }
    }
}

fn branch_work(eliminated: &Eliminated) -> BranchWork {
    match eliminated {
        Eliminated::Series { .. } => BranchWork::Series,
        Eliminated::Dense(_) => BranchWork::Dense,
        Eliminated::Floating(_) => BranchWork::Floating,
    }
}

fn load_work(gathered: &Gathered) -> LoadWork {
    match gathered {
        Gathered::None => LoadWork::None,
        Gathered::Star(_) => LoadWork::Star,
        Gathered::Mixed(_) => LoadWork::Mixed,
    }
}

/// Linear shunts of every node: electrode and reference, charging of its lines, capacitors, constant impedances.
pub(super) fn own_shunts(network: &Network) -> Vec<Seen> {
    let mut seen: Vec<Seen> = network
        .nodes
        .iter()
        .map(|node| {
            let y = node.earth_admittance();
            let mut own = Seen::Neutral(y[3]);
            if y[..3].iter().any(|&phase| phase != ZERO) {
                own.add_matrix(&PhaseMatrix::from_diagonal(&[y[0], y[1], y[2], ZERO].into()));
            }
            own
        })
        .collect();
    for branch in &network.branches {
        let BranchKind::Line(line) = &branch.kind else { continue };
        if network.construction(line).y_per_m.iter().all(|&y| y == ZERO) {
            continue;
        }
        let half = network.line_shunt(line) * Complex64::from(0.5);
        seen[branch.from.index()].add_matrix(&half);
        seen[branch.to.index()].add_matrix(&half);
    }
    for capacitor in &network.capacitors {
        let each = capacitor.vars / capacitor.connection.elements().max(1) as f64;
        let siemens = Complex64::new(0.0, each / (capacitor.rated_volts * capacitor.rated_volts));
        let conductors = network.node(capacitor.node).conductors;
        seen[capacitor.node.index()].add_matrix(&shunt_matrix(capacitor.connection, siemens, conductors));
    }
    for motor in network.motors.iter().filter(|m| m.state == MotorState::Running) {
        let y = motor.machine.circuit.phase_matrix(motor.slip) * Complex64::from(f64::from(motor.count));
        let mut four = PhaseMatrix::zeros();
        four.fixed_view_mut::<3, 3>(0, 0).copy_from(&y);
        seen[motor.node.index()].add_matrix(&four);
    }
    for load in network.loads.iter().filter(|l| l.model == LoadModel::Impedance) {
        let each = Complex64::new(load.watts, -load.vars) / load.connection.elements().max(1) as f64;
        for (id, share) in network.load_sites(load) {
            let node = network.node(id);
            let siemens = each * share / node.nominal_across(load.connection).powi(2);
            seen[id.index()].add_matrix(&shunt_matrix(load.connection, siemens, node.conductors));
        }
    }
    seen
}

/// Eliminates from the leaves to the supply; `seen` ends as what every node sees.
fn eliminate_all(network: &Network, seen: &mut [Seen]) -> Result<Vec<Option<Eliminated>>, NodeId> {
    let supply = supply_impedance(network);
    let mut ports: Vec<Option<Eliminated>> = Vec::new();
    ports.resize_with(network.nodes.len(), || None);
    for &id in network.order.iter().rev() {
        let singular = |_: SingularNode| id;
        let (port, parent) = match network.feeds[id.index()] {
            Some(feed) => {
                let port = two_port(network, network.branch(feed.branch), feed.upstream).map_err(singular)?;
                (port, Some(feed.parent))
            }
            None => (TwoPort::Series { per_m: &supply, length_m: 1.0 }, None),
        };
        let (eliminated, above) = eliminate(&port, &seen[id.index()]).map_err(singular)?;
        ports[id.index()] = Some(eliminated);
        if let Some(parent) = parent {
            seen[parent.index()].add(&above);
        }
    }
    Ok(ports)
}

/// The network's breadth-first order with each level sorted by work.
fn sweep_order(network: &Network, ports: &[Option<Eliminated>], gathered: &[Gathered]) -> Vec<NodeId> {
    let mut order = network.order.clone();
    let mut depth = vec![0u32; network.nodes.len()];
    for &id in &network.order {
        if let Some(feed) = network.feeds[id.index()] {
            depth[id.index()] = depth[feed.parent.index()] + 1;
        }
    }
    let work = |id: NodeId| {
        let branch = ports[id.index()].as_ref().map(branch_work);
        (branch, load_work(&gathered[id.index()]))
    };
    order.sort_by_key(|&id| (depth[id.index()], work(id)));
    order
}

/// Position of each position's parent; the supply node hangs on position 0.
fn parents(network: &Network, order: &[NodeId]) -> Vec<u32> {
    let mut position = vec![0u32; network.nodes.len()];
    for (i, id) in order.iter().enumerate() {
        position[id.index()] = i as u32 + 1;
    }
    let of = |id: &NodeId| network.feeds[id.index()].map_or(0, |feed| position[feed.parent.index()]);
    std::iter::once(0).chain(order.iter().map(of)).collect()
}
