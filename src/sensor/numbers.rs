use std::fmt::Debug;
use std::ops::{Add, Div, Mul, Neg, Sub};

use num_dual::{Dual2SVec64, DualNum, DualSVec64, HyperDual64};

/// The scalar that a measurement formula is written over: plain numbers for values, dual numbers for exact
/// first and second derivatives.
///
/// Operations follow IEEE 754 on the value: where the formula is undefined (the range at the station has no
/// derivative) the result is NaN or infinite, never a panic.
pub trait Number:
    Copy
    + Debug
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
{
    /// The constant `value`: its derivatives are zero.
    fn constant(value: f64) -> Self;
    /// sqrt(self).
    fn sqrt(self) -> Self;
    /// sin(self), radians.
    fn sin(self) -> Self;
    /// cos(self), radians.
    fn cos(self) -> Self;
    /// Angle of the point (x, self) \[rad\] in \[-pi, pi\], counter-clockwise from the x axis.
    fn atan2(self, x: Self) -> Self;
    /// sqrt(self^2 + other^2).
    fn hypot(self, other: Self) -> Self;
}

impl Number for f64 {
    #[inline]
    fn constant(value: f64) -> Self {
        value
    }
    #[inline]
    fn sqrt(self) -> Self {
        self.sqrt()
    }
    #[inline]
    fn sin(self) -> Self {
        self.sin()
    }
    #[inline]
    fn cos(self) -> Self {
        self.cos()
    }
    #[inline]
    fn atan2(self, x: Self) -> Self {
        self.atan2(x)
    }
    #[inline]
    fn hypot(self, other: Self) -> Self {
        // The library's hypot guards against overflow beyond 1e154 at five times the cost; a formula in
        // metres does not come near, and a value that does ends as infinite and is reported as such.
        (self * self + other * other).sqrt()
    }
}

macro_rules! dual_number {
    ($type:ty, $($generic:tt)*) => {
        impl $($generic)* Number for $type {
            #[inline]
            fn constant(value: f64) -> Self {
                <$type>::from_re(value)
            }
            #[inline]
            fn sqrt(self) -> Self {
                DualNum::sqrt(&self)
            }
            #[inline]
            fn sin(self) -> Self {
                DualNum::sin(&self)
            }
            #[inline]
            fn cos(self) -> Self {
                DualNum::cos(&self)
            }
            #[inline]
            fn atan2(self, x: Self) -> Self {
                // The crate's own atan2 differentiates atan(y / x), which is NaN due north (x = 0). The larger
                // coordinate below the line is defined everywhere but at the origin.
                let mut angle = if self.re.abs() > x.re.abs() {
                    -DualNum::atan(&(x / self))
                } else {
                    DualNum::atan(&(self / x))
                };
                angle.re = self.re.atan2(x.re);
                angle
            }
            #[inline]
            fn hypot(self, other: Self) -> Self {
                DualNum::sqrt(&(self * self + other * other))
            }
        }
    };
}

dual_number!(DualSVec64<N>, <const N: usize>);
dual_number!(Dual2SVec64<N>, <const N: usize>);
dual_number!(HyperDual64,);
