use std::fmt;
use std::ops::{BitAnd, BitOr, Not};

use super::{Lanes, Simd};

/// The outcome of a comparison, lane by lane.
#[derive(Clone, Copy)]
pub struct Choice<S: Simd>(pub(super) S::Mask);

impl<S: Simd> Choice<S> {
    /// `yes` where true, `no` where false.
    #[inline(always)]
    pub fn select(self, yes: Lanes<S>, no: Lanes<S>) -> Lanes<S> {
        Lanes(S::select(self.0, yes.0, no.0))
    }

    /// Whether it is true in any lane.
    #[inline(always)]
    pub fn any(self) -> bool {
        self.bits() != 0
    }

    /// Whether it is true in all lanes.
    #[inline(always)]
    pub fn all(self) -> bool {
        self.bits() == u8::MAX
    }

    /// Lane i at bit i.
    #[inline(always)]
    pub fn bits(self) -> u8 {
        S::mask_bits(self.0)
    }
}

impl<S: Simd> BitAnd for Choice<S> {
    type Output = Self;
    #[inline(always)]
    fn bitand(self, other: Self) -> Self {
        Self(S::mask_and(self.0, other.0))
    }
}

impl<S: Simd> BitOr for Choice<S> {
    type Output = Self;
    #[inline(always)]
    fn bitor(self, other: Self) -> Self {
        Self(S::mask_or(self.0, other.0))
    }
}

impl<S: Simd> Not for Choice<S> {
    type Output = Self;
    #[inline(always)]
    fn not(self) -> Self {
        Self(S::mask_not(self.0))
    }
}

impl<S: Simd> fmt::Debug for Choice<S> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Choice({:08b})", self.bits())
    }
}
