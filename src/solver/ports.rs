//! Currents found together with every sweep: those of the ties that close rings, and those of
//! machines whose admittance changes from one solve to the next.
//!
//! The sweep runs over the network with its rings opened at the far end of each tie. There every
//! conductor gets a current `c`, drawn at the end of the tie and fed in at the node beyond; a stay
//! that holds a floating part gets one that takes the stay's own out again; a machine one a phase.
//! The voltages `v` at these ports are linear in all `c`, with an influence matrix found once by a
//! sweep a port. What must hold there - no voltage across an opening, `v = c / y` at a stay,
//! `c = Y v` at a machine - is then mended for all of them at once by one solve of that small
//! system: a correction of rank loops times conductors on top of the tree. The sweep is as exact as
//! without, at twice the passes.

use nalgebra::{DMatrix, DVector, Dyn, LU, Matrix3};

use super::lanes::Slots;
use super::workspace::Workspace;
use crate::math::{Complex64, ONE};
use crate::network::{Network, NodeId, StayPlace};

/// One unknown current.
#[derive(Debug, Clone, Copy)]
enum Port {
    /// Drawn in one position and fed in at another, in the same slot.
    Opening { tail: usize, far: usize, slot: usize },
    /// Fed in where a stay of that admittance stands.
    Stay { position: usize, slot: usize, siemens: Complex64 },
    /// Drawn by a phase of a machine; its three ports follow each other.
    Machine { position: usize, slot: usize, machine: usize },
}

/// The ports of a network and their currents.
#[derive(Debug)]
pub(super) struct Ports {
    ports: Vec<Port>,
    /// Admittance of each machine, siemens.
    machines: Vec<Matrix3<Complex64>>,
    amps: DVector<Complex64>,
    mismatch: DVector<Complex64>,
    /// Voltage at each port by a unit current in each, ohms.
    influence: DMatrix<Complex64>,
    system: LU<Complex64, Dyn, Dyn>,
    /// Load currents and voltages that a double pass must keep.
    pub own: Vec<Slots>,
    pub before: Vec<Slots>,
}

impl Ports {
    /// Finds the influence of each current by a sweep of the opened network without supply and
    /// loads; `machines` are the nodes of machines, without admittance yet.
    ///
    /// # Errors
    /// A node at a ring in which currents are not determined.
    pub fn new(workspace: &mut Workspace, meshed: &Network, machines: &[NodeId]) -> Result<Ports, NodeId> {
        let ports = ports(workspace, meshed, machines);
        let count = ports.len();
        let mut influence = DMatrix::zeros(count, count);
        let held = std::mem::replace(&mut workspace.state.volts[0], Slots::ZERO);
        for (column, port) in ports.iter().enumerate() {
            workspace.state.amps.fill(Slots::ZERO);
            port.draw(ONE, &mut workspace.state.amps);
            workspace.settle();
            for (row, other) in ports.iter().enumerate() {
                influence[(row, column)] = other.volts(&workspace.state.volts);
            }
        }
        workspace.state.volts[0] = held;
        workspace.state.amps.fill(Slots::ZERO);
        let zero = vec![Slots::ZERO; workspace.state.amps.len()];
        let mut ports = Ports {
            machines: vec![Matrix3::zeros(); machines.len()],
            amps: DVector::zeros(count),
            mismatch: DVector::zeros(count),
            influence,
            system: DMatrix::zeros(0, 0).lu(),
            own: zero.clone(),
            before: zero,
            ports,
        };
        ports.factor();
        if ports.is_singular() {
            return Err(meshed.ties.first().map_or(meshed.supply.node, |tie| tie.far));
        }
        Ok(ports)
    }

    /// Puts in the admittances of the machines, siemens.
    pub fn set_machines(&mut self, admittances: impl IntoIterator<Item = Matrix3<Complex64>>) {
        for (own, new) in self.machines.iter_mut().zip(admittances) {
            *own = new;
        }
        self.factor();
    }

    /// The system whose solution mends all ports.
    fn factor(&mut self) {
        let count = self.ports.len();
        let z = &self.influence;
        let mut system = DMatrix::zeros(count, count);
        for (row, port) in self.ports.iter().enumerate() {
            match *port {
                Port::Opening { .. } => system.set_row(row, &z.row(row)),
                Port::Stay { siemens, .. } => {
                    system.set_row(row, &z.row(row));
                    system[(row, row)] -= siemens.inv();
                }
                Port::Machine { slot, machine, .. } => {
                    // The ports of the three phases stand together.
                    let first = row - slot;
                    for phase in 0..3 {
                        let y = self.machines[machine][(slot, phase)];
                        for column in 0..count {
                            system[(row, column)] -= y * z[(first + phase, column)];
                        }
                    }
                    system[(row, row)] += ONE;
                }
            }
        }
        self.system = system.lu();
    }

    fn is_singular(&self) -> bool {
        let u = self.system.u();
        let sizes = || (0..self.ports.len()).map(|k| u[(k, k)].norm());
        let largest = sizes().fold(0.0, f64::max);
        sizes().any(|pivot| pivot.is_nan() || pivot <= 1e-15 * largest)
    }

    /// Adds the present currents to what the nodes draw.
    pub fn draw(&self, amps: &mut [Slots]) {
        for (port, &current) in self.ports.iter().zip(&self.amps) {
            port.draw(current, amps);
        }
    }

    /// Corrects the currents so that at these voltages' loads every port is as it must be.
    pub fn correct(&mut self, volts: &[Slots]) {
        for k in 0..self.ports.len() {
            let (port, current) = (self.ports[k], self.amps[k]);
            self.mismatch[k] = match port {
                Port::Opening { .. } => port.volts(volts),
                Port::Stay { siemens, .. } => port.volts(volts) - current / siemens,
                Port::Machine { position, slot, machine } => {
                    let v = phases(&volts[position]);
                    current - (0..3).map(|j| self.machines[machine][(slot, j)] * v[j]).sum::<Complex64>()
                }
            };
        }
        if self.system.solve_mut(&mut self.mismatch) {
            self.amps -= &self.mismatch;
        }
    }

    /// Position of each machine.
    pub fn machine_positions(&self) -> impl Iterator<Item = usize> + '_ {
        self.ports.iter().filter_map(|port| match *port {
            Port::Machine { position, slot: 0, .. } => Some(position),
            _ => None,
        })
    }
}

/// Voltages of the three phases to earth.
pub(super) fn phases(volts: &Slots) -> [Complex64; 3] {
    [0, 1, 2].map(|k| Complex64::new(volts.re[k], volts.im[k]))
}

impl Port {
    fn draw(&self, current: Complex64, amps: &mut [Slots]) {
        let mut add = |position: usize, slot: usize, value: Complex64| {
            amps[position].re[slot] += value.re;
            amps[position].im[slot] += value.im;
        };
        match *self {
            Port::Opening { tail, far, slot } => {
                add(tail, slot, current);
                add(far, slot, -current);
            }
            Port::Stay { position, slot, .. } => add(position, slot, -current),
            Port::Machine { position, slot, .. } => add(position, slot, current),
        }
    }

    /// Voltage at the port: across an opening, else to earth.
    fn volts(&self, volts: &[Slots]) -> Complex64 {
        let at =
            |position: usize, slot: usize| Complex64::new(volts[position].re[slot], volts[position].im[slot]);
        match *self {
            Port::Opening { tail, far, slot } => at(tail, slot) - at(far, slot),
            Port::Stay { position, slot, .. } | Port::Machine { position, slot, .. } => at(position, slot),
        }
    }
}

fn ports(workspace: &Workspace, meshed: &Network, machines: &[NodeId]) -> Vec<Port> {
    let count = meshed.nodes.len();
    let mut position = vec![0; count + meshed.ties.len()];
    for (i, id) in workspace.nodes.iter().enumerate() {
        position[id.index()] = i + 1;
    }
    let openings = meshed.ties.iter().enumerate().flat_map(|(t, tie)| {
        let (tail, far) = (position[count + t], position[tie.far.index()]);
        let conductors = workspace.network.nodes[count + t].conductors;
        conductors.iter().map(move |c| Port::Opening { tail, far, slot: c.slot() })
    });
    let stays = meshed.stays.iter().flat_map(|stay| {
        let position = match stay.place {
            StayPlace::Node(id) => position[id.index()],
            StayPlace::TieEnd(tie) => position[count + tie],
        };
        let siemens = Complex64::new(0.0, stay.siemens);
        stay.on.iter().map(move |c| Port::Stay { position, slot: c.slot(), siemens })
    });
    let machines = machines.iter().enumerate().flat_map(|(machine, id)| {
        let position = position[id.index()];
        (0..3).map(move |slot| Port::Machine { position, slot, machine })
    });
    openings.chain(stays).chain(machines).collect()
}
