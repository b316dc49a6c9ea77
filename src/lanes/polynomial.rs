use super::{Choice, Lanes, Simd};

/// Coefficients of a polynomial, lowest power first.
pub(super) trait Coefficients<S: Simd, const N: usize>: Copy {
    /// That of x^i, i below N.
    fn at(self, i: usize) -> Lanes<S>;
}

impl<S: Simd, const N: usize> Coefficients<S, N> for &[f64; N] {
    #[inline(always)]
    fn at(self, i: usize) -> Lanes<S> {
        Lanes::splat(self[i])
    }
}

/// Each lane chooses between two.
#[derive(Clone, Copy)]
pub(super) struct Either<'a, S: Simd, const N: usize>(
    pub(super) Choice<S>,
    pub(super) &'a [f64; N],
    pub(super) &'a [f64; N],
);

impl<S: Simd, const N: usize> Coefficients<S, N> for Either<'_, S, N> {
    #[inline(always)]
    fn at(self, i: usize) -> Lanes<S> {
        self.0.select(Lanes::splat(self.1[i]), Lanes::splat(self.2[i]))
    }
}

/// c\[0\] + c\[1\] x + ... + c\[N - 1\] x^(N - 1), by fours: Estrin's scheme inside, Horner's over x^4. About half
/// as deep as Horner's alone, so that the processor waits less, for two multiplications more.
#[inline(always)]
pub(super) fn polynomial<S: Simd, const N: usize>(x: Lanes<S>, c: impl Coefficients<S, N>) -> Lanes<S> {
    let square = x * x;
    let fourth = square * square;
    let mut first = (N - 1) / 4 * 4;
    let mut sum = four(x, square, c, first);
    while first > 0 {
        first -= 4;
        sum = sum * fourth + four(x, square, c, first);
    }
    sum
}

/// c\[i\] + ... + c\[i + 3\] x^3, or what there is of it.
#[inline(always)]
fn four<S: Simd, const N: usize>(x: Lanes<S>, square: Lanes<S>, c: impl Coefficients<S, N>, i: usize) -> Lanes<S> {
    if i + 2 < N { pair(x, c, i + 2) * square + pair(x, c, i) } else { pair(x, c, i) }
}

/// c\[i\] + c\[i + 1\] x, or what there is of it.
#[inline(always)]
fn pair<S: Simd, const N: usize>(x: Lanes<S>, c: impl Coefficients<S, N>, i: usize) -> Lanes<S> {
    if i + 1 < N { x * c.at(i + 1) + c.at(i) } else { c.at(i) }
}
