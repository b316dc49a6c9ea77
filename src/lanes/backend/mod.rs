//! What a level must be able to do: eight doubles, eight 64-bit words, eight truth values.

#[cfg(target_arch = "x86_64")]
mod avx512;
#[cfg(any(test, not(target_arch = "x86_64")))]
mod plain;
#[cfg(target_arch = "x86_64")]
mod vectors;

use std::fmt::Debug;

#[cfg(target_arch = "x86_64")]
pub(super) use avx512::Avx512;
#[cfg(any(test, not(target_arch = "x86_64")))]
pub(super) use plain::Plain;
#[cfg(target_arch = "x86_64")]
pub(super) use vectors::{Avx2, Sse2};

/// The instructions of one [`Level`](super::Level): the type that a [`Task`](super::Task) is compiled for.
///
/// A sealed trait: its implementers stay inside the library, so that code can only meet one inside
/// [`dispatch`](super::dispatch), after the machine has been asked whether it has the instructions. That is
/// what makes the instructions safe to use. Its operations are used through [`Lanes`](super::Lanes),
/// [`Words`](super::Words) and [`Choice`](super::Choice).
///
/// Every operation is one correctly rounded IEEE 754 operation, or an exact one on bits, a lane: all levels
/// give the same bits. (Of a NaN only that it is one: IEEE 754 leaves its sign and payload open.)
pub trait Simd: sealed::Operations {}

impl<S: sealed::Operations> Simd for S {}

pub(super) mod sealed {
    use super::Debug;

    /// The operations; see [`Simd`](super::Simd).
    pub trait Operations: Copy + Debug + Send + Sync + 'static {
        /// Eight doubles.
        type Real: Copy;
        /// Eight 64-bit words.
        type Word: Copy;
        /// Eight truth values.
        type Mask: Copy;

        fn splat(value: f64) -> Self::Real;
        fn from_array(values: &[f64; 8]) -> Self::Real;
        fn to_array(a: Self::Real) -> [f64; 8];
        fn add(a: Self::Real, b: Self::Real) -> Self::Real;
        fn sub(a: Self::Real, b: Self::Real) -> Self::Real;
        fn mul(a: Self::Real, b: Self::Real) -> Self::Real;
        fn div(a: Self::Real, b: Self::Real) -> Self::Real;
        fn sqrt(a: Self::Real) -> Self::Real;
        /// a < b ? a : b
        fn min(a: Self::Real, b: Self::Real) -> Self::Real;
        /// a > b ? a : b
        fn max(a: Self::Real, b: Self::Real) -> Self::Real;
        /// p 2^n for a whole n in \[-1100, 1100\] and p in \[1/2, 2\], rounded once.
        #[inline(always)]
        fn scale(p: Self::Real, n: Self::Real) -> Self::Real {
            // Two exact powers, of which only the last product can round.
            let magic = Self::splat(super::super::MAGIC);
            let whole = Self::add(n, magic);
            let half = Self::add(Self::mul(n, Self::splat(0.5)), magic);
            let half_words = Self::words(half);
            let rest = Self::word_sub(Self::words(whole), half_words);
            let bias = Self::word_splat(1023);
            let first = Self::shift_left::<52>(Self::word_add(half_words, bias));
            // whole - half has lost the magic's own bits: what is left is the plain integer.
            let second = Self::shift_left::<52>(Self::word_add(rest, bias));
            Self::mul(Self::mul(p, Self::reals(first)), Self::reals(second))
        }

        fn lt(a: Self::Real, b: Self::Real) -> Self::Mask;
        fn le(a: Self::Real, b: Self::Real) -> Self::Mask;
        fn eq(a: Self::Real, b: Self::Real) -> Self::Mask;
        fn select(m: Self::Mask, a: Self::Real, b: Self::Real) -> Self::Real;
        fn mask_and(a: Self::Mask, b: Self::Mask) -> Self::Mask;
        fn mask_or(a: Self::Mask, b: Self::Mask) -> Self::Mask;
        fn mask_not(a: Self::Mask) -> Self::Mask;
        /// Lane i at bit i.
        fn mask_bits(a: Self::Mask) -> u8;

        fn words(a: Self::Real) -> Self::Word;
        fn reals(a: Self::Word) -> Self::Real;
        fn word_splat(value: u64) -> Self::Word;
        fn word_from_array(values: &[u64; 8]) -> Self::Word;
        fn word_to_array(a: Self::Word) -> [u64; 8];
        fn word_add(a: Self::Word, b: Self::Word) -> Self::Word;
        fn word_sub(a: Self::Word, b: Self::Word) -> Self::Word;
        fn word_and(a: Self::Word, b: Self::Word) -> Self::Word;
        fn word_or(a: Self::Word, b: Self::Word) -> Self::Word;
        fn word_xor(a: Self::Word, b: Self::Word) -> Self::Word;
        /// !a & b
        fn word_and_not(a: Self::Word, b: Self::Word) -> Self::Word;
        fn shift_left<const N: u32>(a: Self::Word) -> Self::Word;
        fn shift_right<const N: u32>(a: Self::Word) -> Self::Word;
        fn highest_bit(a: Self::Word) -> Self::Mask;
    }
}

/// Calls one instruction of the level that is being compiled.
#[cfg(target_arch = "x86_64")]
macro_rules! instruction {
    ($name:ident$(::<$constant:tt>)?($($argument:expr),*)) => {{
        #[allow(
            unsafe_code,
            reason = "the implementers of Simd are out of reach until dispatch has found that the machine has \
                      the instructions; the few that take a pointer get one to an array of the right length"
        )]
        // SAFETY: as the reason above says.
        unsafe {
            std::arch::x86_64::$name$(::<$constant>)?($($argument),*)
        }
    }};
}
#[cfg(target_arch = "x86_64")]
use instruction;
