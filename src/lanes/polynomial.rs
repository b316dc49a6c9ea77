use super::{Lanes, Simd};

/// c\[0\] + c\[1\] x + ... + c\[N - 1\] x^(N - 1), N at least 3, by two Horner chains, of the even and of the odd
/// powers: half as deep as one, so that the processor waits less, for one multiplication more.
#[inline(always)]
pub(super) fn polynomial<S: Simd, const N: usize>(x: Lanes<S>, c: &[f64; N]) -> Lanes<S> {
    let square = x * x;
    let mut power = N - 1;
    let mut last = Lanes::splat(c[N - 1]);
    let mut other = Lanes::splat(c[N - 2]);
    while power >= 3 {
        last = last * square + c[power - 2];
        other = other * square + c[power - 3];
        power -= 2;
    }
    // One power is left over if their number is odd.
    if power == 2 { other * x + (last * square + c[0]) } else { last * x + other }
}
