use std::fmt::Debug;
use std::ops::{Add, Div, Mul, Neg, Sub};

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
    /// tan(self), radians.
    fn tan(self) -> Self;
    /// e^self.
    fn exp(self) -> Self;
    /// Natural logarithm.
    fn ln(self) -> Self;
    /// Hyperbolic tangent.
    fn tanh(self) -> Self;
    /// |self|; its derivatives at zero are NaN.
    fn abs(self) -> Self;
    /// self^exponent for a whole exponent.
    fn powi(self, exponent: i32) -> Self;
    /// self^exponent; NaN for a negative number with an exponent that is not whole.
    fn powf(self, exponent: f64) -> Self;
    /// `yes` where self < other, else `no`: also where either is NaN. Only the values are compared, and the derivatives are
    /// those of what is chosen.
    fn if_less(self, other: Self, yes: Self, no: Self) -> Self;
    /// `yes` where self <= other, else `no`, as [`Number::if_less`].
    fn if_at_most(self, other: Self, yes: Self, no: Self) -> Self;
}

macro_rules! plain_number {
    ($type:ty) => {
        impl Number for $type {
            #[inline]
            fn constant(value: f64) -> Self {
                value as Self
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
            #[inline]
            fn tan(self) -> Self {
                self.tan()
            }
            #[inline]
            fn exp(self) -> Self {
                self.exp()
            }
            #[inline]
            fn ln(self) -> Self {
                self.ln()
            }
            #[inline]
            fn tanh(self) -> Self {
                self.tanh()
            }
            #[inline]
            fn abs(self) -> Self {
                self.abs()
            }
            #[inline]
            fn powi(self, exponent: i32) -> Self {
                self.powi(exponent)
            }
            #[inline]
            fn powf(self, exponent: f64) -> Self {
                self.powf(exponent as Self)
            }
            #[inline]
            fn if_less(self, other: Self, yes: Self, no: Self) -> Self {
                if self < other { yes } else { no }
            }
            #[inline]
            fn if_at_most(self, other: Self, yes: Self, no: Self) -> Self {
                if self <= other { yes } else { no }
            }
        }
    };
}

plain_number!(f64);
plain_number!(f32);
