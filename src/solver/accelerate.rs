//! Anderson acceleration of the sweep, for networks near what they can carry.
//!
//! The sweep maps load currents `x` to the load currents `g(x)` at the voltages they cause. Near
//! the loadability limit it converges slowly; a combination of the last few iterates that makes
//! their differences `f = g(x) - x` cancel takes most of that slowness away. Type II
//! (Anderson 1965; Walker and Ni, SIAM J. Numer. Anal. 49 (2011), 1715-1735, equation 2.2).

use super::lanes::{Slots, combine, dot};
use super::workspace::Workspace;

/// Past steps combined: a few modes a phase stay slow near the limit, so fewer than six help little.
const DEPTH: usize = 6;

/// History of an accelerated iteration.
#[derive(Debug)]
pub(super) struct Acceleration {
    /// Load currents the last sweep began with, what it gave, and the difference.
    input: Vec<Slots>,
    output: Vec<Slots>,
    difference: Vec<Slots>,
    /// Changes of `output` and of `difference` from step to step, newest last.
    output_changes: Vec<Vec<Slots>>,
    difference_changes: Vec<Vec<Slots>>,
    /// Inner products of `difference_changes`; of `count` rows and columns.
    gram: [[f64; DEPTH]; DEPTH],
    started: bool,
}

impl Acceleration {
    /// History for a network of so many positions. Allocates; the steps do not, once the history is full.
    pub fn new(positions: usize) -> Self {
        let zero = || vec![Slots::ZERO; positions];
        Acceleration {
            input: zero(),
            output: zero(),
            difference: zero(),
            output_changes: Vec::with_capacity(DEPTH),
            difference_changes: Vec::with_capacity(DEPTH),
            gram: [[0.0; DEPTH]; DEPTH],
            started: false,
        }
    }

    /// Keeps the load currents that the sweep is about to begin with.
    pub fn before(&mut self, workspace: &Workspace) {
        self.input.copy_from_slice(&workspace.state.amps);
    }

    /// Replaces the load currents the sweep gave by the combination with earlier steps.
    pub fn after(&mut self, workspace: &mut Workspace) {
        let amps = &mut workspace.state.amps;
        let per_nominal2 = &workspace.layout.per_nominal2;
        if self.started {
            self.remember(amps, per_nominal2);
        }
        self.output.copy_from_slice(amps);
        for ((f, g), x) in self.difference.iter_mut().zip(&self.output).zip(&self.input) {
            *f = combine(g, x, -1.0);
        }
        self.started = true;
        let Some(weights) = self.weights(per_nominal2) else { return };
        for (change, weight) in self.output_changes.iter().zip(weights) {
            for (x, d) in amps.iter_mut().zip(change) {
                *x = combine(x, d, -weight);
            }
        }
    }

    fn remember(&mut self, amps: &[Slots], per_nominal2: &[f64]) {
        let full = self.output_changes.len() == DEPTH;
        let slot = |changes: &mut Vec<Vec<Slots>>| {
            if full { changes.remove(0) } else { vec![Slots::ZERO; amps.len()] }
        };
        let (mut output_change, mut difference_change) =
            (slot(&mut self.output_changes), slot(&mut self.difference_changes));
        for i in 0..amps.len() {
            output_change[i] = combine(&amps[i], &self.output[i], -1.0);
            let now = combine(&amps[i], &self.input[i], -1.0);
            difference_change[i] = combine(&now, &self.difference[i], -1.0);
        }
        self.output_changes.push(output_change);
        self.difference_changes.push(difference_change);
        self.extend_gram(full, per_nominal2);
    }

    /// Inner products of the newest change with all; the oldest leave where the history was full.
    fn extend_gram(&mut self, full: bool, per_nominal2: &[f64]) {
        if full {
            for i in 1..DEPTH {
                self.gram[i - 1] = self.gram[i];
                self.gram[i - 1].rotate_left(1);
            }
        }
        let last = self.difference_changes.len() - 1;
        for i in 0..=last {
            let value = product(&self.difference_changes[i], &self.difference_changes[last], per_nominal2);
            self.gram[i][last] = value;
            self.gram[last][i] = value;
        }
    }

    /// Weights of the past steps: least squares of the present difference by their changes.
    fn weights(&self, per_nominal2: &[f64]) -> Option<Vec<f64>> {
        let count = self.difference_changes.len();
        if count == 0 {
            return None;
        }
        // A trace of the diagonal added: past steps that are nearly parallel must not be told apart by noise.
        let gram = nalgebra::DMatrix::from_fn(count, count, |i, j| {
            self.gram[i][j] * if i == j { 1.0 + 1e-12 } else { 1.0 }
        });
        let right = nalgebra::DVector::from_fn(count, |i, _| {
            product(&self.difference_changes[i], &self.difference, per_nominal2)
        });
        let weights = gram.lu().solve(&right)?;
        weights.iter().all(|w| w.is_finite()).then(|| weights.iter().copied().collect())
    }
}

/// Inner product weighed by nominal voltage: it is power that must balance, on whichever side of a transformer.
fn product(a: &[Slots], b: &[Slots], per_nominal2: &[f64]) -> f64 {
    a.iter().zip(b).zip(per_nominal2).map(|((a, b), w)| dot(a, b) / w).sum()
}
