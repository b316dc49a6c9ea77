use crate::gaussian::{Gaussian, Moments, joint_divergence};
use crate::sensor::{Output, chart_deviation};

/// Rules that can be asked for a second opinion on a method's answer, from cheap to rich, as labels of methods.
///
/// The rich ones are refused where they would take more than 5,000 points, which no estimator would pay for a check.
pub const OPINIONS: [&str; 6] = [
    "taylor-2",
    "unscented",
    "cubature-5",
    "gauss-hermite:order=3:max_nodes=5000",
    "gauss-hermite:order=5:max_nodes=5000",
    "gauss-hermite:order=7:max_nodes=5000",
];

/// How many of [`OPINIONS`] cost no more than a few evaluations: a probe, as cheap as an index of derivatives.
pub const PROBES: usize = 2;

/// The excess of a method's joint over that of a richer rule, KL( N(richer joint) || N(method joint) ) in nats: what the
/// method would be told to have lost if the richer rule were the truth. All moments are those of the same prior and outputs;
/// means of angular outputs may differ by turns. `None` where a joint is not positive definite.
///
/// Source: ours; the divergence as [`joint_divergence`].
pub fn second_opinion(prior: &Gaussian, outputs: &[Output], richer: &Moments, method: &Moments) -> Option<f64> {
    if !(richer.is_finite() && method.is_finite()) {
        return None;
    }
    let shift = chart_deviation(outputs, &method.mean, &richer.mean);
    let near = Moments { mean: &richer.mean + shift, ..method.clone() };
    joint_divergence(prior, richer, &near).filter(|excess| excess.is_finite()).map(|excess| excess.max(0.0))
}
