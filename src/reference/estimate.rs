use nalgebra::DMatrix;
use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

/// How far a reference can be believed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
#[non_exhaustive]
pub enum Soundness {
    /// Every moment is as precise as asked.
    Sound,
    /// The cap came first: the standard errors are wider than asked, or will be once rare samples that carry a
    /// variance have come often enough ([`Reference::worst_error`] has them).
    Wide,
    /// An independent plain estimate disagrees beyond what chance allows: see the reason. No verdict rests on it.
    Disputed,
    /// The tail is so heavy that no standard error can be believed: see the reason.
    HeavyTailed,
    /// No moments: see the reason. No verdict rests on it.
    Refused,
}

impl Soundness {
    /// Whether a verdict can rest on the reference.
    pub fn bears_verdicts(self) -> bool {
        matches!(self, Self::Sound | Self::Wide)
    }
}

/// Where the points of a reference come from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum PointSource {
    /// Randomised Sobol' nets.
    Nets,
    /// Plain streams: the sensor reads more components than the nets' table has dimensions.
    Streams,
}

/// The moments of a case by heavy sampling.
#[derive(Debug, Clone)]
pub struct Reference {
    /// The estimate: mean (p), covariance (p x p, noise included), cross-covariance (n x p).
    pub moments: Moments,
    /// Standard error of every entry: the spread of the replicates over the root of their number, samples too rare to have
    /// been met included.
    pub standard_error: Moments,
    /// The replicates' own moments, spread about the estimate by as much as the standard errors say; angular means unwrapped
    /// beside the estimate's.
    pub replicates: Vec<Moments>,
    /// Samples of h taken in all replicates together.
    pub points: u64,
    /// Where they come from.
    pub source: PointSource,
    /// Largest standardised standard error: mean over the output's sd, covariance and cross-covariance in
    /// correlation units.
    pub worst_error: f64,
    /// How far it can be believed.
    pub soundness: Soundness,
    /// Why no verdict rests on it.
    pub reason: Option<String>,
}

/// Mean of the replicates and standard error of every entry.
pub(super) fn combine(replicates: &[Moments]) -> (Moments, Moments) {
    let count = replicates.len() as f64;
    // About the first one, so that equal replicates have an error of zero and not the rounding of a sum.
    let first = &replicates[0];
    let mut mean = Moments::zeros(first.cross_covariance.nrows(), first.mean.len());
    for r in replicates {
        mean.mean += &r.mean - &first.mean;
        mean.covariance += &r.covariance - &first.covariance;
        mean.cross_covariance += &r.cross_covariance - &first.cross_covariance;
    }
    mean.mean = &first.mean + mean.mean / count;
    mean.covariance = &first.covariance + mean.covariance / count;
    mean.cross_covariance = &first.cross_covariance + mean.cross_covariance / count;
    let mut error = Moments::zeros(mean.cross_covariance.nrows(), mean.mean.len());
    for r in replicates {
        error.mean += (&r.mean - &mean.mean).map(|d| d * d);
        error.covariance += (&r.covariance - &mean.covariance).map(|d| d * d);
        error.cross_covariance += (&r.cross_covariance - &mean.cross_covariance).map(|d| d * d);
    }
    let scale = 1.0 / (count * (count - 1.0));
    error.mean.apply(|v| *v = (*v * scale).sqrt());
    error.covariance.apply(|v| *v = (*v * scale).sqrt());
    error.cross_covariance.apply(|v| *v = (*v * scale).sqrt());
    (mean, error)
}

/// The largest standard error in natural units; an entry without spread of its own (a state known exactly)
/// counts only if it has an error.
pub(super) fn worst_standardised(moments: &Moments, error: &Moments, prior: &Gaussian) -> f64 {
    let sd = |m: &DMatrix<f64>, i: usize| m[(i, i)].max(0.0).sqrt();
    let ratio = |e: f64, scale: f64| if e == 0.0 { 0.0 } else { e / scale };
    let (n, p) = moments.cross_covariance.shape();
    let mut worst: f64 = 0.0;
    let mut seen = |v: f64| {
        // A NaN must win: max() would drop it.
        if v > worst || v.is_nan() {
            worst = v;
        }
    };
    for j in 0..p {
        let sd_j = sd(&moments.covariance, j);
        seen(ratio(error.mean[j], sd_j));
        for k in 0..p {
            seen(ratio(error.covariance[(j, k)], sd_j * sd(&moments.covariance, k)));
        }
        for i in 0..n {
            seen(ratio(error.cross_covariance[(i, j)], sd_j * sd(prior.covariance(), i)));
        }
    }
    worst
}
