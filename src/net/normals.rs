use super::BLOCK;
use super::quantile::{FAR_TAIL, TAIL, central, far_tail, tail};

/// Lanes of the widest vector unit: what is gathered is padded to a multiple of it.
const LANES: usize = 8;

/// The standard normal of a uniform 64-bit integer: the quantile of its leading 53 bits taken as the midpoint of
/// their cell, p = (w + 1/2) 2^-53, w = floor(bits / 2^11).
///
/// The first bit is the sign, the other 52 give the tail probability q = (k + 1/2) 2^-53 exactly: never 0, never 1/2,
/// the least is 2^-54. So the value is finite, at most 8.3 in size, not zero, rises with `bits` but for rounding, and the complement
/// of `bits` gives its negative to the bit. Relative error and source as in
/// [`normal_quantile`](super::normal_quantile).
pub fn normal(bits: u64) -> f64 {
    let q = tail_probability(bits);
    let z = if q >= TAIL {
        central(q)
    } else if q >= FAR_TAIL {
        tail(q)
    } else {
        far_tail(q)
    };
    signed(z, bits)
}

/// Values whose tails are marked in one integer.
const WORD: usize = 64;
/// 1 << j, as a table: SSE2 has no shift by lane.
const ONE_BIT: [u64; WORD] = {
    let mut table = [0; WORD];
    let mut j = 0;
    while j < WORD {
        table[j] = 1 << j;
        j += 1;
    }
    table
};

/// [`normal`] of a block of integers, the same bits: the formula of the centre for all, then the tails gathered,
/// done in lanes and put back.
///
/// Inlined into its caller, to be compiled for the vector unit that the caller is compiled for.
#[inline(always)]
pub fn normals(bits: &[u64; BLOCK], out: &mut [f64; BLOCK]) {
    let mut q = [0.0; BLOCK];
    for i in 0..BLOCK {
        q[i] = tail_probability(bits[i]);
        out[i] = signed(central(q[i]), bits[i]);
    }

    let mut masks = [0; BLOCK / WORD];
    let mut tails = [0.0; BLOCK];
    let mut count = 0;
    for (word, q) in q.as_chunks::<WORD>().0.iter().enumerate() {
        for j in 0..WORD {
            masks[word] |= if q[j] < TAIL { ONE_BIT[j] } else { 0 };
        }
        for j in set_bits(masks[word]) {
            tails[count] = q[j];
            count += 1;
        }
    }
    let padded = count.next_multiple_of(LANES);
    tails[count..padded].fill(TAIL);
    let far = tails[..padded].iter().filter(|&&q| q < FAR_TAIL).count();
    for t in &mut tails[..padded] {
        *t = tail(*t);
    }
    let mut done = tails.iter();
    for (word, &mask) in masks.iter().enumerate() {
        for (j, &t) in set_bits(mask).zip(&mut done) {
            let i = WORD * word + j;
            out[i] = signed(t, bits[i]);
        }
    }
    if far > 0 {
        far_tails(bits, out);
    }
}

/// Places of the bits set, rising.
#[inline(always)]
fn set_bits(mut mask: u64) -> impl Iterator<Item = usize> {
    std::iter::from_fn(move || {
        let place = mask.trailing_zeros() as usize;
        mask &= mask.wrapping_sub(1);
        (place < WORD).then_some(place)
    })
}

/// Once in 140 million blocks.
#[cold]
#[inline(never)]
fn far_tails(bits: &[u64; BLOCK], out: &mut [f64; BLOCK]) {
    for (out, &bits) in out.iter_mut().zip(bits) {
        *out = normal(bits);
    }
}

/// q = (k + 1/2) 2^-53 where k is the distance of the leading 53 bits from the nearer end.
#[inline(always)]
fn tail_probability(bits: u64) -> f64 {
    /// 2^52 in the exponent: k in the mantissa then reads 2^52 + k.
    const SHIFTER: u64 = 0x4330_0000_0000_0000;
    /// 2^-53.
    const CELL: f64 = 1.0 / 9_007_199_254_740_992.0;
    // All ones in the upper half. An arithmetic shift by 63 says the same, but only AVX-512 has one.
    let upper = (bits >> 63).wrapping_neg();
    let k = (bits ^ upper) >> 11;
    // 2^52 - 1/2 is a double, and so is k + 1/2.
    (f64::from_bits(k | SHIFTER) - (4_503_599_627_370_496.0 - 0.5)) * CELL
}

/// `z` in the upper half, `-z` in the lower.
#[inline(always)]
fn signed(z: f64, bits: u64) -> f64 {
    f64::from_bits(z.to_bits() | (!bits & 1 << 63))
}
