//! The solution that no load leads to: loads raised from nothing to all, each step by Newton's method.
//!
//! Equations of power have several solutions; a feeder runs at the one that grows out of the
//! unloaded state. Where the sweep does not settle, or settles at voltages so low that another
//! solution is near, the loads' currents `K` are followed instead: with `V(K)` the voltages they
//! cause (one pass up, one down) and `C(V)` what the loads draw, `F(K) = K - share C(V(K))` is
//! brought to zero while `share` goes from 0 to 1. The Newton step `F' d = -F` is solved by GMRES
//! (Saad and Schultz, SIAM J. Sci. Stat. Comput. 7 (1986), 856-869), whose products
//! `F' d = d - share C'(V) V'(d)` cost a pass up and down each, so a step is O(nodes) whatever the
//! loads are. Slower than a sweep; only for networks where a sweep alone cannot be trusted.
//!
//! "No load" here is without constant-power and constant-current loads; what is linear (constant
//! impedances, capacitors, motors at their slip) is there from the start.

use super::lanes::{Phasors, Plain, Slots, combine, dot};
use super::workspace::{LoadWork, Workspace};
use crate::math::SLOTS;

/// Greatest change of the voltage across a load in one step, share of nominal, that still counts
/// as the same solution.
const LEAP: f64 = 0.05;
/// Smallest share of the loads that one step adds.
const LEAST_STEP: f64 = 1.0 / 4096.0;
/// Newton steps for one share.
const NEWTON_STEPS: usize = 12;
/// Directions of one linear solve.
const DIRECTIONS: usize = 60;
/// A linear solve ends at this share of its first residual.
const LINEAR_SHARE: f64 = 1e-3;
/// Change of the voltages at which a share is solved, per unit; the whole load is solved to the finer one.
const COARSE_PU: f64 = 1e-6;
const FINE_PU: f64 = 1e-12;

/// Where following the loads ended.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Followed {
    /// All loads are on; the state is the solution, after so many passes.
    Reached { passes: usize, change_pu: f64 },
    /// Beyond this share of the loads there is no solution near.
    Folds { share: f64 },
}

/// Load currents by position.
type Currents = Vec<Slots>;

impl Workspace<'_> {
    /// Follows the solution from no load to all of it.
    pub(super) fn follow(&mut self) -> Followed {
        let count = self.state.amps.len();
        let mut path = Path { currents: vec![Slots::ZERO; count], passes: 0, change_pu: f64::INFINITY };
        path.voltages(self);
        let (mut reached, mut step) = (0.0, 1.0f64);
        let mut volts = self.state.volts.clone();
        while reached < 1.0 {
            let share = f64::min(reached + step, 1.0);
            let before = path.currents.clone();
            let good = path.newton(self, share) && self.leap(&volts) < LEAP;
            if good {
                (reached, step) = (share, 2.0 * step);
                volts.clone_from(&self.state.volts);
            } else if step > LEAST_STEP {
                path.currents = before;
                step /= 2.0;
            } else {
                return Followed::Folds { share: reached };
            }
        }
        path.finish(self);
        Followed::Reached { passes: path.passes, change_pu: path.change_pu }
    }

    /// Lowest voltage of a phase with loads at its node, to n where that is carried, share of nominal.
    pub(super) fn lowest_at_loads(&self) -> f64 {
        let mut lowest = f64::INFINITY;
        self.each_load(|position, _| {
            let conductors = self.network.node(self.nodes[position - 1]).conductors;
            for (k, square) in across(&self.state.volts[position]).into_iter().enumerate() {
                if conductors.has_slot(k) {
                    lowest = lowest.min(square * self.layout.per_nominal2[position]);
                }
            }
        });
        lowest.sqrt()
    }

    /// Calls for every position with loads, with the index of its run.
    fn each_load(&self, mut of: impl FnMut(usize, usize)) {
        for (r, run) in self.layout.runs.iter().enumerate() {
            if run.load != LoadWork::None {
                (run.start..run.end).for_each(|position| of(position, r));
            }
        }
    }

    /// Currents that all loads draw at the present voltages, by position; zero where there are none.
    fn drawn(&self, volts: &[Slots], into: &mut [Slots]) {
        self.each_load(|position, r| {
            let run = &self.layout.runs[r];
            let k = run.load_data + position - run.start;
            let v = Phasors::<Plain>::load(&volts[position]);
            match run.load {
                LoadWork::None => {}
                LoadWork::Star => self.loads.star[k].current(v).store(&mut into[position]),
                LoadWork::Mixed => self.loads.mixed[k].current(v).store(&mut into[position]),
            }
        });
    }

    /// Greatest change of a voltage across a load since `before`, share of nominal.
    fn leap(&self, before: &[Slots]) -> f64 {
        let mut greatest = 0.0f64;
        self.each_load(|position, _| {
            let change = combine(&self.state.volts[position], &before[position], -1.0);
            let largest = across(&change).into_iter().fold(0.0, f64::max);
            greatest = greatest.max((largest * self.layout.per_nominal2[position]).sqrt());
        });
        greatest
    }

    fn product(&self, a: &[Slots], b: &[Slots]) -> f64 {
        // Power must balance, on whichever side of a transformer.
        let terms = a.iter().zip(b).zip(&self.layout.per_nominal2);
        terms.skip(1).map(|((a, b), per_nominal2)| dot(a, b) / per_nominal2).sum()
    }
}

/// Squares of the voltages of the phases against n (slot 3 is zero where n is not carried).
fn across(v: &Slots) -> [f64; SLOTS - 1] {
    std::array::from_fn(|k| {
        let (re, im) = (v.re[k] - v.re[SLOTS - 1], v.im[k] - v.im[SLOTS - 1]);
        re * re + im * im
    })
}

/// The load currents while they are followed.
struct Path {
    currents: Currents,
    passes: usize,
    /// Greatest change of a node voltage in the last Newton step, per unit.
    change_pu: f64,
}

impl Path {
    /// Sets the voltages that the currents cause.
    fn voltages(&mut self, workspace: &mut Workspace) {
        workspace.state.amps.copy_from_slice(&self.currents);
        workspace.settle();
        self.passes += 1;
    }

    /// Voltages that currents alone cause, without the supply: they replace `direction`.
    fn response(&mut self, workspace: &mut Workspace, direction: &mut Currents) {
        let held = std::mem::replace(&mut workspace.state.volts[0], Slots::ZERO);
        workspace.state.amps.copy_from_slice(direction);
        workspace.settle();
        direction.copy_from_slice(&workspace.state.volts);
        workspace.state.volts[0] = held;
        self.passes += 1;
    }

    /// Brings the currents to those of a share of the loads; false where Newton's method does not settle.
    fn newton(&mut self, workspace: &mut Workspace, share: f64) -> bool {
        let tolerance = if share < 1.0 { COARSE_PU } else { FINE_PU };
        let mut last = f64::INFINITY;
        for _ in 0..NEWTON_STEPS {
            self.voltages(workspace);
            let volts = workspace.state.volts.clone();
            let mut residual = vec![Slots::ZERO; volts.len()];
            workspace.drawn(&volts, &mut residual);
            for (r, k) in residual.iter_mut().zip(&self.currents) {
                *r = combine(&scaled(r, share), k, -1.0);
            }
            let Some(step) = self.linear_solve(workspace, &volts, residual, share) else { return false };
            for (k, d) in self.currents.iter_mut().zip(&step) {
                *k = combine(k, d, 1.0);
            }
            self.voltages(workspace);
            let change = largest(&workspace.state.volts, &volts, &workspace.layout.per_nominal2);
            self.change_pu = change;
            if !change.is_finite() || change > 10.0 {
                return false;
            }
            // Rounding ends it where the fine tolerance cannot be met.
            if change < tolerance || change < 1e-9 && change > 0.3 * last {
                return true;
            }
            last = change;
        }
        false
    }

    /// Leaves voltages and the loads' own currents at them in the state.
    fn finish(&mut self, workspace: &mut Workspace) {
        self.voltages(workspace);
        let volts = workspace.state.volts.clone();
        let mut amps = vec![Slots::ZERO; volts.len()];
        workspace.drawn(&volts, &mut amps);
        workspace.state.amps = amps;
    }

    /// `F' d` for a direction `d`; the derivative of the loads by a central difference.
    fn derivative(
        &mut self,
        workspace: &mut Workspace,
        volts: &[Slots],
        direction: &Currents,
        share: f64,
    ) -> Currents {
        let mut response = direction.clone();
        self.response(workspace, &mut response);
        let zero = vec![Slots::ZERO; volts.len()];
        let size = largest(&response, &zero, &workspace.layout.per_nominal2);
        let mut product = direction.clone();
        if size == 0.0 || !size.is_finite() {
            return product;
        }
        let by = 1e-4 / size;
        let moved = |sign: f64| -> Currents {
            volts.iter().zip(&response).map(|(v, r)| combine(v, r, sign * by)).collect()
        };
        let (mut above, mut below) = (zero.clone(), zero);
        workspace.drawn(&moved(1.0), &mut above);
        workspace.drawn(&moved(-1.0), &mut below);
        for ((p, a), b) in product.iter_mut().zip(&above).zip(&below) {
            *p = combine(p, &combine(a, b, -1.0), -share / (2.0 * by));
        }
        product
    }

    /// GMRES for `F' d = right`.
    fn linear_solve(
        &mut self,
        workspace: &mut Workspace,
        volts: &[Slots],
        right: Currents,
        share: f64,
    ) -> Option<Currents> {
        let size = workspace.product(&right, &right).sqrt();
        let mut solution = vec![Slots::ZERO; right.len()];
        if size == 0.0 {
            return Some(solution);
        }
        let mut basis = vec![right.iter().map(|r| scaled(r, 1.0 / size)).collect::<Currents>()];
        let mut hessenberg: Vec<Vec<f64>> = Vec::new();
        let mut rotations: Vec<(f64, f64)> = Vec::new();
        let mut left = vec![size];
        for k in 0..DIRECTIONS {
            let direction = basis[k].clone();
            let mut next = self.derivative(workspace, volts, &direction, share);
            let mut column = Vec::with_capacity(k + 2);
            for earlier in &basis {
                let part = workspace.product(earlier, &next);
                next.iter_mut().zip(earlier).for_each(|(n, e)| *n = combine(n, e, -part));
                column.push(part);
            }
            let norm = workspace.product(&next, &next).sqrt();
            column.push(norm);
            for (i, &(c, s)) in rotations.iter().enumerate() {
                (column[i], column[i + 1]) =
                    (c * column[i] + s * column[i + 1], c * column[i + 1] - s * column[i]);
            }
            let length = column[k].hypot(column[k + 1]);
            if !length.is_finite() || length == 0.0 {
                return None;
            }
            let (c, s) = (column[k] / length, column[k + 1] / length);
            (column[k], column[k + 1]) = (length, 0.0);
            rotations.push((c, s));
            hessenberg.push(column);
            left.push(-s * left[k]);
            left[k] *= c;
            let done = left[k + 1].abs() <= LINEAR_SHARE * size || norm <= 1e-14 * size;
            if done || k + 1 == DIRECTIONS {
                break;
            }
            basis.push(next.iter().map(|n| scaled(n, 1.0 / norm)).collect());
        }
        let count = hessenberg.len();
        let mut weights = vec![0.0; count];
        for i in (0..count).rev() {
            let known: f64 = (i + 1..count).map(|j| hessenberg[j][i] * weights[j]).sum();
            weights[i] = (left[i] - known) / hessenberg[i][i];
        }
        for (weight, direction) in weights.into_iter().zip(&basis) {
            solution.iter_mut().zip(direction).for_each(|(x, d)| *x = combine(x, d, weight));
        }
        solution.iter().all(|x| x.re.iter().chain(&x.im).all(|v| v.is_finite())).then_some(solution)
    }
}

/// Greatest difference of two sets of voltages, per unit of nominal.
fn largest(a: &[Slots], b: &[Slots], per_nominal2: &[f64]) -> f64 {
    let mut greatest = 0.0f64;
    for ((a, b), w) in a.iter().zip(b).zip(per_nominal2).skip(1) {
        let d = combine(a, b, -1.0);
        for k in 0..SLOTS {
            let square = (d.re[k] * d.re[k] + d.im[k] * d.im[k]) * w;
            greatest = if square.is_nan() { f64::INFINITY } else { greatest.max(square) };
        }
    }
    greatest.sqrt()
}

fn scaled(a: &Slots, factor: f64) -> Slots {
    combine(&Slots::ZERO, a, factor)
}
