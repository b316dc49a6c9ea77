use std::arch::x86_64::{__m512d, __m512i, __mmask8, _CMP_EQ_OQ, _CMP_LE_OQ, _CMP_LT_OQ};

use super::instruction;
use super::sealed::Operations;

/// AVX-512 (F, DQ, VL, BW), without fused multiply-add.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Avx512;

impl Operations for Avx512 {
    type Real = __m512d;
    type Word = __m512i;
    type Mask = __mmask8;

    #[inline(always)]
    fn splat(value: f64) -> __m512d {
        instruction!(_mm512_set1_pd(value))
    }
    #[inline(always)]
    fn from_array(values: &[f64; 8]) -> __m512d {
        instruction!(_mm512_loadu_pd(values.as_ptr()))
    }
    #[inline(always)]
    fn to_array(a: __m512d) -> [f64; 8] {
        let mut values = [0.0; 8];
        instruction!(_mm512_storeu_pd(values.as_mut_ptr(), a));
        values
    }
    #[inline(always)]
    fn add(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_add_pd(a, b))
    }
    #[inline(always)]
    fn sub(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_sub_pd(a, b))
    }
    #[inline(always)]
    fn mul(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_mul_pd(a, b))
    }
    #[inline(always)]
    fn div(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_div_pd(a, b))
    }
    #[inline(always)]
    fn sqrt(a: __m512d) -> __m512d {
        instruction!(_mm512_sqrt_pd(a))
    }
    #[inline(always)]
    fn min(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_min_pd(a, b))
    }
    #[inline(always)]
    fn max(a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_max_pd(a, b))
    }
    #[inline(always)]
    fn scale(p: __m512d, n: __m512d) -> __m512d {
        instruction!(_mm512_scalef_pd(p, n))
    }
    #[inline(always)]
    fn lt(a: __m512d, b: __m512d) -> __mmask8 {
        instruction!(_mm512_cmp_pd_mask::<_CMP_LT_OQ>(a, b))
    }
    #[inline(always)]
    fn le(a: __m512d, b: __m512d) -> __mmask8 {
        instruction!(_mm512_cmp_pd_mask::<_CMP_LE_OQ>(a, b))
    }
    #[inline(always)]
    fn eq(a: __m512d, b: __m512d) -> __mmask8 {
        instruction!(_mm512_cmp_pd_mask::<_CMP_EQ_OQ>(a, b))
    }
    #[inline(always)]
    fn select(m: __mmask8, a: __m512d, b: __m512d) -> __m512d {
        instruction!(_mm512_mask_blend_pd(m, b, a))
    }
    #[inline(always)]
    fn mask_and(a: __mmask8, b: __mmask8) -> __mmask8 {
        a & b
    }
    #[inline(always)]
    fn mask_or(a: __mmask8, b: __mmask8) -> __mmask8 {
        a | b
    }
    #[inline(always)]
    fn mask_not(a: __mmask8) -> __mmask8 {
        !a
    }
    #[inline(always)]
    fn mask_bits(a: __mmask8) -> u8 {
        a
    }
    #[inline(always)]
    fn words(a: __m512d) -> __m512i {
        instruction!(_mm512_castpd_si512(a))
    }
    #[inline(always)]
    fn reals(a: __m512i) -> __m512d {
        instruction!(_mm512_castsi512_pd(a))
    }
    #[inline(always)]
    fn word_splat(value: u64) -> __m512i {
        instruction!(_mm512_set1_epi64(value.cast_signed()))
    }
    #[inline(always)]
    fn word_from_array(values: &[u64; 8]) -> __m512i {
        instruction!(_mm512_loadu_epi64(values.as_ptr().cast()))
    }
    #[inline(always)]
    fn word_to_array(a: __m512i) -> [u64; 8] {
        let mut values = [0; 8];
        instruction!(_mm512_storeu_epi64(values.as_mut_ptr().cast(), a));
        values
    }
    #[inline(always)]
    fn word_add(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_add_epi64(a, b))
    }
    #[inline(always)]
    fn word_sub(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_sub_epi64(a, b))
    }
    #[inline(always)]
    fn word_and(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_and_si512(a, b))
    }
    #[inline(always)]
    fn word_or(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_or_si512(a, b))
    }
    #[inline(always)]
    fn word_xor(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_xor_si512(a, b))
    }
    #[inline(always)]
    fn word_and_not(a: __m512i, b: __m512i) -> __m512i {
        instruction!(_mm512_andnot_si512(a, b))
    }
    #[inline(always)]
    fn shift_left<const N: u32>(a: __m512i) -> __m512i {
        let count = instruction!(_mm_cvtsi32_si128(N as i32));
        instruction!(_mm512_sll_epi64(a, count))
    }
    #[inline(always)]
    fn shift_right<const N: u32>(a: __m512i) -> __m512i {
        let count = instruction!(_mm_cvtsi32_si128(N as i32));
        instruction!(_mm512_srl_epi64(a, count))
    }
    #[inline(always)]
    fn highest_bit(a: __m512i) -> __mmask8 {
        instruction!(_mm512_movepi64_mask(a))
    }
}
