//! A second way to solve a network, for comparison: nodal admittance of every conductor terminal,
//! with a current unknown for every ideal element and a voltage unknown for every star point, in
//! rectangular coordinates by Newton's method and dense LU. Loads are raised from nothing to all,
//! so that of several solutions it is the one that no load leads to: the highest voltage.
//!
//! Written from the equations in the documentation of `fourwire::network`; it uses the network's
//! data and nothing of the solver.

use std::collections::HashMap;

use fourwire::math::Complex64;
use fourwire::network::{
    Across, Branch, BranchKind, Conductor, Connection, LoadModel, MotorState, Network, NodeId,
};
use nalgebra::{DMatrix, DVector};

#[path = "coils.rs"]
mod coils;
#[path = "newton.rs"]
mod newton;
use newton::{at, follow};

#[allow(dead_code)] // not every test looks at all of it
/// Solved voltages by node and slot, current drawn from the source, and total losses.
pub struct NodalSolution {
    /// Volts to earth, slots a, b, c, n.
    pub volts: Vec<[Complex64; 4]>,
    /// Amperes from the supply in each slot.
    pub source_amps: [Complex64; 4],
    /// Source power less power drawn by loads and capacitors, volt-amperes.
    pub losses: Complex64,
    /// Whether the solution was followed from no load to full load without a leap.
    pub followed: bool,
}

/// One end of something: an unknown voltage, or earth.
type Terminal = Option<usize>;

/// A single-phase load element.
struct Element {
    from: Terminal,
    to: Terminal,
    power: Complex64,
    model: LoadModel,
    nominal: f64,
    floor: f64,
}

impl Element {
    /// Current `conj(S) u g(m)` with `m = |u|^2`; gives `g` and its derivative.
    fn gain(&self, m: f64) -> (f64, f64) {
        let floor2 = (self.floor * self.nominal).powi(2);
        match self.model {
            LoadModel::Impedance => (self.nominal.powi(-2), 0.0),
            LoadModel::Current => (1.0 / (self.nominal * m.sqrt()), -0.5 / (self.nominal * m.powf(1.5))),
            LoadModel::Power if m >= floor2 => (1.0 / m, -1.0 / (m * m)),
            LoadModel::Power => ((2.0 - m / floor2) / floor2, -1.0 / (floor2 * floor2)),
        }
    }

    fn current(&self, u: Complex64) -> Complex64 {
        self.power.conj() * u * self.gain(u.norm_sqr()).0
    }
}

/// A term of the linear part: `value * (x[plus] - x[minus])` in one row. The difference is taken
/// first: summed products of voltage and admittance would leave, by rounding, a shunt to earth
/// that a side with hardly any earth feels.
struct Term {
    row: usize,
    plus: Terminal,
    minus: Terminal,
    value: Complex64,
}

/// Sparse complex rows of the linear part: `sum value (x - x') = right`.
struct System {
    count: usize,
    linear: Vec<Term>,
    right: Vec<Complex64>,
    elements: Vec<Element>,
}

impl System {
    fn unknown(&mut self) -> usize {
        self.count += 1;
        self.right.push(Complex64::default());
        self.count - 1
    }

    fn add(&mut self, row: Terminal, column: Terminal, value: Complex64) {
        self.difference(row, [column, None], value);
    }

    fn difference(&mut self, row: Terminal, [plus, minus]: [Terminal; 2], value: Complex64) {
        if let Some(row) = row {
            self.linear.push(Term { row, plus, minus, value });
        }
    }

    /// Admittance between two terminals.
    fn admittance(&mut self, a: Terminal, b: Terminal, y: Complex64) {
        self.difference(a, [a, b], y);
        self.difference(b, [b, a], y);
    }
}

/// Numbers of the voltage unknowns by node and slot.
struct Numbering(Vec<[Terminal; 4]>);

impl Numbering {
    fn at(&self, node: NodeId, c: Conductor) -> Terminal {
        self.0[node.index()][c.slot()]
    }
}

/// Solves a network; `None` where Newton's method does not settle.
pub fn solve_nodal(network: &Network) -> Option<NodalSolution> {
    let mut system = System { count: 0, linear: Vec::new(), right: Vec::new(), elements: Vec::new() };
    let numbering = Numbering(
        network
            .nodes
            .iter()
            .map(|node| [0, 1, 2, 3].map(|slot| node.conductors.has_slot(slot).then(|| system.unknown())))
            .collect(),
    );
    let source = add_supply(network, &numbering, &mut system);
    for branch in &network.branches {
        add_branch(network, branch, &numbering, &mut system);
    }
    add_shunts(network, &numbering, &mut system);
    let (x, followed) = follow(&system)?;
    Some(gather(network, &numbering, &source, &system, &x, followed))
}

fn add_supply(network: &Network, numbering: &Numbering, system: &mut System) -> HashMap<Conductor, usize> {
    let supply = &network.supply;
    let carried: Vec<Conductor> = network.node(supply.node).conductors.iter().collect();
    let currents: HashMap<Conductor, usize> = carried.iter().map(|&c| (c, system.unknown())).collect();
    for &c in &carried {
        let row = Some(currents[&c]);
        // V + Zs J + r sum(J) = E.
        system.add(row, numbering.at(supply.node, c), Complex64::from(1.0));
        for &other in &carried {
            let z = supply.impedance[(c.slot(), other.slot())] + supply.earth_ohm;
            system.add(row, Some(currents[&other]), z);
        }
        system.right[currents[&c]] = supply.held_volts[c.slot()];
        system.add(numbering.at(supply.node, c), row, Complex64::from(-1.0));
    }
    currents
}

fn add_branch(network: &Network, branch: &Branch, numbering: &Numbering, system: &mut System) {
    let carried: Vec<Conductor> = branch.from_conductors.iter().collect();
    match &branch.kind {
        BranchKind::Line(line) => {
            let (z, y) = (network.line_impedance(line), network.line_shunt(line));
            let inner = DMatrix::from_fn(carried.len(), carried.len(), |i, j| {
                z[(carried[i].slot(), carried[j].slot())]
            });
            let series = inner.try_inverse().expect("a line has an impedance");
            for (i, &p) in carried.iter().enumerate() {
                for (j, &q) in carried.iter().enumerate() {
                    let half = y[(p.slot(), q.slot())] / 2.0;
                    for (end, other) in [(branch.from, branch.to), (branch.to, branch.from)] {
                        let across = [numbering.at(end, q), numbering.at(other, q)];
                        system.difference(numbering.at(end, p), across, series[(i, j)]);
                        system.add(numbering.at(end, p), numbering.at(end, q), half);
                    }
                }
            }
        }
        BranchKind::Switch => {
            for &c in &carried {
                let current = Some(system.unknown());
                let (from, to) = (numbering.at(branch.from, c), numbering.at(branch.to, c));
                system.add(from, current, Complex64::from(1.0));
                system.add(to, current, Complex64::from(-1.0));
                system.difference(current, [from, to], Complex64::from(1.0));
            }
        }
        BranchKind::Regulator(bank) => {
            for &c in &carried {
                // One unknown a conductor: its current out of the to end. What it needs at the from
                // end follows from equal power: the coefficients of its voltage equation.
                let current = Some(system.unknown());
                let mut seen = vec![(c, 1.0)];
                if let Some(unit) = bank.units.iter().find(|u| u.phase == c) {
                    let ratio = 1.0 + unit.step_pu * f64::from(unit.tap);
                    let against = match unit.across {
                        Across::Phase(m) => Some(m),
                        Across::Neutral => branch.from_conductors.has_neutral().then_some(Conductor::N),
                    };
                    seen = vec![(c, ratio)];
                    seen.extend(against.map(|m| (m, 1.0 - ratio)));
                }
                system.add(current, numbering.at(branch.to, c), Complex64::from(1.0));
                system.add(numbering.at(branch.to, c), current, Complex64::from(-1.0));
                for (conductor, coefficient) in seen {
                    system.add(current, numbering.at(branch.from, conductor), Complex64::from(-coefficient));
                    system.add(numbering.at(branch.from, conductor), current, Complex64::from(coefficient));
                }
            }
        }
        BranchKind::Transformer(t) => coils::add_transformer(t, branch, numbering, system),
    }
}

fn add_shunts(network: &Network, numbering: &Numbering, system: &mut System) {
    for (i, node) in network.nodes.iter().enumerate() {
        let id = NodeId(i as u32);
        for (slot, y) in node.earth_admittance().into_iter().enumerate() {
            system.admittance(numbering.0[id.index()][slot], None, y);
        }
    }
    let terminals = |id: NodeId, connection: Connection| {
        connection.pairs().map(move |(p, q)| (id, p, q)).collect::<Vec<_>>()
    };
    for capacitor in &network.capacitors {
        let share = capacitor.vars / terminals(capacitor.node, capacitor.connection).len() as f64;
        let y = Complex64::new(0.0, share / capacitor.rated_volts.powi(2));
        for (id, p, q) in terminals(capacitor.node, capacitor.connection) {
            system.admittance(numbering.at(id, p), numbering.at(id, q), y);
        }
    }
    for motor in network.motors.iter().filter(|m| m.state == MotorState::Running) {
        let y = motor.machine.circuit.phase_matrix(motor.slip) * Complex64::from(f64::from(motor.count));
        let slots = numbering.0[motor.node.index()];
        for i in 0..3 {
            // Rows of the matrix add up to nothing: differences against one phase leave no earth.
            for j in 0..3 {
                system.difference(slots[i], [slots[j], slots[0]], y[(i, j)]);
            }
        }
    }
    for generator in &network.generators {
        let nominal = match generator.connection {
            Connection::Star(phases) if phases.is_split() => network.node(generator.node).nominal_volts / 2.0,
            Connection::Star(_) => network.node(generator.node).nominal_volts / 3f64.sqrt(),
            Connection::Delta(_) => network.node(generator.node).nominal_volts,
        };
        let pairs = terminals(generator.node, generator.connection);
        for &(id, p, q) in &pairs {
            system.elements.push(Element {
                from: numbering.at(id, p),
                to: numbering.at(id, q),
                power: -generator.delivering / pairs.len() as f64,
                model: LoadModel::Power,
                nominal,
                floor: network.study.constant_power_floor_percent / 100.0,
            });
        }
    }
    for load in &network.loads {
        for (node, share) in network.load_sites(load) {
            let nominal = match load.connection {
                Connection::Star(phases) if phases.is_split() => network.node(node).nominal_volts / 2.0,
                Connection::Star(_) => network.node(node).nominal_volts / 3f64.sqrt(),
                Connection::Delta(_) => network.node(node).nominal_volts,
            };
            let pairs = terminals(node, load.connection);
            let power = Complex64::new(load.watts, load.vars) * share / pairs.len() as f64;
            for (id, p, q) in pairs {
                system.elements.push(Element {
                    from: numbering.at(id, p),
                    to: numbering.at(id, q),
                    power,
                    model: load.model,
                    nominal,
                    floor: network.study.constant_power_floor_percent / 100.0,
                });
            }
        }
    }
}

fn gather(
    network: &Network,
    numbering: &Numbering,
    source: &HashMap<Conductor, usize>,
    system: &System,
    x: &DVector<f64>,
    followed: bool,
) -> NodalSolution {
    let volts: Vec<[Complex64; 4]> = numbering.0.iter().map(|slots| slots.map(|t| at(x, t))).collect();
    let source_amps = Conductor::ALL.map(|c| at(x, source.get(&c).copied()));
    let supply = volts[network.supply.node.index()];
    let drawn: Complex64 = supply.iter().zip(&source_amps).map(|(v, i)| v * i.conj()).sum();
    let loads: Complex64 = system
        .elements
        .iter()
        .map(|e| {
            let u = at(x, e.from) - at(x, e.to);
            u * e.current(u).conj()
        })
        .sum();
    let mut capacitors = Complex64::default();
    for capacitor in &network.capacitors {
        let count = capacitor.connection.pairs().count() as f64;
        for (p, q) in capacitor.connection.pairs() {
            let u = at(x, numbering.at(capacitor.node, p)) - at(x, numbering.at(capacitor.node, q));
            capacitors -=
                Complex64::new(0.0, capacitor.vars / count * u.norm_sqr() / capacitor.rated_volts.powi(2));
        }
    }
    NodalSolution { volts, source_amps, losses: drawn - loads - capacitors, followed }
}
