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

use super::lanes::{Lane, Slots};
use super::workspace::{BranchWork, DenseData, Layout, LoadWork, Loads, Run, SeriesData, State, Workspace};

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
        self.state.drop.fill(Slots::zero());
        self.passes(Passes::Down);
    }

    /// Iterates until no node voltage changes by more than `tolerance_pu` of nominal, or `limit` iterations are made.
    pub fn iterate(&mut self, tolerance_pu: f64, limit: usize) -> Iterations {
        let mut done = Iterations { count: 0, change_pu: f64::INFINITY };
        while done.count < limit && done.change_pu > tolerance_pu {
            done.change_pu = self.passes(Passes::UpAndDown);
            done.count += 1;
            if !done.change_pu.is_finite() {
                break;
            }
        }
        done
    }

    /// One pass up and one down without new load currents, so that voltages and currents belong together.
    pub(super) fn settle(&mut self) {
        self.passes(Passes::Settle);
    }

    /// Makes the passes with the widest instructions the processor has; gives the largest change, per unit.
    fn passes(&mut self, which: Passes) -> f64 {
        let Workspace { layout, loads, state, .. } = self;
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma") {
            // Safety: the features it is compiled for were found just above. It halves the time.
            #[allow(unsafe_code)]
            return unsafe { passes_wide(layout, loads, state, which) };
        }
        const FUSED: bool = cfg!(target_arch = "aarch64");
        passes::<f64, FUSED>(layout, loads, state, which)
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
fn passes_wide(layout: &Layout, loads: &Loads<f64>, state: &mut State<f64>, which: Passes) -> f64 {
    passes::<f64, true>(layout, loads, state, which)
}

#[inline(always)]
fn passes<L: Lane, const FUSED: bool>(
    layout: &Layout,
    loads: &Loads<L>,
    state: &mut State<L>,
    which: Passes,
) -> f64 {
    if which != Passes::Down {
        for run in layout.runs.iter().rev() {
            match run.branch {
                BranchWork::Series => up_series::<L, FUSED>(layout, run, state),
                BranchWork::Dense => up_dense::<L, FUSED>(layout, run, state),
            }
        }
    }
    let keep = which == Passes::Settle;
    let mut change2 = L::splat(0.0);
    for run in &layout.runs {
        let largest = match run.load {
            _ if keep => down::<L, FUSED>(layout, run, state, |_, _, _| {}),
            LoadWork::None => down::<L, FUSED>(layout, run, state, |_, _, amps| *amps = Slots::zero()),
            LoadWork::Star => {
                let star = &loads.star[run.load_data..];
                down::<L, FUSED>(layout, run, state, |k, volts, amps| *amps = star[k].current::<FUSED>(volts))
            }
            LoadWork::Mixed => {
                let mixed = &loads.mixed[run.load_data..];
                down::<L, FUSED>(layout, run, state, |k, volts, amps| {
                    *amps = mixed[k].current::<FUSED>(volts)
                })
            }
        };
        change2 = largest.greater(change2);
    }
    change2.greatest().sqrt()
}

/// Series branches of a run, leaves first.
#[inline(always)]
fn up_series<L: Lane, const FUSED: bool>(layout: &Layout, run: &Run, state: &mut State<L>) {
    let data = &layout.series[run.branch_data..];
    for position in (run.start..run.end).rev() {
        let SeriesData { z, beta } = &data[position - run.start];
        let amps = state.amps[position];
        let drop = z.times::<L, FUSED>(&amps);
        let parent = &mut state.amps[layout.parent[position] as usize];
        *parent = parent.plus(amps);
        let (br, bi) = (L::splat(beta.re), L::splat(beta.im));
        let (wr, wi) = (drop.re[N], drop.im[N]);
        parent.re[N] = parent.re[N].minus(br.times(wr).minus(bi.times(wi)));
        parent.im[N] = parent.im[N].minus(br.times(wi).plus(bi.times(wr)));
        state.drop[position] = drop;
    }
}

/// General branches of a run, leaves first.
#[inline(always)]
fn up_dense<L: Lane, const FUSED: bool>(layout: &Layout, run: &Run, state: &mut State<L>) {
    let data = &layout.dense[run.branch_data..];
    for position in (run.start..run.end).rev() {
        let DenseData { m, n } = &data[position - run.start];
        let amps = state.amps[position];
        state.drop[position] = n.times::<L, FUSED>(&amps);
        let parent = &mut state.amps[layout.parent[position] as usize];
        *parent = parent.plus(m.transposed_times::<L, FUSED>(&amps));
    }
}

/// Voltages of a run, and its loads by `draw`; gives the largest square of a change, per unit.
#[inline(always)]
fn down<L: Lane, const FUSED: bool>(
    layout: &Layout,
    run: &Run,
    state: &mut State<L>,
    draw: impl Fn(usize, &Slots<L>, &mut Slots<L>),
) -> L {
    match run.branch {
        BranchWork::Series => {
            let data = &layout.series[run.branch_data..];
            down_by::<L>(layout, run, state, draw, |k, above, drop| {
                let SeriesData { z, beta } = &data[k];
                let mut volts = above.minus(*drop);
                let (br, bi) = (L::splat(-beta.re), L::splat(-beta.im));
                let (tr, ti) = (volts.re[N], volts.im[N]);
                let (fr, fi) = (br.times(tr).minus(bi.times(ti)), br.times(ti).plus(bi.times(tr)));
                z.add_column::<L, FUSED>(N, fr, fi, &mut volts);
                volts
            })
        }
        BranchWork::Dense => {
            let data = &layout.dense[run.branch_data..];
            down_by::<L>(layout, run, state, draw, |k, above, drop| {
                data[k].m.times::<L, FUSED>(above).minus(*drop)
            })
        }
    }
}

#[inline(always)]
fn down_by<L: Lane>(
    layout: &Layout,
    run: &Run,
    state: &mut State<L>,
    draw: impl Fn(usize, &Slots<L>, &mut Slots<L>),
    volts_of: impl Fn(usize, &Slots<L>, &Slots<L>) -> Slots<L>,
) -> L {
    let mut largest = [L::splat(0.0); N + 1];
    for position in run.start..run.end {
        let above = state.volts[layout.parent[position] as usize];
        let volts = volts_of(position - run.start, &above, &state.drop[position]);
        let change = volts.minus(state.volts[position]);
        let scale = L::splat(layout.per_nominal2[position]);
        for i in 0..=N {
            let square = change.re[i].times(change.re[i]).plus(change.im[i].times(change.im[i]));
            // The new value second: a NaN then stays and ends the iteration.
            largest[i] = largest[i].greater(square.times(scale));
        }
        state.volts[position] = volts;
        draw(position - run.start, &volts, &mut state.amps[position]);
    }
    largest.into_iter().fold(L::splat(0.0), |a, b| a.greater(b))
}
