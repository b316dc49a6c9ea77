//! SSE2 (four vectors of two) and AVX2 (two vectors of four). Truth values are words of all ones or all zeros.

use std::arch::x86_64::{__m128d, __m128i, __m256d, __m256i};

use super::instruction;
use super::sealed::Operations;

/// The baseline of x86-64.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Sse2;

/// AVX2, without fused multiply-add.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Avx2;

#[inline(always)]
fn each<A: Copy, B, const N: usize>(a: [A; N], f: impl Fn(A) -> B) -> [B; N] {
    a.map(f)
}

#[inline(always)]
fn both<A: Copy, C: Copy, B, const N: usize>(a: [A; N], b: [C; N], f: impl Fn(A, C) -> B) -> [B; N] {
    std::array::from_fn(|i| f(a[i], b[i]))
}

macro_rules! operations {
    (
        $level:ty, $parts:literal vectors of $width:literal, $real:ty, $int:ty;
        $($name:ident = $intrinsic:ident,)*;
        compare = [$($compare:ident: $with:tt),* $(,)?];
        select = $select:expr;
    ) => {
        impl Operations for $level {
            type Real = [$real; $parts];
            type Word = [$int; $parts];
            type Mask = [$real; $parts];

            operations!(@ $parts $width $real, $int; $($name = $intrinsic,)*);

            $(operations!(@compare $compare $with);)*

            #[inline(always)]
            fn select(m: Self::Mask, a: Self::Real, b: Self::Real) -> Self::Real {
                std::array::from_fn(|i| $select(m[i], a[i], b[i]))
            }
        }
    };
    (@compare $name:ident ($intrinsic:ident)) => {
        #[inline(always)]
        fn $name(a: Self::Real, b: Self::Real) -> Self::Mask {
            both(a, b, |a, b| instruction!($intrinsic(a, b)))
        }
    };
    (@compare $name:ident ($intrinsic:ident, $predicate:ident)) => {
        #[inline(always)]
        fn $name(a: Self::Real, b: Self::Real) -> Self::Mask {
            both(a, b, |a, b| instruction!($intrinsic::<{ std::arch::x86_64::$predicate }>(a, b)))
        }
    };
    (@ $parts:literal $width:literal $real:ty, $int:ty;
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
            std::array::from_fn(|i| instruction!($load(values[i * $width..][..$width].as_ptr())))
        }
        #[inline(always)]
        fn to_array(a: Self::Real) -> [f64; 8] {
            let mut values = [0.0; 8];
            for i in 0..$parts {
                instruction!($store(values[i * $width..][..$width].as_mut_ptr(), a[i]));
            }
            values
        }
        #[inline(always)]
        fn add(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($add(a, b)))
        }
        #[inline(always)]
        fn sub(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($sub(a, b)))
        }
        #[inline(always)]
        fn mul(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($mul(a, b)))
        }
        #[inline(always)]
        fn div(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($div(a, b)))
        }
        #[inline(always)]
        fn sqrt(a: Self::Real) -> Self::Real {
            each(a, |a| instruction!($sqrt(a)))
        }
        #[inline(always)]
        fn min(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($min(a, b)))
        }
        #[inline(always)]
        fn max(a: Self::Real, b: Self::Real) -> Self::Real {
            both(a, b, |a, b| instruction!($max(a, b)))
        }
        #[inline(always)]
        fn mask_and(a: Self::Mask, b: Self::Mask) -> Self::Mask {
            both(a, b, |a, b| instruction!($and(a, b)))
        }
        #[inline(always)]
        fn mask_or(a: Self::Mask, b: Self::Mask) -> Self::Mask {
            both(a, b, |a, b| instruction!($or(a, b)))
        }
        #[inline(always)]
        fn mask_not(a: Self::Mask) -> Self::Mask {
            let ones = instruction!($word_splat(-1));
            let ones = instruction!($reals(ones));
            each(a, |a| instruction!($xor(a, ones)))
        }
        #[inline(always)]
        fn mask_bits(a: Self::Mask) -> u8 {
            let mut bits = 0;
            for i in 0..$parts {
                bits |= instruction!($signs(a[i])) << (i * $width);
            }
            bits as u8
        }
        #[inline(always)]
        fn words(a: Self::Real) -> Self::Word {
            each(a, |a| instruction!($words(a)))
        }
        #[inline(always)]
        fn reals(a: Self::Word) -> Self::Real {
            each(a, |a| instruction!($reals(a)))
        }
        #[inline(always)]
        fn word_splat(value: u64) -> Self::Word {
            [instruction!($word_splat(value.cast_signed())); $parts]
        }
        #[inline(always)]
        fn word_from_array(values: &[u64; 8]) -> Self::Word {
            Self::words(Self::from_array(&values.map(f64::from_bits)))
        }
        #[inline(always)]
        fn word_to_array(a: Self::Word) -> [u64; 8] {
            Self::to_array(Self::reals(a)).map(f64::to_bits)
        }
        #[inline(always)]
        fn word_add(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_add(a, b)))
        }
        #[inline(always)]
        fn word_sub(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_sub(a, b)))
        }
        #[inline(always)]
        fn word_and(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_and(a, b)))
        }
        #[inline(always)]
        fn word_or(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_or(a, b)))
        }
        #[inline(always)]
        fn word_xor(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_xor(a, b)))
        }
        #[inline(always)]
        fn word_and_not(a: Self::Word, b: Self::Word) -> Self::Word {
            both(a, b, |a, b| instruction!($word_and_not(a, b)))
        }
        #[inline(always)]
        fn shift_left<const N: u32>(a: Self::Word) -> Self::Word {
            let count = instruction!(_mm_cvtsi32_si128(N as i32));
            each(a, |a| instruction!($shift_left(a, count)))
        }
        #[inline(always)]
        fn shift_right<const N: u32>(a: Self::Word) -> Self::Word {
            let count = instruction!(_mm_cvtsi32_si128(N as i32));
            each(a, |a| instruction!($shift_right(a, count)))
        }
    };
}

operations! {
    Sse2, 4 vectors of 2, __m128d, __m128i;
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
    select = |m, a, b| {
        let (a, b) = (instruction!(_mm_and_pd(m, a)), instruction!(_mm_andnot_pd(m, b)));
        instruction!(_mm_or_pd(a, b))
    };
}

operations! {
    Avx2, 2 vectors of 4, __m256d, __m256i;
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
    select = |m, a, b| instruction!(_mm256_blendv_pd(b, a, m));
}
