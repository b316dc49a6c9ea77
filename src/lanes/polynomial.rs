use super::{Lanes, Simd};

/// c\[0\] + c\[1\] x + ... + c\[N - 1\] x^(N - 1), by fours: Estrin's scheme inside, Horner's over x^4. About half
/// as deep as Horner's alone, so that the processor waits less, for two multiplications more.
#[inline(always)]
pub(super) fn polynomial<S: Simd, const N: usize>(x: Lanes<S>, c: &[f64; N]) -> Lanes<S> {
    let square = x * x;
    let fourth = square * square;
    let pair = |i: usize| if i + 1 < N { x * c[i + 1] + c[i] } else { Lanes::splat(c[i]) };
    let four = |i: usize| if i + 2 < N { pair(i + 2) * square + pair(i) } else { pair(i) };
    let mut first = (N - 1) / 4 * 4;
    let mut sum = four(first);
    while first > 0 {
        first -= 4;
        sum = sum * fourth + four(first);
    }
    sum
}
