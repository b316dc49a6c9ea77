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
        self.powf(exponent)
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

/// f(x) of a dual number from value, first and second derivative of f at its real part.
///
/// f0 + f1 d + f2 d^2 / 2 with d = x - re x, which has no real part: the series to second order is the chain rule.
fn composed<T>(x: T, re: f64, [f0, f1, f2]: [f64; 3]) -> T
where
    T: Copy + Add<Output = T> + Sub<f64, Output = T> + Mul<Output = T> + Mul<f64, Output = T> + Number,
{
    let d = x - re;
    T::constant(f0) + d * f1 + d * d * (0.5 * f2)
}

/// Value, first and second derivative of x^n.
fn power(x: f64, n: f64, value: f64) -> [f64; 3] {
    // A factor of zero means that there is no such term, even where its power is infinite.
    let term = |factor: f64, n: f64| if factor == 0.0 { 0.0 } else { factor * x.powf(n) };
    [value, term(n, n - 1.0), term(n * (n - 1.0), n - 2.0)]
}

macro_rules! dual_number {
    ($type:ty, $($generic:tt)*) => {
        impl $($generic)* Number for $type {
            #[inline(always)]
            fn constant(value: f64) -> Self {
                <$type>::from_re(value)
            }
            #[inline(always)]
            fn sqrt(self) -> Self {
                DualNum::sqrt(&self)
            }
            #[inline(always)]
            fn sin(self) -> Self {
                DualNum::sin(&self)
            }
            #[inline(always)]
            fn cos(self) -> Self {
                DualNum::cos(&self)
            }
            #[inline(always)]
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
            #[inline(always)]
            fn hypot(self, other: Self) -> Self {
                DualNum::sqrt(&(self * self + other * other))
            }
            #[inline(always)]
            fn tan(self) -> Self {
                let value = self.re.tan();
                let slope = 1.0 + value * value;
                composed(self, self.re, [value, slope, 2.0 * value * slope])
            }
            #[inline(always)]
            fn exp(self) -> Self {
                DualNum::exp(&self)
            }
            #[inline(always)]
            fn ln(self) -> Self {
                DualNum::ln(&self)
            }
            #[inline(always)]
            fn tanh(self) -> Self {
                // The crate's own is sinh / cosh, which is NaN beyond 710.
                let value = self.re.tanh();
                let slope = self.re.cosh().powi(-2);
                composed(self, self.re, [value, slope, -2.0 * value * slope])
            }
            #[inline(always)]
            fn abs(self) -> Self {
                let value = self.re.abs();
                let [slope, bend] = if value == 0.0 { [f64::NAN; 2] } else { [self.re.signum(), 0.0] };
                let mut size = composed(self, self.re, [value, slope, bend]);
                size.re = value;
                size
            }
            #[inline(always)]
            fn powi(self, exponent: i32) -> Self {
                let value = self.re.powi(exponent);
                let mut result = composed(self, self.re, power(self.re, f64::from(exponent), value));
                result.re = value;
                result
            }
            #[inline(always)]
            fn powf(self, exponent: f64) -> Self {
                let value = self.re.powf(exponent);
                let mut result = composed(self, self.re, power(self.re, exponent, value));
                result.re = value;
                result
            }
            #[inline(always)]
            fn if_less(self, other: Self, yes: Self, no: Self) -> Self {
                if self.re < other.re { yes } else { no }
            }
            #[inline(always)]
            fn if_at_most(self, other: Self, yes: Self, no: Self) -> Self {
                if self.re <= other.re { yes } else { no }
            }
        }
    };
}

dual_number!(DualSVec64<N>, <const N: usize>);
dual_number!(Dual2SVec64<N>, <const N: usize>);
dual_number!(HyperDual64,);
