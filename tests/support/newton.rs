//! Newton's method of the nodal comparison, with the loads raised step by step from nothing.

use fourwire::math::Complex64;
use nalgebra::{DMatrix, DVector};

use super::{Element, System, Terminal};

/// Greatest change of the voltage across a load, share of nominal, that still counts as the same solution.
const LEAP: f64 = 0.15;
/// Smallest share of the loads that one step adds.
const LEAST_STEP: f64 = 1.0 / 1024.0;

/// Raises the loads from nothing to all; the second is false where the last step was a leap.
pub(super) fn follow(system: &System) -> Option<(DVector<f64>, bool)> {
    let linear = matrix(system);
    let mut x = linear.clone().lu().solve(&right(system))?;
    let (mut reached, mut step) = (0.0, 1.0f64);
    while reached < 1.0 {
        let share = f64::min(reached + step, 1.0);
        match newton(system, &linear, &x, share).filter(|next| leap(system, &x, next) < LEAP) {
            Some(next) => (x, reached, step) = (next, share, 2.0 * step),
            None if step > LEAST_STEP => step /= 2.0,
            // The solution folds back here, and full load has another one at most.
            None => return newton(system, &linear, &x, 1.0).map(|x| (x, false)),
        }
    }
    Some((x, true))
}

/// Greatest change of the voltage across a load, share of nominal.
fn leap(system: &System, before: &DVector<f64>, after: &DVector<f64>) -> f64 {
    let across = |x: &DVector<f64>, e: &Element| at(x, e.from) - at(x, e.to);
    let change = |e: &Element| (across(after, e) - across(before, e)).norm() / e.nominal;
    system.elements.iter().map(change).fold(0.0, f64::max)
}

fn matrix(system: &System) -> DMatrix<f64> {
    let mut linear = DMatrix::zeros(2 * system.count, 2 * system.count);
    for term in &system.linear {
        for (column, sign) in [(term.plus, 1.0), (term.minus, -1.0)] {
            let Some(column) = column else { continue };
            block(&mut linear, term.row, column, term.value * sign);
        }
    }
    linear
}

fn right(system: &System) -> DVector<f64> {
    DVector::from_iterator(2 * system.count, system.right.iter().flat_map(|value| [value.re, value.im]))
}

fn linear_residual(system: &System, x: &DVector<f64>) -> DVector<f64> {
    let mut residual = -right(system);
    for term in &system.linear {
        let value = term.value * (at(x, term.plus) - at(x, term.minus));
        residual[2 * term.row] += value.re;
        residual[2 * term.row + 1] += value.im;
    }
    residual
}

/// Newton's method from `start` with a share of all loads.
fn newton(system: &System, linear: &DMatrix<f64>, start: &DVector<f64>, share: f64) -> Option<DVector<f64>> {
    let scale = right(system).amax().max(1.0);
    let mut x = start.clone();
    let mut last = f64::INFINITY;
    for _ in 0..60 {
        let mut residual = linear_residual(system, &x);
        let mut jacobian = linear.clone();
        for element in &system.elements {
            let u = at(&x, element.from) - at(&x, element.to);
            add_element(element, share, u, &mut residual, &mut jacobian);
        }
        let step = jacobian.lu().solve(&residual)?;
        // Voltage steps of more than a third of the source are cut: the start is far from a loaded network.
        let voltages = step.amax() / scale;
        let factor = if voltages > 0.3 { 0.3 / voltages } else { 1.0 };
        x -= &step * factor;
        // Quadratic convergence ends in rounding: no smaller step than the last, and a small one, is the end.
        if voltages < 1e-9 && voltages >= 0.1 * last {
            return Some(x);
        }
        last = voltages;
    }
    None
}

fn add_element(
    element: &Element,
    load_share: f64,
    u: Complex64,
    residual: &mut DVector<f64>,
    jacobian: &mut DMatrix<f64>,
) {
    let (g, slope) = element.gain(u.norm_sqr());
    let c = element.power.conj() * load_share;
    let current = c * u * g;
    // dI = c (g du + u g' (2 ur dur + 2 ui dui)).
    let by_re = c * (Complex64::from(g) + u * (2.0 * slope * u.re));
    let by_im = c * (Complex64::new(0.0, g) + u * (2.0 * slope * u.im));
    let ends = [(element.from, 1.0), (element.to, -1.0)];
    for (row, row_sign) in ends {
        let Some(row) = row else { continue };
        residual[2 * row] += row_sign * current.re;
        residual[2 * row + 1] += row_sign * current.im;
        for (column, column_sign) in ends {
            let Some(column) = column else { continue };
            let sign = row_sign * column_sign;
            jacobian[(2 * row, 2 * column)] += sign * by_re.re;
            jacobian[(2 * row + 1, 2 * column)] += sign * by_re.im;
            jacobian[(2 * row, 2 * column + 1)] += sign * by_im.re;
            jacobian[(2 * row + 1, 2 * column + 1)] += sign * by_im.im;
        }
    }
}

/// Value of an unknown; earth has none.
pub(super) fn at(x: &DVector<f64>, terminal: Terminal) -> Complex64 {
    terminal.map_or(Complex64::default(), |k| Complex64::new(x[2 * k], x[2 * k + 1]))
}

/// Adds the real 2 x 2 block of a complex coefficient.
fn block(matrix: &mut DMatrix<f64>, row: usize, column: usize, value: Complex64) {
    matrix[(2 * row, 2 * column)] += value.re;
    matrix[(2 * row, 2 * column + 1)] -= value.im;
    matrix[(2 * row + 1, 2 * column)] += value.im;
    matrix[(2 * row + 1, 2 * column + 1)] += value.re;
}
