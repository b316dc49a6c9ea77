use super::exponential::{bend, reduce};
use super::{Lanes, Simd};

impl<S: Simd> Lanes<S> {
    /// Hyperbolic tangent, within 3 ulp (2.6 seen).
    #[inline(always)]
    pub fn tanh(self) -> Self {
        // E / (E + 2) with E = exp(2 |x|) - 1; from 22 on it rounds to 1. NaN passes.
        let x = Self::splat(22.0).min(self.abs());
        let (n, r, w) = reduce(x + x);
        let power = Self::splat(1.0).scaled(n);
        // In two parts, because power - 1 + power r cancels.
        let (jump, line) = (power - 1.0, power * r);
        let high = jump + line;
        let grown = high + ((line - (high - jump)) + power * bend(r, w));
        (grown / (grown + 2.0)).copysign(self)
    }
}
