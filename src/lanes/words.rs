use std::fmt;
use std::ops::{Add, BitAnd, BitOr, BitXor, Not, Sub};

use super::{Choice, Lanes, Simd};

/// Eight 64-bit words, lane by lane: the bits of [`Lanes`], counters, patterns of points.
#[derive(Clone, Copy)]
pub struct Words<S: Simd>(pub(super) S::Word);

impl<S: Simd> Words<S> {
    /// `value` in all lanes.
    #[inline(always)]
    pub fn splat(value: u64) -> Self {
        Self(S::word_splat(value))
    }

    /// Lane i is `values[i]`.
    #[inline(always)]
    pub fn from_array(values: &[u64; 8]) -> Self {
        Self(S::word_from_array(values))
    }

    /// Lane i at index i.
    #[inline(always)]
    pub fn to_array(self) -> [u64; 8] {
        S::word_to_array(self.0)
    }

    /// self & !other.
    #[inline(always)]
    pub fn and_not(self, other: Self) -> Self {
        Self(S::word_and_not(other.0, self.0))
    }

    /// self << N; N below 64.
    #[inline(always)]
    pub fn shift_left<const N: u32>(self) -> Self {
        Self(S::shift_left::<N>(self.0))
    }

    /// self >> N, filled with zeros; N below 64.
    #[inline(always)]
    pub fn shift_right<const N: u32>(self) -> Self {
        Self(S::shift_right::<N>(self.0))
    }

    /// Which lanes have their highest bit set.
    #[inline(always)]
    pub fn highest_bit(self) -> Choice<S> {
        Choice(S::highest_bit(self.0))
    }

    /// The words as doubles, exact; they must be below 2^52.
    #[inline(always)]
    pub fn to_lanes(self) -> Lanes<S> {
        const UNIT: f64 = 4_503_599_627_370_496.0; // 2^52: the words are its low bits
        Lanes::from_bits(self | Self::splat(UNIT.to_bits())) - UNIT
    }
}

macro_rules! operator {
    ($trait:ident, $function:ident, $operation:ident) => {
        impl<S: Simd> $trait for Words<S> {
            type Output = Self;
            #[inline(always)]
            fn $function(self, other: Self) -> Self {
                Self(S::$operation(self.0, other.0))
            }
        }
    };
}

// Sums and differences wrap around.
operator!(Add, add, word_add);
operator!(Sub, sub, word_sub);
operator!(BitAnd, bitand, word_and);
operator!(BitOr, bitor, word_or);
operator!(BitXor, bitxor, word_xor);

impl<S: Simd> Not for Words<S> {
    type Output = Self;
    #[inline(always)]
    fn not(self) -> Self {
        self ^ Self::splat(!0)
    }
}

impl<S: Simd> fmt::Debug for Words<S> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_tuple("Words").field(&self.to_array()).finish()
    }
}
