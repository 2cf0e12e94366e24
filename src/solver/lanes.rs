//! Four conductors at a time: the small complex vectors and matrices of the sweep.
//!
//! A [`Quad`] is one number a conductor slot, held in registers. The passes are written once over
//! it: [`Plain`] is for any processor, [`Wide`] for those with 256-bit multiply-add. Several load
//! cases side by side are another `Quad`, whose `Slot` is a vector of cases; impedances, which all
//! cases share, come in as plain numbers.
//! Real and imaginary parts are kept apart so that no instruction is spent on shuffling them.

use crate::math::{Complex64, PhaseMatrix, PhaseVector, SLOTS};

/// One number a conductor slot (a, b, c, n), with the arithmetic the passes need.
pub(super) trait Quad: Copy {
    /// What stands in one slot in memory: a number, or one for each of several cases.
    type Slot: Copy;
    /// The same four slots in memory.
    fn load(slots: &[Self::Slot; SLOTS]) -> Self;
    /// To memory.
    fn store(self) -> [Self::Slot; SLOTS];
    /// A slot in memory in every slot.
    fn broadcast(slot: Self::Slot) -> Self;
    /// Four plain numbers, one a slot, the same for all cases.
    fn column(slots: &[f64; SLOTS]) -> Self;
    /// `value` in every slot.
    fn splat(value: f64) -> Self;
    /// Greatest of all numbers; one that is not a number may be passed over.
    fn greatest(self) -> f64;
    /// `self + other`.
    fn plus(self, other: Self) -> Self;
    /// `self - other`.
    fn minus(self, other: Self) -> Self;
    /// `self * other`.
    fn times(self, other: Self) -> Self;
    /// `self / other`.
    fn over(self, other: Self) -> Self;
    /// `self * factor + sum`.
    fn times_plus(self, factor: Self, sum: Self) -> Self;
    /// `sum - self * factor`.
    fn times_from(self, factor: Self, sum: Self) -> Self;
    /// Slot-wise greater; where `other` is not a number, it stays so.
    fn greater(self, other: Self) -> Self;
    /// Slot-wise lesser.
    fn lesser(self, other: Self) -> Self;
    /// Square root.
    fn root(self) -> Self;
    /// Slot n in every slot.
    fn neutral(self) -> Self;
    /// Slots b, c, a, n.
    fn next_phase(self) -> Self;
    /// Slots c, a, b, n.
    fn phase_before(self) -> Self;
    /// The phases of `self`, the neutral of `other`.
    fn with_neutral(self, other: Self) -> Self;
    /// Sum of the three phases in slot n.
    fn phase_sum(self) -> Self;
}

/// [`Quad`] in plain arithmetic.
#[derive(Debug, Clone, Copy)]
pub(super) struct Plain([f64; SLOTS]);

impl Plain {
    #[inline(always)]
    fn zip(self, other: Self, f: impl Fn(f64, f64) -> f64) -> Self {
        Plain(std::array::from_fn(|i| f(self.0[i], other.0[i])))
    }
}

impl Quad for Plain {
    type Slot = f64;
    #[inline(always)]
    fn broadcast(slot: f64) -> Self {
        Plain([slot; SLOTS])
    }
    #[inline(always)]
    fn column(slots: &[f64; SLOTS]) -> Self {
        Plain(*slots)
    }
    #[inline(always)]
    fn greatest(self) -> f64 {
        self.0.into_iter().fold(f64::NEG_INFINITY, |a, b| if a > b { a } else { b })
    }
    #[inline(always)]
    fn load(slots: &[f64; SLOTS]) -> Self {
        Plain(*slots)
    }
    #[inline(always)]
    fn store(self) -> [f64; SLOTS] {
        self.0
    }
    #[inline(always)]
    fn splat(value: f64) -> Self {
        Plain([value; SLOTS])
    }
    #[inline(always)]
    fn plus(self, other: Self) -> Self {
        self.zip(other, |a, b| a + b)
    }
    #[inline(always)]
    fn minus(self, other: Self) -> Self {
        self.zip(other, |a, b| a - b)
    }
    #[inline(always)]
    fn times(self, other: Self) -> Self {
        self.zip(other, |a, b| a * b)
    }
    #[inline(always)]
    fn over(self, other: Self) -> Self {
        self.zip(other, |a, b| a / b)
    }
    #[inline(always)]
    fn times_plus(self, factor: Self, sum: Self) -> Self {
        self.times(factor).plus(sum)
    }
    #[inline(always)]
    fn times_from(self, factor: Self, sum: Self) -> Self {
        sum.minus(self.times(factor))
    }
    #[inline(always)]
    fn greater(self, other: Self) -> Self {
        self.zip(other, |a, b| if a > b { a } else { b })
    }
    #[inline(always)]
    fn lesser(self, other: Self) -> Self {
        self.zip(other, |a, b| if a < b { a } else { b })
    }
    #[inline(always)]
    fn root(self) -> Self {
        Plain(self.0.map(f64::sqrt))
    }
    #[inline(always)]
    fn neutral(self) -> Self {
        Plain([self.0[3]; SLOTS])
    }
    #[inline(always)]
    fn next_phase(self) -> Self {
        let [a, b, c, n] = self.0;
        Plain([b, c, a, n])
    }
    #[inline(always)]
    fn phase_before(self) -> Self {
        let [a, b, c, n] = self.0;
        Plain([c, a, b, n])
    }
    #[inline(always)]
    fn phase_sum(self) -> Self {
        let [a, b, c, _] = self.0;
        Plain([a + b + c; SLOTS])
    }
    #[inline(always)]
    fn with_neutral(self, other: Self) -> Self {
        let [a, b, c, _] = self.0;
        Plain([a, b, c, other.0[3]])
    }
}

#[cfg(target_arch = "x86_64")]
pub(super) use wide::Wide;

/// Unsafe is allowed here alone, for the vector instructions: they are measured to take less than
/// half the time of plain arithmetic. Whoever makes the passes with [`Wide`] must have found the
/// processor to have AVX2 and FMA.
#[cfg(target_arch = "x86_64")]
#[allow(unsafe_code)]
mod wide {
    use std::arch::x86_64::{
        __m256d, _mm256_add_pd, _mm256_blend_pd, _mm256_div_pd, _mm256_fmadd_pd, _mm256_fnmadd_pd,
        _mm256_loadu_pd, _mm256_max_pd, _mm256_min_pd, _mm256_mul_pd, _mm256_permute4x64_pd, _mm256_set1_pd,
        _mm256_sqrt_pd, _mm256_storeu_pd, _mm256_sub_pd,
    };

    use super::{Quad, SLOTS};

    /// [`Quad`] in one 256-bit register.
    #[derive(Debug, Clone, Copy)]
    pub(in super::super) struct Wide(__m256d);

    impl Quad for Wide {
        type Slot = f64;
        #[inline(always)]
        fn broadcast(slot: f64) -> Self {
            Wide::splat(slot)
        }
        #[inline(always)]
        fn column(slots: &[f64; SLOTS]) -> Self {
            Wide::load(slots)
        }
        #[inline(always)]
        fn greatest(self) -> f64 {
            self.store().into_iter().fold(f64::NEG_INFINITY, |a, b| if a > b { a } else { b })
        }
        #[inline(always)]
        fn load(slots: &[f64; SLOTS]) -> Self {
            Wide(unsafe { _mm256_loadu_pd(slots.as_ptr()) })
        }
        #[inline(always)]
        fn store(self) -> [f64; SLOTS] {
            let mut slots = [0.0; SLOTS];
            unsafe { _mm256_storeu_pd(slots.as_mut_ptr(), self.0) };
            slots
        }
        #[inline(always)]
        fn splat(value: f64) -> Self {
            Wide(unsafe { _mm256_set1_pd(value) })
        }
        #[inline(always)]
        fn plus(self, other: Self) -> Self {
            Wide(unsafe { _mm256_add_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn minus(self, other: Self) -> Self {
            Wide(unsafe { _mm256_sub_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn times(self, other: Self) -> Self {
            Wide(unsafe { _mm256_mul_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn over(self, other: Self) -> Self {
            Wide(unsafe { _mm256_div_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn times_plus(self, factor: Self, sum: Self) -> Self {
            Wide(unsafe { _mm256_fmadd_pd(self.0, factor.0, sum.0) })
        }
        #[inline(always)]
        fn times_from(self, factor: Self, sum: Self) -> Self {
            Wide(unsafe { _mm256_fnmadd_pd(self.0, factor.0, sum.0) })
        }
        #[inline(always)]
        fn greater(self, other: Self) -> Self {
            Wide(unsafe { _mm256_max_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn lesser(self, other: Self) -> Self {
            Wide(unsafe { _mm256_min_pd(self.0, other.0) })
        }
        #[inline(always)]
        fn root(self) -> Self {
            Wide(unsafe { _mm256_sqrt_pd(self.0) })
        }
        #[inline(always)]
        fn neutral(self) -> Self {
            Wide(unsafe { _mm256_permute4x64_pd::<0b11_11_11_11>(self.0) })
        }
        #[inline(always)]
        fn next_phase(self) -> Self {
            Wide(unsafe { _mm256_permute4x64_pd::<0b11_00_10_01>(self.0) })
        }
        #[inline(always)]
        fn phase_before(self) -> Self {
            Wide(unsafe { _mm256_permute4x64_pd::<0b11_01_00_10>(self.0) })
        }
        #[inline(always)]
        fn phase_sum(self) -> Self {
            // Slots a, b, c, each moved to n, added up.
            let a = unsafe { _mm256_permute4x64_pd::<0b00_00_00_00>(self.0) };
            let b = unsafe { _mm256_permute4x64_pd::<0b01_01_01_01>(self.0) };
            let c = unsafe { _mm256_permute4x64_pd::<0b10_10_10_10>(self.0) };
            Wide(a).plus(Wide(b)).plus(Wide(c))
        }
        #[inline(always)]
        fn with_neutral(self, other: Self) -> Self {
            Wide(unsafe { _mm256_blend_pd::<0b1000>(self.0, other.0) })
        }
    }
}

/// Four complex values in conductor order as they stand in memory, parts apart.
#[derive(Debug, Clone, Copy)]
#[repr(C, align(64))]
pub(super) struct Slots<S = f64> {
    pub re: [S; SLOTS],
    pub im: [S; SLOTS],
}

impl Slots {
    /// All zero.
    pub const ZERO: Slots = Slots { re: [0.0; SLOTS], im: [0.0; SLOTS] };
}

/// `a + factor * b`.
pub(super) fn combine(a: &Slots, b: &Slots, factor: f64) -> Slots {
    Slots {
        re: std::array::from_fn(|i| a.re[i] + factor * b.re[i]),
        im: std::array::from_fn(|i| a.im[i] + factor * b.im[i]),
    }
}

/// Real inner product.
pub(super) fn dot(a: &Slots, b: &Slots) -> f64 {
    (0..SLOTS).map(|i| a.re[i] * b.re[i] + a.im[i] * b.im[i]).sum()
}

impl From<&PhaseVector> for Slots {
    fn from(v: &PhaseVector) -> Self {
        Slots { re: std::array::from_fn(|i| v[i].re), im: std::array::from_fn(|i| v[i].im) }
    }
}

impl From<&Slots> for PhaseVector {
    fn from(s: &Slots) -> Self {
        PhaseVector::from_fn(|i, _| Complex64::new(s.re[i], s.im[i]))
    }
}

/// Four complex values in registers.
#[derive(Debug, Clone, Copy)]
pub(super) struct Phasors<Q> {
    pub re: Q,
    pub im: Q,
}

impl<Q: Quad> Phasors<Q> {
    /// All zero.
    #[inline(always)]
    pub fn zero() -> Self {
        Phasors { re: Q::splat(0.0), im: Q::splat(0.0) }
    }

    /// From memory.
    #[inline(always)]
    pub fn load(slots: &Slots<Q::Slot>) -> Self {
        Phasors { re: Q::load(&slots.re), im: Q::load(&slots.im) }
    }

    /// To memory.
    #[inline(always)]
    pub fn store(self, slots: &mut Slots<Q::Slot>) {
        slots.re = self.re.store();
        slots.im = self.im.store();
    }

    /// `self + other`.
    #[inline(always)]
    pub fn plus(self, other: Self) -> Self {
        Phasors { re: self.re.plus(other.re), im: self.im.plus(other.im) }
    }

    /// `self - other`.
    #[inline(always)]
    pub fn minus(self, other: Self) -> Self {
        Phasors { re: self.re.minus(other.re), im: self.im.minus(other.im) }
    }

    /// Magnitude squared.
    #[inline(always)]
    pub fn square(self) -> Q {
        self.re.times_plus(self.re, self.im.times(self.im))
    }

    /// Each part changed alike.
    #[inline(always)]
    pub fn each(self, f: impl Fn(Q) -> Q) -> Self {
        Phasors { re: f(self.re), im: f(self.im) }
    }

    /// `self + factor * other`, slot by slot.
    #[inline(always)]
    pub fn plus_product(self, factor: Self, other: Self) -> Self {
        let re = factor.re.times_plus(other.re, self.re);
        let im = factor.re.times_plus(other.im, self.im);
        Phasors { re: factor.im.times_from(other.im, re), im: factor.im.times_plus(other.re, im) }
    }
}

/// A 4 x 4 complex matrix by columns, parts apart.
#[derive(Debug, Clone, Copy)]
#[repr(C, align(64))]
pub(super) struct Columns {
    re: [[f64; SLOTS]; SLOTS],
    im: [[f64; SLOTS]; SLOTS],
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
    /// Column `j`.
    #[inline(always)]
    pub fn column<Q: Quad>(&self, j: usize) -> Phasors<Q> {
        Phasors { re: Q::column(&self.re[j]), im: Q::column(&self.im[j]) }
    }

    /// Matrix times vector.
    #[inline(always)]
    pub fn times<Q: Quad>(&self, v: &Slots<Q::Slot>) -> Phasors<Q> {
        // Two sums, so that the multiply-adds of one need not wait for those of the other.
        let mut sums = [Phasors::zero(); 2];
        for j in 0..SLOTS {
            let factor = Phasors { re: Q::broadcast(v.re[j]), im: Q::broadcast(v.im[j]) };
            sums[j % 2] = sums[j % 2].plus_product(factor, self.column(j));
        }
        sums[0].plus(sums[1])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn product<Q: Quad<Slot = f64>>(m: &PhaseMatrix, v: &PhaseVector) -> PhaseVector {
        let mut slots = Slots::ZERO;
        Columns::from(m).times::<Q>(&Slots::from(v)).store(&mut slots);
        PhaseVector::from(&slots)
    }

    #[test]
    fn products_agree_with_plain_complex_arithmetic() {
        let m = PhaseMatrix::from_fn(|i, j| {
            Complex64::new(1.0 + i as f64 - 2.0 * j as f64, 0.3 * (i * j) as f64)
        });
        let v = PhaseVector::from_fn(|i, _| Complex64::new(0.5 * i as f64, 2.0 - i as f64));
        assert!((product::<Plain>(&m, &v) - m * v).norm() < 1e-13);
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma") {
            assert!((product::<Wide>(&m, &v) - m * v).norm() < 1e-13);
        }
    }

    fn moves<Q: Quad<Slot = f64>>() -> [[f64; 4]; 4] {
        let q = Q::load(&[1.0, 2.0, 3.0, 4.0]);
        let with = q.with_neutral(q.phase_sum());
        [q.next_phase().store(), q.phase_before().store(), with.store(), q.neutral().store()]
    }

    #[test]
    fn slots_move_alike_in_both() {
        let expected =
            [[2.0, 3.0, 1.0, 4.0], [3.0, 1.0, 2.0, 4.0], [1.0, 2.0, 3.0, 6.0], [4.0, 4.0, 4.0, 4.0]];
        assert_eq!(moves::<Plain>(), expected);
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma") {
            assert_eq!(moves::<Wide>(), expected);
        }
    }
}
