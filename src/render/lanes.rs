//! One number per lane, with arithmetic lane by lane.

use std::ops::{Add, Mul, Neg, Sub};

/// The same quantity in `L` lanes. Every operation rounds as the plain one does in each lane alone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct V<const L: usize>(pub [f64; L]);

impl<const L: usize> V<L> {
    pub const ZERO: V<L> = V([0.0; L]);

    #[inline(always)]
    pub fn from_fn(f: impl FnMut(usize) -> f64) -> V<L> {
        V(std::array::from_fn(f))
    }

    /// One operation in every lane.
    #[inline(always)]
    fn each(mut self, other: V<L>, f: impl Fn(f64, f64) -> f64) -> V<L> {
        for l in 0..L {
            self.0[l] = f(self.0[l], other.0[l]);
        }
        self
    }

    #[inline(always)]
    pub fn map(mut self, f: impl Fn(f64) -> f64) -> V<L> {
        for x in &mut self.0 {
            *x = f(*x);
        }
        self
    }

    /// Negative numbers and not-a-number become zero.
    #[inline(always)]
    pub fn at_least_zero(self) -> V<L> {
        self.map(|x| if x > 0.0 { x } else { 0.0 })
    }

    #[inline(always)]
    pub fn twice(self) -> V<L> {
        self + self
    }
}

impl<const L: usize> Add for V<L> {
    type Output = V<L>;
    #[inline(always)]
    fn add(self, other: V<L>) -> V<L> {
        self.each(other, |a, b| a + b)
    }
}

impl<const L: usize> Sub for V<L> {
    type Output = V<L>;
    #[inline(always)]
    fn sub(self, other: V<L>) -> V<L> {
        self.each(other, |a, b| a - b)
    }
}

impl<const L: usize> Mul for V<L> {
    type Output = V<L>;
    #[inline(always)]
    fn mul(self, other: V<L>) -> V<L> {
        self.each(other, |a, b| a * b)
    }
}

impl<const L: usize> Neg for V<L> {
    type Output = V<L>;
    #[inline(always)]
    fn neg(self) -> V<L> {
        self.map(|x| -x)
    }
}
