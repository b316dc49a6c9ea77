use crate::gaussian::{Moments, wrap};
use crate::sensor::Output;
use crate::suite::Case;

/// One moment on both sides.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Pair {
    /// What it is.
    pub name: String,
    /// In the baseline.
    pub before: f64,
    /// Today.
    pub now: f64,
    /// Their difference, wrapped where it is a mean angle, in standard deviations, variances or correlations, without
    /// sign; infinite where one side is no number and the other is.
    pub apart: f64,
    /// What brings a moment into these units.
    pub unit: f64,
    /// How coarse its last digit is in these units: 1 + |mean| / sd of the outputs concerned.
    pub coarseness: f64,
}

/// The units of a case: standard deviations of its state and outputs.
#[derive(Debug)]
pub(super) struct Units<'a> {
    outputs: &'a [Output],
    state: Vec<f64>,
    output: Vec<f64>,
}

impl<'a> Units<'a> {
    /// Of a case, with the standard deviations of the outputs that `reference` has.
    pub fn of(case: &'a Case, reference: &Moments) -> Self {
        let sd = |variance: f64| if variance.is_finite() { variance.max(0.0).sqrt() } else { 0.0 };
        Self {
            outputs: case.sensor().outputs(),
            state: case.prior().covariance().diagonal().iter().map(|&v| sd(v)).collect(),
            output: reference.covariance.diagonal().iter().map(|&v| sd(v)).collect(),
        }
    }

    /// Every moment of both sides, which have the dimensions of the case.
    pub fn pairs(&self, before: &Moments, now: &Moments) -> Vec<Pair> {
        let (n, p) = now.cross_covariance.shape();
        let name = |j: usize| self.outputs[j].name.as_str();
        let coarse = |j: usize| {
            let share = before.mean[j].abs() / self.output[j];
            if share.is_finite() { share } else { 0.0 }
        };
        let pair = |name: String, (before, now): (f64, f64), difference: f64, unit: f64, coarseness: f64| {
            let apart = match (before.is_nan(), now.is_nan()) {
                (true, true) => 0.0,
                _ if difference == 0.0 => 0.0,
                _ if difference.is_finite() && unit > 0.0 => difference.abs() / unit,
                _ => f64::INFINITY,
            };
            Pair { name, before, now, apart, unit, coarseness: 1.0 + coarseness }
        };
        let mut pairs = Vec::with_capacity(p * (1 + p + n));
        for j in 0..p {
            let sides = (before.mean[j], now.mean[j]);
            let difference = sides.1 - sides.0;
            let difference = if self.outputs[j].angular { wrap(difference) } else { difference };
            pairs.push(pair(format!("mean of {}", name(j)), sides, difference, self.output[j], coarse(j)));
        }
        for j in 0..p {
            for i in 0..=j {
                let sides = (before.covariance[(i, j)], now.covariance[(i, j)]);
                let what = if i == j {
                    format!("variance of {}", name(j))
                } else {
                    format!("covariance of {}, {}", name(i), name(j))
                };
                let unit = self.output[i] * self.output[j];
                pairs.push(pair(what, sides, sides.1 - sides.0, unit, coarse(i) + coarse(j)));
            }
        }
        for i in 0..n {
            for j in 0..p {
                let sides = (before.cross_covariance[(i, j)], now.cross_covariance[(i, j)]);
                let what = format!("cross-covariance of state {i}, {}", name(j));
                let unit = self.state[i] * self.output[j];
                pairs.push(pair(what, sides, sides.1 - sides.0, unit, coarse(j)));
            }
        }
        pairs
    }
}

/// The standard errors of `errors`, in the order of [`Units::pairs`].
pub(super) fn in_order(errors: &Moments) -> Vec<f64> {
    let (n, p) = errors.cross_covariance.shape();
    let covariance = (0..p).flat_map(|j| (0..=j).map(move |i| errors.covariance[(i, j)]));
    let cross = (0..n).flat_map(|i| (0..p).map(move |j| errors.cross_covariance[(i, j)]));
    errors.mean.iter().copied().chain(covariance).chain(cross).collect()
}
