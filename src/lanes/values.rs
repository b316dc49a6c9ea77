use std::fmt;
use std::ops::{Add, Div, Mul, Neg, Sub};

use super::{Choice, MAGIC, Simd, Words};

/// Eight doubles, lane by lane, with the instructions of `S`.
///
/// Operators, square root, comparisons and bits act on each lane as on an `f64`.
#[derive(Clone, Copy)]
pub struct Lanes<S: Simd>(pub(super) S::Real);

/// The sign bit of a double.
const SIGN: u64 = 1 << 63;

impl<S: Simd> Lanes<S> {
    /// How many lanes there are, on every level.
    pub const COUNT: usize = 8;

    /// `value` in all lanes.
    #[inline(always)]
    pub fn splat(value: f64) -> Self {
        Self(S::splat(value))
    }

    /// Lane i is `values[i]`.
    #[inline(always)]
    pub fn from_array(values: &[f64; 8]) -> Self {
        Self(S::from_array(values))
    }

    /// Lane i at index i.
    #[inline(always)]
    pub fn to_array(self) -> [f64; 8] {
        S::to_array(self.0)
    }

    /// The bits of each lane ([`f64::to_bits`]).
    #[inline(always)]
    pub fn to_bits(self) -> Words<S> {
        Words(S::words(self.0))
    }

    /// The doubles with these bits ([`f64::from_bits`]).
    #[inline(always)]
    pub fn from_bits(bits: Words<S>) -> Self {
        Self(S::reals(bits.0))
    }

    /// Square root, correctly rounded; NaN below zero.
    #[inline(always)]
    pub fn sqrt(self) -> Self {
        Self(S::sqrt(self.0))
    }

    /// Without its sign.
    #[inline(always)]
    pub fn abs(self) -> Self {
        Self::from_bits(self.to_bits().and_not(Words::splat(SIGN)))
    }

    /// The sign bit alone: +0 or -0.
    #[inline(always)]
    pub fn sign(self) -> Words<S> {
        self.to_bits() & Words::splat(SIGN)
    }

    /// With its sign turned where the sign bit of `sign` is set.
    #[inline(always)]
    pub(super) fn flip(self, sign: Words<S>) -> Self {
        Self::from_bits(self.to_bits() ^ sign)
    }

    /// The size of `self` with the sign of `sign`.
    #[inline(always)]
    pub fn copysign(self, sign: Self) -> Self {
        Self::from_bits(self.abs().to_bits() | sign.sign())
    }

    /// The lesser: `if self < other { self } else { other }`, so `other` where either is NaN.
    #[inline(always)]
    pub fn min(self, other: Self) -> Self {
        Self(S::min(self.0, other.0))
    }

    /// The greater: `if self > other { self } else { other }`, so `other` where either is NaN.
    #[inline(always)]
    pub fn max(self, other: Self) -> Self {
        Self(S::max(self.0, other.0))
    }

    /// self < other.
    #[inline(always)]
    pub fn less(self, other: Self) -> Choice<S> {
        Choice(S::lt(self.0, other.0))
    }

    /// self <= other.
    #[inline(always)]
    pub fn at_most(self, other: Self) -> Choice<S> {
        Choice(S::le(self.0, other.0))
    }

    /// self > other.
    #[inline(always)]
    pub fn greater(self, other: Self) -> Choice<S> {
        other.less(self)
    }

    /// self >= other.
    #[inline(always)]
    pub fn at_least(self, other: Self) -> Choice<S> {
        other.at_most(self)
    }

    /// self == other.
    #[inline(always)]
    pub fn equal(self, other: Self) -> Choice<S> {
        Choice(S::eq(self.0, other.0))
    }

    /// Which lanes are NaN.
    #[inline(always)]
    pub fn is_nan(self) -> Choice<S> {
        !self.equal(self)
    }

    /// The nearest whole number, ties to even.
    ///
    /// Exact below 2^51; larger numbers are taken as given only to within 1 (infinities and NaN stay).
    #[inline(always)]
    pub(super) fn nearest(self) -> (Self, Words<S>) {
        let shifted = self + Self::splat(MAGIC);
        (shifted - Self::splat(MAGIC), shifted.to_bits())
    }

    /// The leading 26 bits of the significand, so that products of two such numbers are exact.
    #[inline(always)]
    pub(super) fn leading(self) -> Self {
        Self::from_bits(self.to_bits() & Words::splat(!0 << 27))
    }

    /// self 2^n for whole n in \[-1100, 1100\] and self in \[1/2, 2\], rounded once, subnormal results too.
    #[inline(always)]
    pub(super) fn scaled(self, n: Self) -> Self {
        Self(S::scale(self.0, n.0))
    }
}

macro_rules! operator {
    ($trait:ident, $function:ident, $operation:ident) => {
        impl<S: Simd> $trait for Lanes<S> {
            type Output = Self;
            #[inline(always)]
            fn $function(self, other: Self) -> Self {
                Self(S::$operation(self.0, other.0))
            }
        }

        impl<S: Simd> $trait<f64> for Lanes<S> {
            type Output = Self;
            #[inline(always)]
            fn $function(self, other: f64) -> Self {
                Self(S::$operation(self.0, S::splat(other)))
            }
        }

        impl<S: Simd> $trait<Lanes<S>> for f64 {
            type Output = Lanes<S>;
            #[inline(always)]
            fn $function(self, other: Lanes<S>) -> Lanes<S> {
                Lanes(S::$operation(S::splat(self), other.0))
            }
        }
    };
}

operator!(Add, add, add);
operator!(Sub, sub, sub);
operator!(Mul, mul, mul);
operator!(Div, div, div);

impl<S: Simd> Neg for Lanes<S> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        self.flip(Words::splat(SIGN))
    }
}

impl<S: Simd> fmt::Debug for Lanes<S> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_tuple("Lanes").field(&self.to_array()).finish()
    }
}
