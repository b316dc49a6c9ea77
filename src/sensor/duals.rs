use std::ops::{Add, Mul, Sub};

use num_dual::{Dual2SVec, DualNum, DualSVec, HyperDual};

use super::{Number, Real};

/// f(x) of a dual number from value, first and second derivative of f at its real part.
///
/// f0 + f1 d + f2 d^2 / 2 with d = x - re x, which has no real part: the series to second order is the chain rule.
#[inline(always)]
fn composed<X, T: Real>(x: X, re: T, [f0, f1, f2]: [T; 3]) -> X
where
    X: Copy + Add<Output = X> + Add<T, Output = X> + Sub<T, Output = X> + Mul<Output = X> + Mul<T, Output = X>,
{
    let d = x - re;
    d * f1 + d * d * (T::HALF * f2) + f0
}

/// Value, first and second derivative of x^n.
fn power<T: Real>(x: T, n: f64, value: T) -> [T; 3] {
    // A factor of zero means that there is no such term, even where its power is infinite.
    let term = |factor: f64, n: f64| {
        T::constant(factor) * if factor == 0.0 { T::constant(0.0) } else { Number::powf(x, n) }
    };
    [value, term(n, n - 1.0), term(n * (n - 1.0), n - 2.0)]
}

macro_rules! dual_number {
    ($type:ty $(, $size:ident)?) => {
        impl<T: Real $(, const $size: usize)?> Number for $type {
            #[inline(always)]
            fn constant(value: f64) -> Self {
                <$type>::from_re(T::constant(value))
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
                let mut angle = if Number::abs(self.re) > Number::abs(x.re) {
                    -DualNum::atan(&(x / self))
                } else {
                    DualNum::atan(&(self / x))
                };
                angle.re = Number::atan2(self.re, x.re);
                angle
            }
            #[inline(always)]
            fn hypot(self, other: Self) -> Self {
                DualNum::sqrt(&(self * self + other * other))
            }
            #[inline(always)]
            fn tan(self) -> Self {
                let value = Number::tan(self.re);
                let slope = T::constant(1.0) + value * value;
                composed(self, self.re, [value, slope, T::TWO * value * slope])
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
                let value = Number::tanh(self.re);
                let slope = Number::powi(DualNum::cosh(&self.re), -2);
                composed(self, self.re, [value, slope, -T::TWO * value * slope])
            }
            #[inline(always)]
            fn abs(self) -> Self {
                let (value, zero) = (Number::abs(self.re), T::constant(0.0));
                let [slope, bend] = if value == zero { [T::constant(f64::NAN); 2] } else { [self.re / value, zero] };
                let mut size = composed(self, self.re, [value, slope, bend]);
                size.re = value;
                size
            }
            #[inline(always)]
            fn powi(self, exponent: i32) -> Self {
                let value = Number::powi(self.re, exponent);
                let mut result = composed(self, self.re, power(self.re, f64::from(exponent), value));
                result.re = value;
                result
            }
            #[inline(always)]
            fn powf(self, exponent: f64) -> Self {
                let value = Number::powf(self.re, exponent);
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

dual_number!(DualSVec<T, N>, N);
dual_number!(Dual2SVec<T, N>, N);
dual_number!(HyperDual<T>);
