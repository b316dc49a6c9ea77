use super::Estimate;

/// How far the true joint law is from any Gaussian, KL( true joint || N(reference joint) ): what no method can
/// mend.
///
/// 1/2 ( ln det Omega - ln det R ), Omega = S - C' P^-1 C. With additive noise y | x ~ N(h(x), R), so the
/// entropy of the true conditional is that of R; the best Gaussian matches the moments.
///
/// Source: the maximum-entropy property of the Gaussian (Cover & Thomas, Elements of Information Theory, 2nd
/// ed., thm. 8.6.5) on the conditional of y given x.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Floor {
    /// In nats.
    Known(Estimate),
    /// The noise is singular: the true joint is no density, the divergence is infinite.
    Unbounded,
    /// The reference's joint is singular or not resolved.
    Undefined,
    /// Noise acts inside h: y given x is no Gaussian, and its entropy is not that of a known noise.
    NoiseInside,
}
