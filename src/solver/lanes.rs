//! Small complex vectors and matrices of the sweep, real and imaginary parts apart.
//!
//! A [`Lane`] is what stands in one slot of one conductor: an `f64` for a single solve; several
//! load cases side by side fit the same code with a wider lane. Parts are kept apart so that the
//! four conductors (or the cases) fill a vector register without shuffling.

use crate::math::{Complex64, PhaseMatrix, PhaseVector, SLOTS};

/// Arithmetic of one slot. `FUSED` chooses multiply-add in one rounding where the processor has it.
pub(super) trait Lane: Copy {
    /// The same number in every lane.
    fn splat(value: f64) -> Self;
    /// `self + other`.
    fn plus(self, other: Self) -> Self;
    /// `self - other`.
    fn minus(self, other: Self) -> Self;
    /// `self * other`.
    fn times(self, other: Self) -> Self;
    /// `self / other`.
    fn over(self, other: Self) -> Self;
    /// Lane-wise greater.
    fn greater(self, other: Self) -> Self;
    /// Lane-wise lesser.
    fn lesser(self, other: Self) -> Self;
    /// Square root.
    fn root(self) -> Self;
    /// `self * factor + sum`.
    fn fused<const FUSED: bool>(self, factor: Self, sum: Self) -> Self;
    /// Greatest of the lanes.
    fn greatest(self) -> f64;
}

impl Lane for f64 {
    #[inline(always)]
    fn splat(value: f64) -> Self {
        value
    }
    #[inline(always)]
    fn plus(self, other: Self) -> Self {
        self + other
    }
    #[inline(always)]
    fn minus(self, other: Self) -> Self {
        self - other
    }
    #[inline(always)]
    fn times(self, other: Self) -> Self {
        self * other
    }
    #[inline(always)]
    fn over(self, other: Self) -> Self {
        self / other
    }
    // Comparisons, not f64::max: one instruction, and a NaN in `other` is kept out of the way.
    #[inline(always)]
    fn greater(self, other: Self) -> Self {
        if self > other { self } else { other }
    }
    #[inline(always)]
    fn lesser(self, other: Self) -> Self {
        if self < other { self } else { other }
    }
    #[inline(always)]
    fn root(self) -> Self {
        self.sqrt()
    }
    #[inline(always)]
    fn fused<const FUSED: bool>(self, factor: Self, sum: Self) -> Self {
        if FUSED { self.mul_add(factor, sum) } else { self * factor + sum }
    }
    #[inline(always)]
    fn greatest(self) -> f64 {
        self
    }
}

/// Four complex values in conductor order, parts apart.
#[derive(Debug, Clone, Copy)]
#[repr(C, align(64))]
pub(super) struct Slots<L> {
    pub re: [L; SLOTS],
    pub im: [L; SLOTS],
}

impl<L: Lane> Slots<L> {
    /// All zero.
    #[inline(always)]
    pub fn zero() -> Self {
        Slots { re: [L::splat(0.0); SLOTS], im: [L::splat(0.0); SLOTS] }
    }

    /// `self + other`.
    #[inline(always)]
    pub fn plus(self, other: Self) -> Self {
        let mut sum = self;
        for i in 0..SLOTS {
            sum.re[i] = self.re[i].plus(other.re[i]);
            sum.im[i] = self.im[i].plus(other.im[i]);
        }
        sum
    }

    /// `self - other`.
    #[inline(always)]
    pub fn minus(self, other: Self) -> Self {
        let mut difference = self;
        for i in 0..SLOTS {
            difference.re[i] = self.re[i].minus(other.re[i]);
            difference.im[i] = self.im[i].minus(other.im[i]);
        }
        difference
    }
}

impl From<&PhaseVector> for Slots<f64> {
    fn from(v: &PhaseVector) -> Self {
        Slots { re: std::array::from_fn(|i| v[i].re), im: std::array::from_fn(|i| v[i].im) }
    }
}

impl From<&Slots<f64>> for PhaseVector {
    fn from(s: &Slots<f64>) -> Self {
        PhaseVector::from_fn(|i, _| Complex64::new(s.re[i], s.im[i]))
    }
}

/// A 4 x 4 complex matrix by columns, parts apart; shared by all lanes.
#[derive(Debug, Clone, Copy)]
#[repr(C, align(64))]
pub(super) struct Columns {
    pub re: [[f64; SLOTS]; SLOTS],
    pub im: [[f64; SLOTS]; SLOTS],
}

impl From<&PhaseMatrix> for Columns {
    fn from(m: &PhaseMatrix) -> Self {
        Columns {
            re: std::array::from_fn(|j| std::array::from_fn(|i| m[(i, j)].re)),
            im: std::array::from_fn(|j| std::array::from_fn(|i| m[(i, j)].im)),
        }
    }
}

impl Columns {
    /// Matrix times vector.
    #[inline(always)]
    pub fn times<L: Lane, const FUSED: bool>(&self, v: &Slots<L>) -> Slots<L> {
        let mut sum = Slots::zero();
        for j in 0..SLOTS {
            self.add_column::<L, FUSED>(j, v.re[j], v.im[j], &mut sum);
        }
        sum
    }

    /// Adds column `j` times the complex factor `re + j im`.
    #[inline(always)]
    pub fn add_column<L: Lane, const FUSED: bool>(&self, j: usize, re: L, im: L, sum: &mut Slots<L>) {
        let minus_im = L::splat(0.0).minus(im);
        for i in 0..SLOTS {
            let (zr, zi) = (L::splat(self.re[j][i]), L::splat(self.im[j][i]));
            sum.re[i] = zr.fused::<FUSED>(re, sum.re[i]);
            sum.re[i] = zi.fused::<FUSED>(minus_im, sum.re[i]);
            sum.im[i] = zr.fused::<FUSED>(im, sum.im[i]);
            sum.im[i] = zi.fused::<FUSED>(re, sum.im[i]);
        }
    }

    /// Transposed matrix times vector.
    #[inline(always)]
    pub fn transposed_times<L: Lane, const FUSED: bool>(&self, v: &Slots<L>) -> Slots<L> {
        let mut sum = Slots::zero();
        for j in 0..SLOTS {
            for i in 0..SLOTS {
                let (zr, zi) = (L::splat(self.re[j][i]), L::splat(self.im[j][i]));
                sum.re[j] = zr.fused::<FUSED>(v.re[i], sum.re[j]);
                sum.re[j] = L::splat(0.0).minus(zi).fused::<FUSED>(v.im[i], sum.re[j]);
                sum.im[j] = zr.fused::<FUSED>(v.im[i], sum.im[j]);
                sum.im[j] = zi.fused::<FUSED>(v.re[i], sum.im[j]);
            }
        }
        sum
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn products_agree_with_plain_complex_arithmetic() {
        let m = PhaseMatrix::from_fn(|i, j| {
            Complex64::new(1.0 + i as f64 - 2.0 * j as f64, 0.3 * (i * j) as f64)
        });
        let v = PhaseVector::from_fn(|i, _| Complex64::new(0.5 * i as f64, 2.0 - i as f64));
        let (columns, slots) = (Columns::from(&m), Slots::from(&v));
        let close = |a: PhaseVector, b: PhaseVector| (a - b).norm() < 1e-13;
        assert!(close(PhaseVector::from(&columns.times::<f64, false>(&slots)), m * v));
        assert!(close(PhaseVector::from(&columns.times::<f64, true>(&slots)), m * v));
        assert!(close(PhaseVector::from(&columns.transposed_times::<f64, false>(&slots)), m.transpose() * v));
    }
}
