//! General-purpose sparse LU of the nodal admittance matrix, iterated on load currents.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::mat::MatMut;
use faer::sparse::linalg::lu::{LuRef, NumericLu, SymbolicLu, factorize_symbolic_lu};
use faer::sparse::{SparseColMat, Triplet};
use faer::{Conj, Par, c64};
use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{BranchKind, Connection, Network, NodeId};

/// A constant-power element between a phase and the neutral: unknowns and power.
struct Element {
    phase: usize,
    neutral: usize,
    power: Complex64,
}

/// Nodal matrix, factors, loads and present voltages. Unknowns: four a node, the source's left out.
pub struct Sparse {
    symbolic: SymbolicLu<usize>,
    numeric: NumericLu<usize, c64>,
    scratch: MemBuffer,
    elements: Vec<Element>,
    from_source: Vec<Complex64>,
    volts: Vec<Complex64>,
    right: Vec<Complex64>,
    nominal: f64,
}

fn unknown(id: NodeId, slot: usize) -> Option<usize> {
    Some(4 * (id.0 as usize).checked_sub(1)? + slot)
}

impl Sparse {
    /// Assembles and factors.
    pub fn new(network: &Network) -> Sparse {
        assert_eq!(network.supply.node, NodeId(0), "the source is the first node");
        let size = 4 * (network.nodes.len() - 1);
        let (triplets, from_source) = assemble(network, size);
        let matrix =
            SparseColMat::<usize, c64>::try_new_from_triplets(size, size, &triplets).expect("a matrix");
        let symbolic = factorize_symbolic_lu(matrix.symbolic(), Default::default()).expect("a structure");
        let mut numeric = NumericLu::new();
        let mut memory =
            MemBuffer::new(symbolic.factorize_numeric_lu_scratch::<c64>(Par::Seq, Default::default()));
        symbolic
            .factorize_numeric_lu(
                &mut numeric,
                matrix.as_ref(),
                Par::Seq,
                MemStack::new(&mut memory),
                Default::default(),
            )
            .expect("a regular matrix");
        let scratch = MemBuffer::new(symbolic.solve_in_place_scratch::<c64>(1, Par::Seq));
        let nominal = network.supply.nominal_volts / 3f64.sqrt();
        Sparse {
            symbolic,
            numeric,
            scratch,
            elements: elements(network),
            from_source,
            volts: vec![Complex64::default(); size],
            right: vec![Complex64::default(); size],
            nominal,
        }
    }

    fn solve(&mut self) {
        let lu = LuRef::new_unchecked(&self.symbolic, &self.numeric);
        let size = self.right.len();
        let right = MatMut::from_column_major_slice_mut(&mut self.right, size, 1);
        lu.solve_in_place_with_conj(Conj::No, right, Par::Seq, MemStack::new(&mut self.scratch));
    }

    /// Voltages without load, then iterations until none changes by more than the tolerance; their number.
    pub fn iterate(&mut self, tolerance_pu: f64, limit: usize) -> usize {
        self.right.copy_from_slice(&self.from_source);
        self.solve();
        self.volts.copy_from_slice(&self.right);
        let allowed = (tolerance_pu * self.nominal).powi(2);
        for count in 1..=limit {
            self.right.copy_from_slice(&self.from_source);
            for e in &self.elements {
                let current = (e.power / (self.volts[e.phase] - self.volts[e.neutral])).conj();
                self.right[e.phase] -= current;
                self.right[e.neutral] += current;
            }
            self.solve();
            let change =
                self.right.iter().zip(&self.volts).map(|(a, b)| (a - b).norm_sqr()).fold(0.0, f64::max);
            self.volts.copy_from_slice(&self.right);
            if change <= allowed {
                return count;
            }
        }
        panic!("no convergence in {limit} iterations");
    }

    /// Voltages of the last iteration.
    pub fn volts(&self) -> &[Complex64] {
        &self.volts
    }
}

fn assemble(network: &Network, size: usize) -> (Vec<Triplet<usize, usize, c64>>, Vec<Complex64>) {
    let mut triplets = Vec::with_capacity(64 * network.branches.len());
    let mut from_source = vec![Complex64::default(); size];
    let mut add = |row: (NodeId, usize), column: (NodeId, usize), y: Complex64| {
        let Some(i) = unknown(row.0, row.1) else { return };
        match unknown(column.0, column.1) {
            Some(j) => triplets.push(Triplet::new(i, j, y)),
            None => from_source[i] -= y * network.supply.held_volts[column.1],
        }
    };
    for branch in &network.branches {
        let BranchKind::Line(line) = &branch.kind else { panic!("the generated feeder has lines only") };
        let y: PhaseMatrix = network.line_impedance(line).try_inverse().expect("an impedance");
        for i in 0..4 {
            for j in 0..4 {
                add((branch.from, i), (branch.from, j), y[(i, j)]);
                add((branch.to, i), (branch.to, j), y[(i, j)]);
                add((branch.from, i), (branch.to, j), -y[(i, j)]);
                add((branch.to, i), (branch.from, j), -y[(i, j)]);
            }
        }
    }
    for (i, node) in network.nodes.iter().enumerate() {
        let id = NodeId(i as u32);
        for (slot, y) in node.earth_admittance().into_iter().enumerate() {
            add((id, slot), (id, slot), y);
        }
    }
    (triplets, from_source)
}

fn elements(network: &Network) -> Vec<Element> {
    let mut elements = Vec::new();
    for load in &network.loads {
        let Connection::Star(_) = load.connection else { panic!("the generated feeder has star loads only") };
        for (id, _) in network.load_sites(load) {
            for (p, q) in load.connection.pairs() {
                let (Some(phase), Some(neutral)) = (unknown(id, p.slot()), unknown(id, q.slot())) else {
                    continue;
                };
                elements.push(Element { phase, neutral, power: Complex64::new(load.watts, load.vars) });
            }
        }
    }
    elements
}
