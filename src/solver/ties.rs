//! Rings: the currents of the ties that close them, found together with every sweep.
//!
//! The sweep runs over the network with its rings opened at the far end of each tie. There every
//! conductor gets a current `c`, drawn at the end of the tie and fed in at the node beyond; a stay
//! that holds a floating part gets one that takes the stay's own out again. The voltages are linear
//! in all `c`, so with `G` the mismatches (voltage across the opening; for a stay `V - c / y`) that
//! unit currents cause, found once by a sweep each, `c -= G^-1 g` closes all rings at once: a
//! correction of rank loops times conductors on top of the tree. The sweep is then as exact as without rings,
//! at twice the passes.

use nalgebra::{DMatrix, DVector, Dyn, LU};

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
}

/// The openings of a network and their currents.
#[derive(Debug)]
pub(super) struct Ties {
    ports: Vec<Port>,
    amps: DVector<Complex64>,
    mismatch: DVector<Complex64>,
    influence: LU<Complex64, Dyn, Dyn>,
    /// Load currents and voltages that a double pass must keep.
    pub own: Vec<Slots>,
    pub before: Vec<Slots>,
}

impl Ties {
    /// Finds the influence of each current by a sweep of the opened network without supply and loads.
    ///
    /// # Errors
    /// A node at a ring in which currents are not determined.
    pub fn new(workspace: &mut Workspace, meshed: &Network) -> Result<Ties, NodeId> {
        let ports = ports(workspace, meshed);
        let count = ports.len();
        let mut influence = DMatrix::zeros(count, count);
        let held = std::mem::replace(&mut workspace.state.volts[0], Slots::ZERO);
        let mut mismatch = DVector::zeros(count);
        for (column, port) in ports.iter().enumerate() {
            workspace.state.amps.fill(Slots::ZERO);
            port.draw(ONE, &mut workspace.state.amps);
            workspace.settle();
            for (row, other) in ports.iter().enumerate() {
                let current = if row == column { ONE } else { Complex64::default() };
                mismatch[row] = other.mismatch(current, &workspace.state.volts);
            }
            influence.set_column(column, &mismatch);
        }
        workspace.state.volts[0] = held;
        workspace.state.amps.fill(Slots::ZERO);
        let own_size = |k: usize| influence[(k, k)].norm();
        let sizes: Vec<f64> = (0..count).map(own_size).collect();
        let decomposed = influence.lu();
        let u = decomposed.u();
        let smallest = (0..count).min_by(|&a, &b| u[(a, a)].norm().total_cmp(&u[(b, b)].norm()));
        if let Some(k) = smallest {
            let largest = sizes.iter().copied().fold(0.0, f64::max);
            let pivot = u[(k, k)].norm();
            if pivot.is_nan() || pivot <= 1e-15 * largest {
                return Err(meshed.ties.first().map_or(meshed.supply.node, |tie| tie.far));
            }
        }
        let zero = vec![Slots::ZERO; workspace.state.amps.len()];
        Ok(Ties {
            ports,
            amps: DVector::zeros(count),
            mismatch,
            influence: decomposed,
            own: zero.clone(),
            before: zero,
        })
    }

    /// Adds the present currents to what the nodes draw.
    pub fn draw(&self, amps: &mut [Slots]) {
        for (port, &current) in self.ports.iter().zip(&self.amps) {
            port.draw(current, amps);
        }
    }

    /// Corrects the currents so that at these voltages' loads all rings close.
    pub fn correct(&mut self, volts: &[Slots]) {
        for (k, port) in self.ports.iter().enumerate() {
            self.mismatch[k] = port.mismatch(self.amps[k], volts);
        }
        if self.influence.solve_mut(&mut self.mismatch) {
            self.amps -= &self.mismatch;
        }
    }
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
        }
    }

    fn mismatch(&self, current: Complex64, volts: &[Slots]) -> Complex64 {
        let at =
            |position: usize, slot: usize| Complex64::new(volts[position].re[slot], volts[position].im[slot]);
        match *self {
            Port::Opening { tail, far, slot } => at(tail, slot) - at(far, slot),
            Port::Stay { position, slot, siemens } => at(position, slot) - current / siemens,
        }
    }
}

fn ports(workspace: &Workspace, meshed: &Network) -> Vec<Port> {
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
    openings.chain(stays).collect()
}
