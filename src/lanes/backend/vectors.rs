//! SSE2 (four vectors of two) and AVX2 (two vectors of four). Truth values are the highest bits of
//! words; SSE2, which has no choice by them, needs all bits of a word alike.

use std::arch::x86_64::{__m128d, __m128i, __m256d, __m256i};

use super::instruction;
use super::sealed::Operations;

/// The baseline of x86-64.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Sse2;

/// AVX2, without fused multiply-add.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Avx2;

// Arrays are written out part by part: closures and the standard library's array functions may stay out of line,
// where the instructions become calls, twenty times slower.
macro_rules! operations {
    (
        $level:ty, $parts:literal vectors $indices:tt of $width:literal, $real:ty, $int:ty;
        $($name:ident = $intrinsic:ident,)*;
        compare = [$($compare:ident: $with:tt),* $(,)?];
        select = $select:ident;
        highest_bit = $highest_bit:ident;
    ) => {
        impl Operations for $level {
            type Real = [$real; $parts];
            type Word = [$int; $parts];
            type Mask = [$real; $parts];

            operations!(@ $parts $indices $width $real, $int; $($name = $intrinsic,)*);

            $(operations!(@compare $indices $compare $with);)*
            operations!(@choose $indices $select, $highest_bit);
        }
    };
    (@choose [$($i:literal)*] $select:ident, $highest_bit:ident) => {
        #[inline(always)]
        fn select(m: Self::Mask, a: Self::Real, b: Self::Real) -> Self::Real {
            [$($select(m[$i], a[$i], b[$i])),*]
        }
        #[inline(always)]
        fn highest_bit(a: Self::Word) -> Self::Mask {
            [$($highest_bit(a[$i])),*]
        }
    };
    (@compare [$($i:literal)*] $name:ident ($intrinsic:ident)) => {
        #[inline(always)]
        fn $name(a: Self::Real, b: Self::Real) -> Self::Mask {
            [$(instruction!($intrinsic(a[$i], b[$i]))),*]
        }
    };
    (@compare [$($i:literal)*] $name:ident ($intrinsic:ident, $predicate:ident)) => {
        #[inline(always)]
        fn $name(a: Self::Real, b: Self::Real) -> Self::Mask {
            [$(instruction!($intrinsic::<{ std::arch::x86_64::$predicate }>(a[$i], b[$i]))),*]
        }
    };
    (@ $parts:literal [$($i:literal)*] $width:literal $real:ty, $int:ty;
        splat = $splat:ident,
        load = $load:ident,
        store = $store:ident,
        add = $add:ident,
        sub = $sub:ident,
        mul = $mul:ident,
        div = $div:ident,
        sqrt = $sqrt:ident,
        min = $min:ident,
        max = $max:ident,
        and = $and:ident,
        or = $or:ident,
        xor = $xor:ident,
        signs = $signs:ident,
        words = $words:ident,
        reals = $reals:ident,
        word_splat = $word_splat:ident,
        word_load = $word_load:ident,
        word_store = $word_store:ident,
        word_add = $word_add:ident,
        word_sub = $word_sub:ident,
        word_and = $word_and:ident,
        word_or = $word_or:ident,
        word_xor = $word_xor:ident,
        word_and_not = $word_and_not:ident,
        shift_left = $shift_left:ident,
        shift_right = $shift_right:ident,
    ) => {
        #[inline(always)]
        fn splat(value: f64) -> Self::Real {
            [instruction!($splat(value)); $parts]
        }
        #[inline(always)]
        fn from_array(values: &[f64; 8]) -> Self::Real {
            [$(instruction!($load(values[$i * $width..][..$width].as_ptr()))),*]
        }
        #[inline(always)]
        fn to_array(a: Self::Real) -> [f64; 8] {
            let mut values = [0.0; 8];
            $(instruction!($store(values[$i * $width..][..$width].as_mut_ptr(), a[$i]));)*
            values
        }
        #[inline(always)]
        fn add(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($add(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn sub(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($sub(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn mul(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($mul(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn div(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($div(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn sqrt(a: Self::Real) -> Self::Real {
            [$(instruction!($sqrt(a[$i]))),*]
        }
        #[inline(always)]
        fn min(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($min(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn max(a: Self::Real, b: Self::Real) -> Self::Real {
            [$(instruction!($max(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn mask_and(a: Self::Mask, b: Self::Mask) -> Self::Mask {
            [$(instruction!($and(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn mask_or(a: Self::Mask, b: Self::Mask) -> Self::Mask {
            [$(instruction!($or(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn mask_not(a: Self::Mask) -> Self::Mask {
            let ones = instruction!($word_splat(-1));
            let ones = instruction!($reals(ones));
            [$(instruction!($xor(a[$i], ones))),*]
        }
        #[inline(always)]
        fn mask_bits(a: Self::Mask) -> u8 {
            (0 $(| instruction!($signs(a[$i])) << ($i * $width))*) as u8
        }
        #[inline(always)]
        fn words(a: Self::Real) -> Self::Word {
            [$(instruction!($words(a[$i]))),*]
        }
        #[inline(always)]
        fn reals(a: Self::Word) -> Self::Real {
            [$(instruction!($reals(a[$i]))),*]
        }
        #[inline(always)]
        fn word_splat(value: u64) -> Self::Word {
            [instruction!($word_splat(value.cast_signed())); $parts]
        }
        #[inline(always)]
        fn word_from_array(values: &[u64; 8]) -> Self::Word {
            [$(instruction!($word_load(values[$i * $width..][..$width].as_ptr().cast()))),*]
        }
        #[inline(always)]
        fn word_to_array(a: Self::Word) -> [u64; 8] {
            let mut values = [0; 8];
            $(instruction!($word_store(values[$i * $width..][..$width].as_mut_ptr().cast(), a[$i]));)*
            values
        }
        #[inline(always)]
        fn word_add(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_add(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn word_sub(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_sub(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn word_and(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_and(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn word_or(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_or(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn word_xor(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_xor(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn word_and_not(a: Self::Word, b: Self::Word) -> Self::Word {
            [$(instruction!($word_and_not(a[$i], b[$i]))),*]
        }
        #[inline(always)]
        fn shift_left<const N: u32>(a: Self::Word) -> Self::Word {
            let count = instruction!(_mm_cvtsi32_si128(N as i32));
            [$(instruction!($shift_left(a[$i], count))),*]
        }
        #[inline(always)]
        fn shift_right<const N: u32>(a: Self::Word) -> Self::Word {
            let count = instruction!(_mm_cvtsi32_si128(N as i32));
            [$(instruction!($shift_right(a[$i], count))),*]
        }
    };
}

operations! {
    Sse2, 4 vectors [0 1 2 3] of 2, __m128d, __m128i;
    splat = _mm_set1_pd,
    load = _mm_loadu_pd,
    store = _mm_storeu_pd,
    add = _mm_add_pd,
    sub = _mm_sub_pd,
    mul = _mm_mul_pd,
    div = _mm_div_pd,
    sqrt = _mm_sqrt_pd,
    min = _mm_min_pd,
    max = _mm_max_pd,
    and = _mm_and_pd,
    or = _mm_or_pd,
    xor = _mm_xor_pd,
    signs = _mm_movemask_pd,
    words = _mm_castpd_si128,
    reals = _mm_castsi128_pd,
    word_splat = _mm_set1_epi64x,
    word_load = _mm_loadu_si128,
    word_store = _mm_storeu_si128,
    word_add = _mm_add_epi64,
    word_sub = _mm_sub_epi64,
    word_and = _mm_and_si128,
    word_or = _mm_or_si128,
    word_xor = _mm_xor_si128,
    word_and_not = _mm_andnot_si128,
    shift_left = _mm_sll_epi64,
    shift_right = _mm_srl_epi64,
    ;
    compare = [lt: (_mm_cmplt_pd), le: (_mm_cmple_pd), eq: (_mm_cmpeq_pd)];
    select = select_sse2;
    highest_bit = highest_bit_sse2;
}

operations! {
    Avx2, 2 vectors [0 1] of 4, __m256d, __m256i;
    splat = _mm256_set1_pd,
    load = _mm256_loadu_pd,
    store = _mm256_storeu_pd,
    add = _mm256_add_pd,
    sub = _mm256_sub_pd,
    mul = _mm256_mul_pd,
    div = _mm256_div_pd,
    sqrt = _mm256_sqrt_pd,
    min = _mm256_min_pd,
    max = _mm256_max_pd,
    and = _mm256_and_pd,
    or = _mm256_or_pd,
    xor = _mm256_xor_pd,
    signs = _mm256_movemask_pd,
    words = _mm256_castpd_si256,
    reals = _mm256_castsi256_pd,
    word_splat = _mm256_set1_epi64x,
    word_load = _mm256_loadu_si256,
    word_store = _mm256_storeu_si256,
    word_add = _mm256_add_epi64,
    word_sub = _mm256_sub_epi64,
    word_and = _mm256_and_si256,
    word_or = _mm256_or_si256,
    word_xor = _mm256_xor_si256,
    word_and_not = _mm256_andnot_si256,
    shift_left = _mm256_sll_epi64,
    shift_right = _mm256_srl_epi64,
    ;
    compare = [lt: (_mm256_cmp_pd, _CMP_LT_OQ), le: (_mm256_cmp_pd, _CMP_LE_OQ), eq: (_mm256_cmp_pd, _CMP_EQ_OQ)];
    select = select_avx2;
    highest_bit = highest_bit_avx2;
}

#[inline(always)]
fn select_sse2(m: __m128d, a: __m128d, b: __m128d) -> __m128d {
    let (a, b) = (instruction!(_mm_and_pd(m, a)), instruction!(_mm_andnot_pd(m, b)));
    instruction!(_mm_or_pd(a, b))
}

#[inline(always)]
fn highest_bit_sse2(a: __m128i) -> __m128d {
    // The upper halves doubled, their signs spread over all their bits.
    let upper = instruction!(_mm_shuffle_epi32::<0b11_11_01_01>(a));
    let spread = instruction!(_mm_srai_epi32::<31>(upper));
    instruction!(_mm_castsi128_pd(spread))
}

#[inline(always)]
fn select_avx2(m: __m256d, a: __m256d, b: __m256d) -> __m256d {
    instruction!(_mm256_blendv_pd(b, a, m))
}

#[inline(always)]
fn highest_bit_avx2(a: __m256i) -> __m256d {
    // Choices go by the highest bit alone here.
    instruction!(_mm256_castsi256_pd(a))
}
