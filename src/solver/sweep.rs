//! The iteration: currents up the tree, voltages down.
//!
//! One iteration is a pass from the leaves to the source that gathers load currents, and a pass
//! back that sets every voltage and evaluates the node's load while the voltage is at hand:
//!
//! ```text
//! up    w = Z K         K_p += K - beta w_n e_n          (series; beta of the neutral's earthing)
//!       w = N K         K_p += M^T K                     (general)
//! down  t = V_p - w     V = t - beta t_n z_n             (series)
//!                       V = M V_p - w                    (general)
//!       K = load current at V
//! ```
//!
//! Everything linear (charging, capacitors, electrodes, constant impedance) is in `beta`, `M`
//! and `N`: see the module `branch`.

use super::accelerate::Acceleration;
use super::lanes::{Phasors, Quad, Slots};
use super::workspace::{
    BranchWork, DenseData, FloatingData, Layout, LoadWork, Loads, Run, SeriesData, State, Workspace,
};

const N: usize = 3;

/// How a run of iterations ended.
#[derive(Debug, Clone, Copy)]
pub struct Iterations {
    /// Iterations made.
    pub count: usize,
    /// Largest change of a node voltage in the last one, per unit of nominal.
    pub change_pu: f64,
}

impl Workspace<'_> {
    /// Voltages without load current, and the loads evaluated at them: where an iteration starts.
    pub fn start_flat(&mut self) {
        self.state.drop.fill(Slots::ZERO);
        self.passes(Passes::Down);
    }

    /// Iterates until no node voltage changes by more than `tolerance_pu` of nominal, or `limit` iterations are made.
    ///
    /// Once the rate of convergence foretells more than twenty sweeps, the iteration is accelerated.
    pub fn iterate(&mut self, tolerance_pu: f64, limit: usize) -> Iterations {
        let mut done = Iterations { count: 0, change_pu: f64::INFINITY };
        let mut acceleration: Option<Acceleration> = None;
        while done.count < limit && done.change_pu > tolerance_pu {
            if let Some(acceleration) = &mut acceleration {
                acceleration.before(self);
            }
            let change_pu = self.passes(Passes::UpAndDown);
            if let Some(acceleration) = &mut acceleration {
                acceleration.after(self);
            } else if done.count + 1 >= RATE_KNOWN && foreseen(&done, change_pu, tolerance_pu) > PLAIN_SWEEPS
            {
                acceleration = Some(Acceleration::new(self.state.amps.len()));
            }
            done = Iterations { count: done.count + 1, change_pu };
            if !change_pu.is_finite() {
                break;
            }
        }
        done
    }

    /// One pass up and one down without new load currents, so that voltages and currents belong together.
    pub(super) fn settle(&mut self) {
        self.passes(Passes::Settle);
    }

    /// Makes the passes; gives the largest change, per unit. With rings or machines, passes over the opened
    /// network find the mismatch at their ports first, and those that count follow with it mended.
    fn passes(&mut self, which: Passes) -> f64 {
        let Some(mut ports) = self.ports.take() else { return self.tree_passes(which) };
        if which == Passes::Down {
            self.state.amps.fill(Slots::ZERO);
        }
        ports.own.copy_from_slice(&self.state.amps);
        ports.before.copy_from_slice(&self.state.volts);
        ports.draw(&mut self.state.amps);
        self.tree_passes(Passes::Settle);
        ports.correct(&self.state.volts);
        self.state.amps.copy_from_slice(&ports.own);
        ports.draw(&mut self.state.amps);
        self.state.volts.copy_from_slice(&ports.before);
        let change = self.tree_passes(if which == Passes::Down { Passes::UpAndDown } else { which });
        self.ports = Some(ports);
        change
    }

    /// Passes over the tree, with the widest instructions the processor has.
    fn tree_passes(&mut self, which: Passes) -> f64 {
        let Workspace { layout, loads, state, .. } = self;
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma") {
            // Safety: the features it is compiled for were found just above.
            #[allow(unsafe_code)]
            return unsafe { passes_wide(layout, loads, state, which) };
        }
        passes::<super::lanes::Plain>(layout, loads, state, which)
    }
}

/// Sweeps that are left plain; where more are foreseen, acceleration pays for its dot products.
const PLAIN_SWEEPS: f64 = 20.0;
/// Sweeps after which the rate of convergence can be told.
const RATE_KNOWN: usize = 4;

/// Sweeps foreseen in all, from the last two changes.
fn foreseen(before: &Iterations, change_pu: f64, tolerance_pu: f64) -> f64 {
    let rate = (change_pu / before.change_pu).ln();
    if rate >= 0.0 {
        f64::INFINITY
    } else {
        before.count as f64 + 1.0 + (tolerance_pu / change_pu).ln() / rate
    }
}

/// Which passes to make.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Passes {
    /// Down only, evaluating loads.
    Down,
    /// Up, then down evaluating loads.
    UpAndDown,
    /// Up, then down keeping the gathered currents.
    Settle,
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn passes_wide(layout: &Layout, loads: &Loads, state: &mut State, which: Passes) -> f64 {
    passes::<super::lanes::Wide>(layout, loads, state, which)
}

#[inline(always)]
fn passes<Q: Quad>(
    layout: &Layout,
    loads: &Loads<Q::Slot>,
    state: &mut State<Q::Slot>,
    which: Passes,
) -> f64 {
    if which != Passes::Down {
        // What gathers at the supply is its own affair; left there it would grow from sweep to sweep.
        Phasors::<Q>::zero().store(&mut state.amps[0]);
        for run in layout.runs.iter().rev() {
            match run.branch {
                BranchWork::Series => up_series::<Q>(layout, run, state),
                BranchWork::Dense => up_dense::<Q>(layout, run, state),
                BranchWork::Floating => up_floating::<Q>(layout, run, state),
            }
        }
    }
    let keep = which == Passes::Settle;
    let mut change2 = Q::splat(0.0);
    for run in &layout.runs {
        let star = &loads.star[run.load_data.min(loads.star.len())..];
        let mixed = &loads.mixed[run.load_data.min(loads.mixed.len())..];
        let largest = match run.load {
            _ if keep => down::<Q>(
                layout,
                run,
                state,
                #[inline(always)]
                |_, _, _| {},
            ),
            LoadWork::None => down::<Q>(
                layout,
                run,
                state,
                #[inline(always)]
                |_, _, amps| Phasors::<Q>::zero().store(amps),
            ),
            LoadWork::Star => down::<Q>(
                layout,
                run,
                state,
                #[inline(always)]
                |k, volts, amps| star[k].current(volts).store(amps),
            ),
            LoadWork::Mixed => down::<Q>(
                layout,
                run,
                state,
                #[inline(always)]
                |k, volts, amps| mixed[k].current(volts).store(amps),
            ),
        };
        change2 = largest.greater(change2);
    }
    change2.greatest().sqrt()
}

/// Series branches of a run, leaves first.
#[inline(always)]
fn up_series<Q: Quad>(layout: &Layout, run: &Run, state: &mut State<Q::Slot>) {
    let data = &layout.series[run.branch_data..];
    for position in (run.start..run.end).rev() {
        let SeriesData { table, length_m, beta } = &data[position - run.start];
        let amps = &state.amps[position];
        let length = Q::splat(*length_m);
        let drop = layout.table[*table as usize].times::<Q>(amps).each(
            #[inline(always)]
            |part| part.times(length),
        );
        drop.store(&mut state.drop[position]);
        // What goes up is K - beta w_n on the neutral alone.
        let minus_beta = Phasors { re: Q::splat(-beta.re), im: Q::splat(-beta.im) };
        let own = Phasors::load(amps);
        let with_earth = own.plus_product(minus_beta, drop);
        let passed =
            Phasors { re: own.re.with_neutral(with_earth.re), im: own.im.with_neutral(with_earth.im) };
        let parent = &mut state.amps[layout.parent[position] as usize];
        Phasors::load(parent).plus(passed).store(parent);
    }
}

/// General branches of a run, leaves first.
#[inline(always)]
fn up_dense<Q: Quad>(layout: &Layout, run: &Run, state: &mut State<Q::Slot>) {
    let data = &layout.dense[run.branch_data..];
    for position in (run.start..run.end).rev() {
        pass_up::<Q>(&data[position - run.start], layout.parent[position], position, state);
    }
}

#[inline(always)]
fn pass_up<Q: Quad>(data: &DenseData, parent: u32, position: usize, state: &mut State<Q::Slot>) {
    let amps = &state.amps[position];
    data.n.times::<Q>(amps).store(&mut state.drop[position]);
    let passed = data.m_transposed.times::<Q>(amps);
    let parent = &mut state.amps[parent as usize];
    Phasors::load(parent).plus(passed).store(parent);
}

/// Branches into floating sides, leaves first: `w = N K + q (q^T K) scale`.
#[inline(always)]
fn up_floating<Q: Quad>(layout: &Layout, run: &Run, state: &mut State<Q::Slot>) {
    let data = &layout.floating[run.branch_data..];
    for position in (run.start..run.end).rev() {
        let FloatingData { dense, q, scale } = &data[position - run.start];
        pass_up::<Q>(dense, layout.parent[position], position, state);
        let (amps, drop) = (&state.amps[position], &mut state.drop[position]);
        let mut sum = Phasors::<Q>::zero();
        for j in 0..=N {
            let own = Phasors { re: Q::broadcast(amps.re[j]), im: Q::broadcast(amps.im[j]) };
            sum = sum.plus_product(own, Phasors { re: Q::splat(q.re[j]), im: Q::splat(q.im[j]) });
        }
        let scale = Phasors { re: Q::splat(scale.re), im: Q::splat(scale.im) };
        let together = Phasors::zero().plus_product(scale, sum);
        let q = Phasors { re: Q::column(&q.re), im: Q::column(&q.im) };
        Phasors::load(drop).plus_product(together, q).store(drop);
    }
}

/// Voltages of a run, and its loads by `draw`; gives the largest square of a change, per unit, slot by slot.
#[inline(always)]
fn down<Q: Quad>(
    layout: &Layout,
    run: &Run,
    state: &mut State<Q::Slot>,
    draw: impl Fn(usize, Phasors<Q>, &mut Slots<Q::Slot>),
) -> Q {
    match run.branch {
        BranchWork::Series => {
            let data = &layout.series[run.branch_data..];
            down_by(
                layout,
                run,
                state,
                draw,
                #[inline(always)]
                |k, above, drop| {
                    let SeriesData { table, length_m, beta } = &data[k];
                    let volts = Phasors::load(above).minus(drop);
                    let minus_beta =
                        Phasors { re: Q::splat(-beta.re * length_m), im: Q::splat(-beta.im * length_m) };
                    let factor = Phasors::zero().plus_product(minus_beta, volts.each(Q::neutral));
                    volts.plus_product(factor, layout.table[*table as usize].column(N))
                },
            )
        }
        BranchWork::Dense => {
            let data = &layout.dense[run.branch_data..];
            down_by(
                layout,
                run,
                state,
                draw,
                #[inline(always)]
                |k, above, drop| data[k].m.times(above).minus(drop),
            )
        }
        BranchWork::Floating => {
            let data = &layout.floating[run.branch_data..];
            down_by(
                layout,
                run,
                state,
                draw,
                #[inline(always)]
                |k, above, drop| data[k].dense.m.times(above).minus(drop),
            )
        }
    }
}

#[inline(always)]
fn down_by<Q: Quad>(
    layout: &Layout,
    run: &Run,
    state: &mut State<Q::Slot>,
    draw: impl Fn(usize, Phasors<Q>, &mut Slots<Q::Slot>),
    volts_of: impl Fn(usize, &Slots<Q::Slot>, Phasors<Q>) -> Phasors<Q>,
) -> Q {
    let mut largest = Q::splat(0.0);
    for position in run.start..run.end {
        let above = &state.volts[layout.parent[position] as usize];
        let volts = volts_of(position - run.start, above, Phasors::load(&state.drop[position]));
        let change = volts.minus(Phasors::load(&state.volts[position])).square();
        // The new value second: one that is not a number then stays and ends the iteration.
        largest = largest.greater(change.times(Q::splat(layout.per_nominal2[position])));
        volts.store(&mut state.volts[position]);
        draw(position - run.start, volts, &mut state.amps[position]);
    }
    largest
}
