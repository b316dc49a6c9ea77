use std::fmt::Debug;

use crate::gaussian::{Gaussian, Moments};

/// A sensor whose moments under a Gaussian prior have a closed form.
pub trait ExactMoments: Debug {
    /// Writes mean (p), covariance without noise (p x p) and cross-covariance (a x p) of y = h(x) for x ~ `prior` (a, the
    /// read components) into `moments`. Nothing is allocated.
    ///
    /// # Panics
    /// If `prior` or `moments` has other dimensions than the sensor.
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments);
}

/// Covariance S = J P J' and cross-covariance C = P J' of a linear part with slope J, by Stein's identity the exact
/// cross-covariance where J = E\[h'\].
pub(super) fn write_linear(prior: &Gaussian, slope: impl Fn(usize, usize) -> f64, moments: &mut Moments) {
    let (p, a) = (moments.mean.len(), prior.dimension());
    let covariance = prior.covariance();
    for j in 0..p {
        for i in 0..a {
            moments.cross_covariance[(i, j)] = (0..a).map(|k| covariance[(i, k)] * slope(j, k)).sum();
        }
        for l in 0..=j {
            let s = (0..a).map(|k| slope(l, k) * moments.cross_covariance[(k, j)]).sum();
            moments.covariance[(l, j)] = s;
            moments.covariance[(j, l)] = s;
        }
    }
}
