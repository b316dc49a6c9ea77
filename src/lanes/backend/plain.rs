use super::sealed::Operations;

/// Arrays and loops: every machine has them. The baseline where there is no other.
#[derive(Debug, Clone, Copy)]
pub(in crate::lanes) struct Plain;

#[inline(always)]
fn each<A: Copy, B>(a: [A; 8], f: impl Fn(A) -> B) -> [B; 8] {
    std::array::from_fn(|i| f(a[i]))
}

#[inline(always)]
fn both<A: Copy, B>(a: [A; 8], b: [A; 8], f: impl Fn(A, A) -> B) -> [B; 8] {
    std::array::from_fn(|i| f(a[i], b[i]))
}

impl Operations for Plain {
    type Real = [f64; 8];
    type Word = [u64; 8];
    type Mask = [bool; 8];

    #[inline(always)]
    fn splat(value: f64) -> [f64; 8] {
        [value; 8]
    }
    #[inline(always)]
    fn from_array(values: &[f64; 8]) -> [f64; 8] {
        *values
    }
    #[inline(always)]
    fn to_array(a: [f64; 8]) -> [f64; 8] {
        a
    }
    #[inline(always)]
    fn add(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| a + b)
    }
    #[inline(always)]
    fn sub(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| a - b)
    }
    #[inline(always)]
    fn mul(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| a * b)
    }
    #[inline(always)]
    fn div(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| a / b)
    }
    #[inline(always)]
    fn sqrt(a: [f64; 8]) -> [f64; 8] {
        each(a, f64::sqrt)
    }
    #[inline(always)]
    fn min(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| if a < b { a } else { b })
    }
    #[inline(always)]
    fn max(a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        both(a, b, |a, b| if a > b { a } else { b })
    }
    #[inline(always)]
    fn lt(a: [f64; 8], b: [f64; 8]) -> [bool; 8] {
        both(a, b, |a, b| a < b)
    }
    #[inline(always)]
    fn le(a: [f64; 8], b: [f64; 8]) -> [bool; 8] {
        both(a, b, |a, b| a <= b)
    }
    #[inline(always)]
    fn eq(a: [f64; 8], b: [f64; 8]) -> [bool; 8] {
        both(a, b, |a, b| a == b)
    }
    #[inline(always)]
    fn select(m: [bool; 8], a: [f64; 8], b: [f64; 8]) -> [f64; 8] {
        std::array::from_fn(|i| if m[i] { a[i] } else { b[i] })
    }
    #[inline(always)]
    fn mask_and(a: [bool; 8], b: [bool; 8]) -> [bool; 8] {
        both(a, b, |a, b| a & b)
    }
    #[inline(always)]
    fn mask_or(a: [bool; 8], b: [bool; 8]) -> [bool; 8] {
        both(a, b, |a, b| a | b)
    }
    #[inline(always)]
    fn mask_not(a: [bool; 8]) -> [bool; 8] {
        each(a, |a| !a)
    }
    #[inline(always)]
    fn mask_bits(a: [bool; 8]) -> u8 {
        (0..8).fold(0, |bits, i| bits | (u8::from(a[i]) << i))
    }
    #[inline(always)]
    fn words(a: [f64; 8]) -> [u64; 8] {
        each(a, f64::to_bits)
    }
    #[inline(always)]
    fn reals(a: [u64; 8]) -> [f64; 8] {
        each(a, f64::from_bits)
    }
    #[inline(always)]
    fn word_splat(value: u64) -> [u64; 8] {
        [value; 8]
    }
    #[inline(always)]
    fn word_from_array(values: &[u64; 8]) -> [u64; 8] {
        *values
    }
    #[inline(always)]
    fn word_to_array(a: [u64; 8]) -> [u64; 8] {
        a
    }
    #[inline(always)]
    fn word_add(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, u64::wrapping_add)
    }
    #[inline(always)]
    fn word_sub(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, u64::wrapping_sub)
    }
    #[inline(always)]
    fn word_and(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, |a, b| a & b)
    }
    #[inline(always)]
    fn word_or(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, |a, b| a | b)
    }
    #[inline(always)]
    fn word_xor(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, |a, b| a ^ b)
    }
    #[inline(always)]
    fn word_and_not(a: [u64; 8], b: [u64; 8]) -> [u64; 8] {
        both(a, b, |a, b| !a & b)
    }
    #[inline(always)]
    fn shift_left<const N: u32>(a: [u64; 8]) -> [u64; 8] {
        each(a, |a| a << N)
    }
    #[inline(always)]
    fn shift_right<const N: u32>(a: [u64; 8]) -> [u64; 8] {
        each(a, |a| a >> N)
    }
    #[inline(always)]
    fn highest_bit(a: [u64; 8]) -> [bool; 8] {
        each(a, |a| a >> 63 == 1)
    }
}
