use nalgebra::DMatrix;

use super::root::{definite, definite_residual};
use super::{Gaussian, Moments};

/// KL( `of` || `from` ) in nats, of two Gaussians on the same components:
/// 1/2 \[ tr(P1^-1 P0) - k + (m1-m0)' P1^-1 (m1-m0) + ln det P1 - ln det P0 \].
///
/// `None` when a covariance is singular: then the divergence is infinite or depends on the support.
///
/// Source: S. Kullback, Information Theory and Statistics (Wiley, 1959), ch. 9.
///
/// # Panics
/// If the two have different numbers of components.
#[track_caller]
pub fn divergence(of: &Gaussian, from: &Gaussian) -> Option<f64> {
    assert_eq!(of.dimension(), from.dimension(), "divergence of laws of different dimension");
    let p0 = definite(of.covariance())?;
    let p1 = definite(from.covariance())?;
    let shift = of.mean() - from.mean();
    let trace = p1.solve(of.covariance()).trace();
    let quadratic = shift.dot(&p1.solve(&shift));
    Some(0.5 * (trace - of.dimension() as f64 + quadratic + p1.ln_determinant() - p0.ln_determinant()))
}

/// KL( N(joint of `of`) || N(joint of `from`) ) in nats, of two joints that share the prior, by the
/// regression form: with b = mu - mu^ (`of` minus `from`, wrapped by the caller where an output is angular),
/// 1/2 \[ tr(Omega^^-1 Omega) - p + ln det Omega^ - ln det Omega + tr(Omega^^-1 (B - B^) P (B - B^)')
/// + b' Omega^^-1 b \].
///
/// `None` when a residual covariance Omega is not positive definite, or is so small against S that it is only
/// the rounding of the difference (a linear reading without noise).
///
/// Source: chain rule of the divergence (Cover & Thomas, Elements of Information Theory, 2nd ed., thm. 2.5.3)
/// on p(x) p(y | x): the prior is common, so only the conditionals count.
pub fn joint_divergence(prior: &Gaussian, of: &Moments, from: &Moments) -> Option<f64> {
    let shift = &of.mean - &from.mean;
    let (whole, whole_hat) = (&of.covariance, &from.covariance);
    let (of, from) = (of.regression(prior), from.regression(prior));
    let omega = definite_residual(&of.residual, whole)?;
    let omega_hat = definite_residual(&from.residual, whole_hat)?;
    let slope: DMatrix<f64> = of.slope - from.slope;
    let spread = &slope * prior.covariance() * slope.transpose();
    let trace = omega_hat.solve(&(of.residual + spread)).trace();
    let quadratic = shift.dot(&omega_hat.solve(&shift));
    let p = shift.len() as f64;
    Some(0.5 * (trace - p + omega_hat.ln_determinant() - omega.ln_determinant() + quadratic))
}
