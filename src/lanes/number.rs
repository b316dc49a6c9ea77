use super::{Lanes, Simd};
use crate::sensor::Number;

impl<S: Simd> Number for Lanes<S> {
    #[inline(always)]
    fn constant(value: f64) -> Self {
        Self::splat(value)
    }
    #[inline(always)]
    fn sqrt(self) -> Self {
        Self::sqrt(self)
    }
    #[inline(always)]
    fn sin(self) -> Self {
        Self::sin(self)
    }
    #[inline(always)]
    fn cos(self) -> Self {
        Self::cos(self)
    }
    #[inline(always)]
    fn atan2(self, x: Self) -> Self {
        Self::atan2(self, x)
    }
    #[inline(always)]
    fn hypot(self, other: Self) -> Self {
        Self::hypot(self, other)
    }
    #[inline(always)]
    fn tan(self) -> Self {
        Self::tan(self)
    }
    #[inline(always)]
    fn exp(self) -> Self {
        Self::exp(self)
    }
    #[inline(always)]
    fn ln(self) -> Self {
        Self::ln(self)
    }
    #[inline(always)]
    fn tanh(self) -> Self {
        Self::tanh(self)
    }
    #[inline(always)]
    fn abs(self) -> Self {
        Self::abs(self)
    }
    #[inline(always)]
    fn powi(self, exponent: i32) -> Self {
        Self::powi(self, exponent)
    }
    #[inline(always)]
    fn powf(self, exponent: f64) -> Self {
        Self::powf(self, Self::splat(exponent))
    }
    #[inline(always)]
    fn if_less(self, other: Self, yes: Self, no: Self) -> Self {
        self.less(other).select(yes, no)
    }
    #[inline(always)]
    fn if_at_most(self, other: Self, yes: Self, no: Self) -> Self {
        self.at_most(other).select(yes, no)
    }
}
